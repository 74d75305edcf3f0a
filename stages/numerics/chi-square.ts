/** Probability and quantile of a chi-square. */

import { gammaIncomplete, gammaIncompleteInverse } from './gamma.ts';

/** P(X > x) for a chi-square X with k degrees of freedom: Q(k/2, x/2). */
export function chiSquareTail(x: number, k: number): number {
  return x > 0 ? Math.min(1, Math.max(0, gammaIncomplete(x / 2, k / 2, true, true))) : 1;
}

/** Returns x with P(X <= x) = p for a chi-square X with k degrees of freedom, 2 P^-1(k/2, p). */
export function chiSquareQuantile(p: number, k: number): number {
  return 2 * gammaIncompleteInverse(p, k / 2);
}
