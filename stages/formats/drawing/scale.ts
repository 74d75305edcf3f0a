/** Scales of axes: from data to px, with ticks at round numbers. A round number is 1, 2 or 5 times a power of ten. */

import { log10 } from '../../numerics/elementary.ts';
import { InternalError } from '../../problem.ts';
import { withMinus } from './minus.ts';

export interface Tick {
  readonly value: number;
  /** Empty for a minor tick. */
  readonly label: string;
}

export interface Scale {
  /** px of a data value. */
  readonly at: (value: number) => number;
  readonly ticks: readonly Tick[];
  readonly domain: readonly [number, number];
  readonly range: readonly [number, number];
}

type Pair = readonly [number, number];

/** Returns a linear scale over `domain` to px `range`, with about `about` ticks (default 5). The domain may fall. */
export function linearScale(domain: Pair, range: Pair, about = 5): Scale {
  const [from, to] = domain;
  if (!(from !== to && Number.isFinite(from) && Number.isFinite(to))) {
    throw new InternalError('linearScale', `no scale from ${from} to ${to}`);
  }
  const slope = (range[1] - range[0]) / (to - from);
  const values = roundTicks(Math.min(from, to), Math.max(from, to), about);
  const step = values.length > 1 ? values[1] - values[0] : Math.abs(to - from);
  return {
    at: (value) => range[0] + (value - from) * slope,
    ticks: values.map((value) => ({ value, label: tickLabel(value, step) })),
    domain,
    range,
  };
}

/** Returns a logarithmic scale with a labelled tick at every power of ten, and at 2 and 5 times it when fewer than
 *  three powers lie inside; the others are minor. Labels between 0.001 and 1000 are plain, others powers. */
export function logScale(domain: Pair, range: Pair): Scale {
  const [from, to] = domain;
  if (!(from > 0 && to > from && Number.isFinite(to))) {
    throw new InternalError('logScale', `no logarithmic scale from ${from} to ${to}`);
  }
  const [low, high] = [log10(from), log10(to)];
  const [first, last] = [Math.floor(low), Math.ceil(high)];
  const powers = Array.from({ length: last - first + 1 }, (_, k) => first + k);
  const within = powers.filter((n) => powerOfTen(n) >= from && powerOfTen(n) <= to).length;
  const labelled = within >= 3 ? [1] : [1, 2, 5];
  const ticks: Tick[] = [];
  for (const n of powers) {
    for (let m = 1; m < 10; m++) {
      const value = Number(`${m}e${n}`);
      if (value < from || value > to) continue;
      ticks.push({ value, label: labelled.includes(m) ? logLabel(m, n) : '' });
    }
  }
  const slope = (range[1] - range[0]) / (high - low);
  return { at: (value) => range[0] + (log10(value) - low) * slope, ticks, domain, range };
}

/** Returns the multiples of a round step from low to high, about `about` of them. */
export function roundTicks(low: number, high: number, about: number): number[] {
  const step = roundStep((high - low) / about);
  const slack = 1e-9 * (high - low); // a limit that is itself a tick must survive rounding
  const ticks: number[] = [];
  for (let k = Math.ceil((low - slack) / step); k * step <= high + slack; k++) {
    ticks.push(Number((k * step).toPrecision(12)) + 0);
  }
  return ticks;
}

/** Returns the largest of 1, 2, 5 times a power of ten that is not far above `rough`: steps differ from it by a factor
 *  below 1.6. @throws InternalError unless it is positive. */
export function roundStep(rough: number): number {
  if (!(rough > 0 && Number.isFinite(rough))) throw new InternalError('roundStep', `no step near ${rough}`);
  let n = Math.floor(log10(rough));
  let mantissa = rough / powerOfTen(n);
  if (mantissa >= 10) {
    n += 1;
    mantissa /= 10;
  }
  // Boundaries are the geometric means: sqrt(1·2), sqrt(2·5), sqrt(5·10).
  const factor = mantissa < Math.SQRT2 ? 1 : mantissa < Math.sqrt(10) ? 2 : mantissa < Math.sqrt(50) ? 5 : 10;
  return Number(`${factor}e${n}`);
}

/** Returns a tick's label with as many decimals as the step needs and a true minus sign. */
export function tickLabel(value: number, step: number): string {
  if (value !== 0 && (Math.abs(step) < 1e-4 || Math.abs(value) >= 1e6)) return scientificLabel(value);
  const places = Math.max(0, -Math.floor(log10(step) + 1e-9));
  return withMinus(value.toFixed(Math.min(8, places)));
}

/** Returns an integer as superscript characters. */
export function superscript(n: number): string {
  const digits = '⁰¹²³⁴⁵⁶⁷⁸⁹';
  return [...String(n)].map((c) => (c === '-' ? '⁻' : (digits[Number(c)] as string))).join('');
}

/** Exact, for parsing a decimal literal is exactly specified and a power function is not. */
export function powerOfTen(n: number): number {
  return Number(`1e${n}`);
}

function logLabel(m: number, n: number): string {
  if (n >= -3 && n <= 3) return Number(`${m}e${n}`).toFixed(Math.max(0, -n));
  return m === 1 ? `10${superscript(n)}` : `${m}·10${superscript(n)}`;
}

function scientificLabel(value: number): string {
  const [mantissa, exponent] = value.toExponential(1).split('e') as [string, string];
  return `${withMinus(mantissa.replace(/\.0$/, ''))}·10${superscript(Number(exponent))}`;
}
