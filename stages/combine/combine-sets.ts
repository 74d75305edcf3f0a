/** A weighted mean with a variance between the sets. With weights w = 1/s^2, mean m and Q = sum w (x - m)^2 of k sets
 *
 *    tau^2 = max(0, (Q - (k - 1)) / (sum w - sum w^2 / sum w))             DerSimonian and Laird 1986, eq. 8
 *    mean M with weights v = 1 / (s^2 + tau^2)
 *
 *  Q is chi-square of k - 1 degrees of freedom where the sets agree (Cochran 1954).
 *
 *  The interval is M +- t(k - 1) sqrt(q / sum v), q = sum v (x - M)^2 / (k - 1), with the quantile of Student's t (Hartung
 *  and Knapp 2001, Stat. Med. 20, 3875; Knapp and Hartung 2003, Stat. Med. 22, 2693): few sets tell little about the
 *  variance between them, which a normal quantile forgets. Sets that happen to lie close together would make it narrower
 *  than their own errors allow; it is never narrower than that of sets that agree, normal with variance 1 / sum w. Of 20,000
 *  simulated means of 2, 3, 4, 12 sets of unequal errors the 68 % interval held the truth in 69, 67, 66, 67 % and the 95 %
 *  interval in 95, 94, 94, 94 % where the sets scatter by twice their errors (with the normal quantile in 55, 58, 59, 65 %
 *  and 78, 82, 85, 91 %); where they agree, in 81, 78, 77, 73 % and 99, 99, 98, 97 %. The price: of two sets the 95 %
 *  interval is typically four times as wide as if they were known to agree.
 *
 *  Sets count as independent: an error that they share (a distance, a calibration, the method's bias) is no smaller in the
 *  mean, but comes out so. */

import { gammaIncomplete } from '../numerics/gamma.ts';
import { normalQuantile } from '../numerics/statistics.ts';
import { studentQuantile } from '../numerics/student.ts';

export interface SetValue {
  readonly value: number;
  readonly deviation: number;
}

export interface Combined {
  readonly value: number;
  /** Of the mean, were the variance between the sets known: sqrt(1 / sum v). */
  readonly deviation: number;
  /** Of the mean by the scatter of the sets: sqrt(q / sum v), to be taken with Student's t. */
  readonly deviationByScatter: number;
  /** Of the mean of sets that agree: sqrt(1 / sum w). */
  readonly deviationIfAgreed: number;
  /** Standard deviation between the sets. */
  readonly between: number;
  readonly chiSquare: number;
  readonly degreesOfFreedom: number;
  /** Of a chi-square as large by chance. */
  readonly probability: number;
  readonly sets: readonly (SetValue & { readonly weight: number })[];
}

/** @param sets  two or more, with deviations above 0 */
export function combineSets(sets: readonly SetValue[]): Combined {
  const plain = weighted(sets, 0);
  const degreesOfFreedom = sets.length - 1;
  const squares = plain.weights.reduce((sum, weight) => sum + weight * weight, 0);
  const variance = Math.max(0, (plain.scatter - degreesOfFreedom) / (plain.sum - squares / plain.sum));
  const { mean, sum, weights, scatter } = weighted(sets, variance);
  return {
    value: mean,
    deviation: 1 / Math.sqrt(sum),
    deviationByScatter: Math.sqrt(scatter / degreesOfFreedom / sum),
    deviationIfAgreed: 1 / Math.sqrt(plain.sum),
    between: Math.sqrt(variance),
    chiSquare: plain.scatter,
    degreesOfFreedom,
    probability: 1 - gammaIncomplete(plain.scatter / 2, degreesOfFreedom / 2),
    sets: sets.map((set, k) => ({ ...set, weight: weights[k] / sum })),
  };
}

/** How far the end of an interval lies from the mean. @param p  of the end: 0.84 for the upper one of 68 % */
export function stepTo(
  p: number,
  {
    deviationByScatter,
    deviationIfAgreed,
    degreesOfFreedom,
  }: Pick<Combined, 'deviationByScatter' | 'deviationIfAgreed' | 'degreesOfFreedom'>,
): number {
  const byScatter = studentQuantile(p, degreesOfFreedom) * deviationByScatter;
  const ifAgreed = normalQuantile(p) * deviationIfAgreed;
  return Math.abs(byScatter) > Math.abs(ifAgreed) ? byScatter : ifAgreed;
}

/** Weighted mean, and the weighted sum of squares about it. */
function weighted(sets: readonly SetValue[], variance: number) {
  const weights = sets.map(({ deviation }) => 1 / (deviation * deviation + variance));
  const sum = weights.reduce((total, weight) => total + weight, 0);
  const mean = sets.reduce((total, { value }, k) => total + weights[k] * value, 0) / sum;
  const scatter = sets.reduce(
    (total, { value }, k) => total + weights[k] * (value - mean) * (value - mean),
    0,
  );
  return { mean, sum, weights, scatter };
}
