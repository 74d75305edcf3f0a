/** Order statistics, circular means, quantiles of two distributions. */

import { atan2, cos, ln, sin } from './elementary.ts';
import { erfcInverse } from './error-function.ts';

/** Returns the quantile of values by linear interpolation between order statistics, (n-1) q from 0.
 *  Hyndman and Fan 1996, Am. Stat. 50, 361, type 7. @throws RangeError for no values or q outside [0, 1]. */
export function quantile(values: ArrayLike<number>, q: number): number {
  return sortedQuantile(Float64Array.from(values).sort(), q);
}

/** Returns several quantiles for one sort. */
export function quantiles(values: ArrayLike<number>, qs: readonly number[]): number[] {
  const sorted = Float64Array.from(values).sort();
  return qs.map((q) => sortedQuantile(sorted, q));
}

function sortedQuantile(sorted: Float64Array, q: number): number {
  if (!(sorted.length > 0 && q >= 0 && q <= 1)) {
    throw new RangeError(`quantile: ${q} of ${sorted.length} values; needs values and a number in [0, 1]`);
  }
  const place = (sorted.length - 1) * q;
  const below = Math.floor(place);
  const fraction = place - below;
  return fraction === 0 ? sorted[below] : sorted[below] + fraction * (sorted[below + 1] - sorted[below]);
}

export function median(values: ArrayLike<number>): number {
  return quantile(values, 0.5);
}

/** Returns the median absolute deviation from the median, times 1 / normalQuantile(3/4), so that it is the standard
 *  deviation for Gaussian values. Hampel 1974, J. Am. Stat. Assoc. 69, 383. */
export function medianDeviation(values: ArrayLike<number>): number {
  const middle = median(values);
  return median(Float64Array.from(values, (value) => Math.abs(value - middle))) / 0.6744897501960817;
}

export function mean(values: ArrayLike<number>): number {
  let sum = 0;
  for (let k = 0; k < values.length; k++) sum += values[k];
  return sum / values.length;
}

/** Returns the standard deviation with divisor n-1; 0 for fewer than two values. */
export function standardDeviation(values: ArrayLike<number>): number {
  if (values.length < 2) return 0;
  const middle = mean(values);
  let sum = 0;
  for (let k = 0; k < values.length; k++) sum += (values[k] - middle) * (values[k] - middle);
  return Math.sqrt(sum / (values.length - 1));
}

export interface CircularMean {
  /** In [0, 360). */
  readonly degrees: number;
  /** Mean resultant length, 0 (spread evenly) to 1. */
  readonly length: number;
  /** sqrt(-2 ln length), degrees. */
  readonly deviationDegrees: number;
}

/** Returns the mean direction of angles. Mardia and Jupp 2000, Directional Statistics, sections 2.2 and 2.3. */
export function circularMean(degrees: ArrayLike<number>): CircularMean {
  if (!(degrees.length > 0)) throw new RangeError('circularMean: no angles');
  let x = 0;
  let y = 0;
  for (let k = 0; k < degrees.length; k++) {
    const radians = (degrees[k] * Math.PI) / 180;
    x += cos(radians);
    y += sin(radians);
  }
  const length = Math.min(1, Math.sqrt(x * x + y * y) / degrees.length);
  const angle = (atan2(y, x) * 180) / Math.PI;
  return {
    degrees: angle < 0 ? angle + 360 : angle,
    length,
    deviationDegrees: (Math.sqrt(-2 * ln(length)) * 180) / Math.PI,
  };
}

/** Returns the difference a - b of two angles, degrees in (-180, 180]. */
export function angleDifference(a: number, b: number): number {
  const turned = (a - b) % 360;
  if (turned > 180) return turned - 360;
  return turned <= -180 ? turned + 360 : turned;
}

/** Returns x with P(Z <= x) = p for a standard normal Z. */
export function normalQuantile(p: number): number {
  return -Math.SQRT2 * erfcInverse(2 * p);
}
