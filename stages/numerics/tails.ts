/** Probabilities in the tails of distributions, and from a probability to the number of standard deviations that a
 *  normal value would need for it. */

import { exp, expm1, ln, log1p } from './elementary.ts';
import { erfc } from './error-function.ts';
import { lnGamma } from './gamma.ts';
import { normalQuantile } from './statistics.ts';

/** P(Z > x) for a standard normal Z. */
export function normalTail(x: number): number {
  return 0.5 * erfc(x / Math.SQRT2);
}

/** P(X >= least) for a binomial X of n trials of probability p, by summing the terms. Cost O(n). */
export function binomialTail(least: number, n: number, p: number): number {
  if (least <= 0) return 1;
  if (!(p > 0)) return 0;
  if (p >= 1) return 1;
  let sum = 0;
  for (let k = Math.ceil(least); k <= n; k++) {
    const choose = lnGamma(n + 1) - lnGamma(k + 1) - lnGamma(n - k + 1);
    sum += exp(choose + k * ln(p) + (n - k) * log1p(-p));
  }
  return Math.min(1, sum);
}

/** The probability that the least likely of `trials` independent values is as unlikely as p (Šidák 1967, J. Am. Stat.
 *  Assoc. 62, 626): 1 − (1 − p)^trials. */
export function ofTrials(p: number, trials: number): number {
  if (p >= 1) return 1;
  return -expm1(trials * log1p(-p));
}

/** Standard deviations beyond which, on either side, a normal value lies with probability p; 0 for p = 1, never above
 *  37, where p underflows. */
export function deviationsOf(p: number): number {
  return p >= 1 ? 0 : -normalQuantile(Math.max(p, 1e-300) / 2);
}
