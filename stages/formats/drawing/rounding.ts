/** Numbers with an uncertainty, rounded for reading: two significant digits of the smaller side of the interval, and
 *  the value to the same place (common practice; ISO 80000-1 annex B gives the rounding rule, "if two, the larger").
 *  Without an interval six significant digits are shown. */

import { withMinus } from './minus.ts';

export interface RoundedNumber {
  /** Decimal literals with ASCII minus, all to the same place; all but the value are absent when there is no interval.
   *  `up` and `down` are the sides' lengths, without sign; `low` and `high` the ends. */
  readonly value: string;
  readonly up?: string;
  readonly down?: string;
  readonly low?: string;
  readonly high?: string;
  /** All are to be multiplied by this power of ten; 0 for all numbers of common size. */
  readonly exponent: number;
}

/** Relative length of a side below which it is rounding: a thousand units in a double's last place. */
const ROUNDING = 1e-13;
/** Decimals that are still written out; beyond them a power of ten is split off. */
const MOST_DECIMALS = 6;

/** Returns a number rounded by its interval. An interval with one side of no length is rounded by the other side; with
 *  neither, or without an interval, six significant digits stand. Values that are not finite are spelled out. */
export function roundNumber(value: number, low: number | null, high: number | null): RoundedNumber {
  if (!Number.isFinite(value)) return { value: String(value), exponent: 0 };
  const sides = [low === null ? Number.NaN : value - low, high === null ? Number.NaN : high - value];
  // A side that is the rounding of its numbers has no length.
  const least = ROUNDING * Math.max(Math.abs(value), ...sides);
  const positive = sides.filter((side) => side > least && Number.isFinite(side));
  if (
    low === null ||
    high === null ||
    positive.length === 0 ||
    sides.some((side) => !Number.isFinite(side))
  ) {
    return plainNumber(value);
  }
  const place = placeOf(Math.min(...positive));
  const largest = Math.max(Math.abs(value), ...positive);
  const exponent = place < -MOST_DECIMALS || place > 6 ? decade(largest) : 0;
  const scaled = (x: number) => roundTo(x, place, exponent);
  return {
    value: scaled(value),
    up: scaled(Math.max(0, high - value)),
    down: scaled(Math.max(0, value - low)),
    low: scaled(low),
    high: scaled(high),
    exponent,
  };
}

/** Returns `42.10 +0.83 −0.71`, or the value alone without an interval, for a table or a figure. */
export function roundedNumber(value: number, low: number | null, high: number | null): string {
  const { value: text, up, down, exponent } = roundNumber(value, low, high);
  const interval = up === undefined ? '' : ` +${up} −${down}`;
  const power = exponent === 0 ? '' : ` e${exponent}`;
  return withMinus(`${text}${interval}${power}`);
}

/** The power of ten of the second significant digit of a positive number, after rounding to two digits. */
function placeOf(uncertainty: number): number {
  return Number(uncertainty.toExponential(1).split('e')[1]) - 1;
}

/** The power of ten of the first digit, of the value as it stands: a decade found after rounding would round twice. */
function decade(value: number): number {
  return value === 0 ? 0 : Number(value.toExponential().split('e')[1]);
}

/** A number to the place of 10^place, in units of 10^exponent. */
function roundTo(x: number, place: number, exponent: number): string {
  const digits = decade(x) - place;
  // toExponential rounds the exact value of the double once; toFixed after a division would round twice.
  const rounded = digits >= 0 ? x.toExponential(Math.min(100, digits)) : roundSmall(x, place);
  const shifted = Number(`${rounded.split('e')[0]}e${Number(rounded.split('e')[1] ?? 0) - exponent}`);
  const text = shifted.toFixed(Math.min(100, Math.max(0, exponent - place)));
  return Number(text) === 0 ? text.replace('-', '') : text;
}

/** A number below the place itself becomes one unit of the place or nothing. */
function roundSmall(x: number, place: number): string {
  return 2 * Math.abs(x) >= Number(`1e${place}`) ? `${x < 0 ? -1 : 1}e${place}` : '0e0';
}

function plainNumber(value: number): RoundedNumber {
  const [mantissa, power] = value.toExponential(5).split('e') as [string, string];
  const exponent = Number(power);
  const trim = (text: string) => (text.includes('.') ? text.replace(/\.?0+$/, '') : text);
  if (value !== 0 && (exponent < -4 || exponent > 6)) return { value: trim(mantissa), exponent };
  return { value: trim(Number(value.toPrecision(6)).toFixed(Math.max(0, 5 - exponent))), exponent: 0 };
}
