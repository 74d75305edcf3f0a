/** Units and quantities: `160 uas`, `10 min`, `1.3 mm`.
 *
 *  Units follow VOUnits 1.0 (IVOA Recommendation, 2014): letters count as they stand, `.` is the product, one `/` at
 *  most, `**` the power; the empty text is dimensionless. Besides, `uas` is read and stays `uas`. Left out: `log`,
 *  `ln`, `exp`, powers other than halves, quoted units, deprecated and rare units (unit-table.ts lists what is known).
 *
 *  Conversion takes a number as the decimal that it prints as, works in whole numbers and rounds once: 0.16 mas and
 *  160 uas are the same number of uas, to the last bit. */

import { didYouMean } from './near-miss.ts';
import { InputProblem, InternalError } from './problem.ts';
import { exactDecimal, type Fraction, readUnit, type Unit, wholePower, wholeRoot } from './unit-grammar.ts';
import { baseUnits, commonUnits, dimensionNames, spelledOut } from './unit-table.ts';

export interface Quantity {
  readonly value: number;
  /** As written; '' for none. */
  readonly unit: string;
}

const QUANTITY = /^([+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d+)?)(?: +([^\s].*))?$/;

/** Reads a number, a space and a unit. The number alone has the unit ''.
 *  @throws InputProblem `bad-quantity`, or `bad-unit` with the near miss. */
export function parseQuantity(text: string): Quantity {
  const [, digits, unit = ''] = QUANTITY.exec(text) ?? [];
  if (digits === undefined) throw badQuantity(text, adviceOnQuantity(text));
  const value = Number(digits);
  if (!Number.isFinite(value)) throw badQuantity(text, 'The number is beyond what a double holds.');
  checkUnit(unit);
  return { value: value + 0, unit };
}

/** Writes what parseQuantity reads. */
export function formatQuantity(value: number, unit: string): string {
  if (!Number.isFinite(value)) throw new InternalError('formatQuantity', `not finite: ${value}`);
  return unit === '' ? String(value + 0) : `${value + 0} ${unit}`;
}

/** The value in another unit, rounded once from the decimal that `value` prints as; NaN and infinities stay.
 *  Cost: a few microseconds; take convert(1, from, to) as a factor where that is too slow.
 *  @throws InputProblem `bad-unit`, or `wrong-dimension` for unlike dimensions. */
export function convert(value: number, from: string, to: string): number {
  if (dimensionOf(from) !== dimensionOf(to)) throw unlikeDimensions(from, to);
  if (from === to || !Number.isFinite(value)) return value;
  const [a, b] = [readUnit(from), readUnit(to)];
  return multiply(exactDecimal(String(value)), { n: a.n * b.d, d: a.d * b.n }, a.pi - b.pi);
}

/** The dimension's name, such as `angle` or `flux density per beam`; where it has none, base units and powers.
 *  Units can be converted when this text is the same. @throws InputProblem `bad-unit`. */
export function dimensionOf(unit: string): string {
  if (nameOf.size === 0) {
    for (const [name, like] of dimensionNames) nameOf.set(formatDimension(readUnit(like)), name);
  }
  const dimension = formatDimension(readUnit(unit));
  return nameOf.get(dimension) ?? dimension;
}

/** Names by formatted dimension; filled at the first question. */
const nameOf = new Map<string, string>();

/** Whether the text is a unit that is known here. */
export function isUnit(text: string): boolean {
  try {
    readUnit(text);
    return true;
  } catch (error) {
    if (error instanceof InputProblem) return false;
    throw error;
  }
}

/** The unit that a misspelt one was probably meant to be: `ghz` GHz, `μas` uas, `microarcsec` uas. */
export function nearUnit(text: string): string | undefined {
  const ascii = text
    .replace(/[\u03bc\u00b5]/g, 'u')
    .replace(/\^/g, '**')
    .replace(/ +per +/g, '/')
    .replace(/ /g, '');
  const spelled = ascii.toLowerCase();
  if (Object.hasOwn(spelledOut, spelled)) return spelledOut[spelled];
  if (ascii !== text && isUnit(ascii)) return ascii;
  const sameLetters = commonUnits.find((unit) => unit.toLowerCase() === spelled);
  if (sameLetters !== undefined) return sameLetters;
  return spelled.length < 3
    ? undefined
    : commonUnits.find((unit) => oneLetterOff(spelled, unit.toLowerCase()));
}

function oneLetterOff(a: string, b: string): boolean {
  return didYouMean(a, [b]) !== '';
}

function checkUnit(unit: string): void {
  try {
    readUnit(unit);
  } catch (error) {
    const near = nearUnit(unit);
    if (!(error instanceof InputProblem) || near === undefined) throw error;
    const { code, place, expected, found } = error;
    throw new InputProblem({ code, place, expected, found, advice: `Did you mean \`${near}\`?` });
  }
}

/** value × sqrt(square) × pi^(twicePi/2), rounded once where the root is whole and pi's power too. */
function multiply(value: Fraction, square: Fraction, twicePi: number): number {
  const [top, bottom] = [wholeRoot(square.n * square.d), square.d];
  if (top === undefined || twicePi % 2 !== 0) return multiplyByRoot(value, square, twicePi);
  const power = twicePi / 2;
  const [piN, piD] = [wholePower(PI.n, Math.abs(power)), wholePower(PI.d, Math.abs(power))];
  const n = value.n * top * (power < 0 ? piD : piN);
  return roundedQuotient(n, value.d * bottom * (power < 0 ? piN : piD));
}

/** Units that hold the root of a half: three roundings. */
function multiplyByRoot(value: Fraction, square: Fraction, twicePi: number): number {
  const pi = wholePower(PI.n, Math.abs(twicePi));
  const one = wholePower(PI.d, Math.abs(twicePi));
  const [n, d] = twicePi < 0 ? [square.n * one, square.d * pi] : [square.n * pi, square.d * one];
  return roundedQuotient(value.n, value.d) * Math.sqrt(roundedQuotient(n, d));
}

/** pi to 50 decimals: far beyond a double, so that only a tie within 1e-34 could round wrong. */
const PI: Fraction = { n: 314159265358979323846264338327950288419716939937510n, d: wholePower(10n, 50) };

/** n/d as the nearest double. 66 bits of the quotient and a sticky one are rounded by Number(). */
function roundedQuotient(n: bigint, d: bigint): number {
  const negative = n < 0n;
  const size = negative ? -n : n;
  const shift = 66 + d.toString(2).length - size.toString(2).length;
  const [top, bottom] = shift > 0 ? [size << BigInt(shift), d] : [size, d << BigInt(-shift)];
  const quotient = top / bottom;
  const sticky = quotient * bottom === top ? 0n : 1n;
  let result = Number(quotient | sticky);
  for (let i = 0; i < Math.abs(shift); i++) result *= shift > 0 ? 0.5 : 2;
  return negative ? -result : result;
}

function formatDimension(unit: Unit): string {
  const powers = unit.dimension
    .map((twice, i) => ({ symbol: baseUnits[i], twice }))
    .filter(({ twice }) => twice !== 0);
  return powers.map(({ symbol, twice }) => `${symbol}${formatPower(twice)}`).join('.');
}

function formatPower(twice: number): string {
  if (twice === 2) return '';
  return twice % 2 === 0 ? `**${twice / 2}` : `**(${twice}/2)`;
}

function badQuantity(text: string, advice: string): InputProblem {
  return new InputProblem({
    code: 'bad-quantity',
    place: 'quantity',
    expected: 'a number, a space and a unit, such as `160 uas`',
    found: JSON.stringify(text),
    advice,
  });
}

function adviceOnQuantity(text: string): string {
  const parts = /^\s*([+-]?[\d.]+(?:[eE][+-]?\d+)?)\s*(\S+)\s*$/.exec(text);
  if (parts !== null && isUnit(parts[2])) return `Write \`${parts[1]} ${parts[2]}\`.`;
  return 'Write the number with a decimal point, one space, then the unit.';
}

function unlikeDimensions(from: string, to: string): InputProblem {
  return new InputProblem({
    code: 'wrong-dimension',
    place: `unit \`${from}\``,
    expected: `a unit of ${dimensionOf(to)}, such as \`${to}\``,
    found: `\`${from}\` (${dimensionOf(from)})`,
    advice: 'Write the quantity in a unit of the right dimension.',
  });
}
