/** The grammar of VOUnits 1.0, section 2 (units.ts says what is left out), and exact scales.
 *
 *      unit    = ( factor | [ factor ] product ) [ "/" item ]    at most one "/" in all; empty: dimensionless
 *      factor  = "1" | "10" | "10**" power
 *      product = item *( "." item )
 *      item    = ( symbol | "(" unit ")" | "sqrt(" unit ")" ) [ "**" power ]
 *      power   = integer | "(" integer ")" | "(" decimal ")" | "(" integer "/" integer ")"
 *
 *  Scales are kept squared, as fractions of whole numbers and a power of pi, and exponents doubled, so that powers of
 *  a half stay exact too. */

import { InputProblem, InternalError } from './problem.ts';
import { baseUnits, definitions, plainBaseUnits, prefixes } from './unit-table.ts';

export interface Unit {
  /** Square of the scale to the base units, without pi: n/d. */
  readonly n: bigint;
  readonly d: bigint;
  /** Twice the exponent of pi. */
  readonly pi: number;
  /** Twice the exponent of each base unit. */
  readonly dimension: readonly number[];
}

const nothing: Unit = { n: 1n, d: 1n, pi: 0, dimension: baseUnits.map(() => 0) };

/** Bounds that no sensible unit reaches; they keep the whole numbers small. */
const MOST_LETTERS = 100;
const MOST_POWER = 99;
const MOST_DIMENSION = 120;
const LARGEST_SCALE = 1n << 4096n;

const known = new Map<string, Unit>();

/** What a unit's text means. @throws InputProblem `bad-unit`. Cost: a few microseconds, and nothing the second time. */
export function readUnit(text: string): Unit {
  const remembered = known.get(text);
  if (remembered !== undefined) return remembered;
  if (text.length > MOST_LETTERS) throw badUnit(text.slice(0, MOST_LETTERS), `${text.length} letters`);
  const cursor = { text, at: 0, slashes: 0 };
  const unit = text === '' ? nothing : readProduct(cursor);
  if (cursor.at < text.length) throw badUnit(text, `\`${text.slice(cursor.at)}\` after the unit`);
  if (known.size < 1000) known.set(text, unit);
  return unit;
}

interface Cursor {
  readonly text: string;
  at: number;
  slashes: number;
}

function readProduct(cursor: Cursor): Unit {
  const start = cursor.at;
  let unit = readFactor(cursor);
  const onlyFactor = cursor.at > start && /^(?:[/)]|$)/.test(cursor.text.slice(cursor.at));
  if (!onlyFactor) unit = times(unit, readItem(cursor), cursor);
  while (take(cursor, /\./y) !== undefined) unit = times(unit, readItem(cursor), cursor);
  if (take(cursor, /\//y) === undefined) return unit;
  cursor.slashes++;
  if (cursor.slashes > 1) throw badUnit(cursor.text, 'a second `/`');
  return times(unit, power(readItem(cursor), -2, cursor), cursor);
}

function readFactor(cursor: Cursor): Unit {
  if (take(cursor, /10\*\*/y) !== undefined) {
    const twice = readPower(cursor);
    return power({ ...nothing, n: 100n }, twice, cursor);
  }
  const digits = take(cursor, /10|1/y);
  return digits === '10' ? { ...nothing, n: 100n } : nothing;
}

function readItem(cursor: Cursor): Unit {
  const opening = take(cursor, /(?:sqrt)?\(/y);
  if (opening === undefined) return raised(readSymbol(cursor), cursor);
  const inside = readProduct(cursor);
  if (take(cursor, /\)/y) === undefined) throw badUnit(cursor.text, 'brackets that do not close');
  return raised(opening === '(' ? inside : power(inside, 1, cursor), cursor);
}

function raised(unit: Unit, cursor: Cursor): Unit {
  return take(cursor, /\*\*/y) === undefined ? unit : power(unit, readPower(cursor), cursor);
}

/** Twice the power. */
function readPower(cursor: Cursor): number {
  const written = take(cursor, /[+-]?\d+|\([+-]?\d+(?:\.\d+|\/\d+)?\)/y);
  const [top, bottom] = (written ?? '').replace(/[()]/g, '').split('/');
  const twice = (2 * Number(top)) / Number(bottom ?? 1);
  if (written === undefined || !Number.isInteger(twice) || !(Math.abs(twice) <= 2 * MOST_POWER)) {
    throw badUnit(cursor.text, `a power that is no whole or half number of at most ${MOST_POWER}`);
  }
  return twice;
}

function readSymbol(cursor: Cursor): Unit {
  const symbol = take(cursor, /[A-Za-z]+|%/y);
  if (symbol === undefined) {
    const rest = cursor.text.slice(cursor.at);
    throw badUnit(cursor.text, rest === '' ? 'an end where a unit must stand' : `\`${rest}\``);
  }
  if (/^(?:log|ln|exp)$/.test(symbol)) throw badUnit(cursor.text, `\`${symbol}()\`, which has no scale`);
  const unit = symbolMeans(symbol);
  if (unit === undefined) throw badUnit(cursor.text, `the unknown unit \`${symbol}\``);
  return unit;
}

function symbolMeans(symbol: string): Unit | undefined {
  const whole = plainMeans(symbol);
  if (whole !== undefined) return whole;
  for (const letters of [2, 1]) {
    const prefix = symbol.slice(0, letters);
    const rest = symbol.slice(letters);
    if (!Object.hasOwn(prefixes, prefix) || !takesPrefix(rest)) continue;
    const unit = plainMeans(rest);
    if (unit !== undefined) return multiplied(unit, power10(2 * prefixes[prefix]));
  }
  return undefined;
}

function takesPrefix(symbol: string): boolean {
  if (Object.hasOwn(definitions, symbol)) return definitions[symbol].prefixed === true;
  return !plainBaseUnits.includes(symbol);
}

function plainMeans(symbol: string): Unit | undefined {
  const base = baseUnits.indexOf(symbol as (typeof baseUnits)[number]);
  if (base >= 0) return { ...nothing, dimension: baseUnits.map((_, i) => (i === base ? 2 : 0)) };
  if (!Object.hasOwn(definitions, symbol)) return undefined;
  const { scale, unit, pi } = definitions[symbol];
  const [top, bottom] = scale.split('/').map(exactDecimal);
  const factor = bottom === undefined ? top : reduced(top.n * bottom.d, top.d * bottom.n);
  const one = multiplied(readUnit(unit), { n: factor.n * factor.n, d: factor.d * factor.d });
  return { ...one, pi: one.pi + 2 * (pi ?? 0) };
}

export interface Fraction {
  readonly n: bigint;
  readonly d: bigint;
}

/** The value of a decimal as ECMAScript writes numbers (`1.5e-3`), exactly. */
export function exactDecimal(text: string): Fraction {
  const parts = /^(-?)(\d+)(?:\.(\d+))?(?:e([+-]?\d+))?$/.exec(text);
  if (parts === null) throw new InternalError('exactDecimal', `not a decimal: ${text}`);
  const [, sign, whole, decimals = '', exponent = '0'] = parts;
  const digits = BigInt(sign + whole + decimals);
  const { n, d } = power10(Number(exponent) - decimals.length);
  return reduced(digits * n, d);
}

/** n/d in lowest terms. */
export function reduced(n: bigint, d: bigint): Fraction {
  let a = n < 0n ? -n : n;
  let b = d;
  while (b !== 0n) [a, b] = [b, a % b];
  return a === 0n ? { n: 0n, d: 1n } : { n: n / a, d: d / a };
}

/** base^exponent of whole numbers, exponent >= 0. */
export function wholePower(base: bigint, exponent: number): bigint {
  let result = 1n;
  for (let i = 0; i < exponent; i++) result *= base;
  return result;
}

function power10(exponent: number): Fraction {
  const ten = wholePower(10n, Math.abs(exponent));
  return exponent < 0 ? { n: 1n, d: ten } : { n: ten, d: 1n };
}

function multiplied(unit: Unit, squaredScale: Fraction): Unit {
  return { ...unit, ...reduced(unit.n * squaredScale.n, unit.d * squaredScale.d) };
}

function times(a: Unit, b: Unit, cursor: Cursor): Unit {
  const dimension = a.dimension.map((x, i) => x + b.dimension[i]);
  return bounded({ ...reduced(a.n * b.n, a.d * b.d), pi: a.pi + b.pi, dimension }, cursor);
}

/** A unit to the power twice/2. The square of the scale takes the same power; a half of an odd power has none. */
function power(unit: Unit, twice: number, cursor: Cursor): Unit {
  const dimension = unit.dimension.map((x) => (x * twice) / 2 + 0);
  const pi = (unit.pi * twice) / 2 + 0;
  const n = wholePower(unit.n, Math.abs(twice));
  const d = wholePower(unit.d, Math.abs(twice));
  const [rootN, rootD] = [wholeRoot(n), wholeRoot(d)];
  if (rootN === undefined || rootD === undefined || ![pi, ...dimension].every(Number.isInteger)) {
    throw badUnit(cursor.text, 'a root of a root');
  }
  return bounded({ n: twice < 0 ? rootD : rootN, d: twice < 0 ? rootN : rootD, pi, dimension }, cursor);
}

function bounded(unit: Unit, cursor: Cursor): Unit {
  const fits = unit.n < LARGEST_SCALE && unit.d < LARGEST_SCALE;
  if (fits && unit.dimension.every((x) => Math.abs(x) <= MOST_DIMENSION)) return unit;
  throw badUnit(cursor.text, 'powers beyond all measure');
}

/** The root of a square of whole numbers; undefined of anything else. Newton's iteration from above. */
export function wholeRoot(square: bigint): bigint | undefined {
  if (square < 2n) return square;
  let root = 1n << BigInt((square.toString(2).length + 1) >> 1);
  for (;;) {
    const next = (root + square / root) >> 1n;
    if (next >= root) break;
    root = next;
  }
  return root * root === square ? root : undefined;
}

function take(cursor: Cursor, pattern: RegExp): string | undefined {
  pattern.lastIndex = cursor.at;
  const found = pattern.exec(cursor.text)?.[0];
  if (found !== undefined) cursor.at += found.length;
  return found;
}

function badUnit(text: string, found: string): InputProblem {
  return new InputProblem({
    code: 'bad-unit',
    place: `unit \`${text}\``,
    expected: 'a unit of VOUnits 1.0, such as `uas`, `GHz`, `Jy/beam`',
    found,
    advice: 'Write `.` for a product, one `/`, `**` for a power; letters count as they stand.',
  });
}
