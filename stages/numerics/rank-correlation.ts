/** Kendall's rank correlation: tau = (concordant − discordant pairs) / sqrt((all − tied in x)(all − tied in y)), and its
 *  significance by the normal approximation with the variance of the number of pairs under ties (Kendall 1938, Biometrika
 *  30, 81; Kendall, Rank Correlation Methods, 4th ed., sections 3.4 and 4.9):
 *    S = concordant − discordant
 *    var S = [n(n−1)(2n+5) − Σ t(t−1)(2t+5) − Σ u(u−1)(2u+5)] / 18
 *          + Σ t(t−1)(t−2) Σ u(u−1)(u−2) / (9 n(n−1)(n−2)) + Σ t(t−1) Σ u(u−1) / (2 n(n−1))
 *  with t and u the sizes of tied groups. S is drawn towards 0 by one, as it moves in steps of two. */

import { normalTail } from './tails.ts';

export interface RankCorrelation {
  /** -1 to 1; tau-b with ties. */
  readonly tau: number;
  /** S over its standard deviation; 0 where everything is tied. */
  readonly deviations: number;
  /** Two-sided. */
  readonly probability: number;
}

/** Returns the rank correlation of two lists of one length. Cost O(n²). */
export function rankCorrelation(x: ArrayLike<number>, y: ArrayLike<number>): RankCorrelation {
  const n = x.length;
  let S = 0;
  for (let i = 0; i < n; i++) {
    for (let j = i + 1; j < n; j++) S += sign(x[j] - x[i]) * sign(y[j] - y[i]);
  }
  const [t, u] = [tieSums(x), tieSums(y)];
  const pairs = (n * (n - 1)) / 2;
  const scale = Math.sqrt((pairs - t.two / 2) * (pairs - u.two / 2));
  const variance =
    (n * (n - 1) * (2 * n + 5) - t.five - u.five) / 18 +
    (n > 2 ? (t.three * u.three) / (9 * n * (n - 1) * (n - 2)) : 0) +
    (n > 1 ? (t.two * u.two) / (2 * n * (n - 1)) : 0);
  const drawn = Math.max(0, Math.abs(S) - 1) * sign(S);
  const deviations = variance > 0 ? drawn / Math.sqrt(variance) : 0;
  return {
    tau: scale > 0 ? S / scale : 0,
    deviations,
    probability: Math.min(1, 2 * normalTail(Math.abs(deviations))),
  };
}

/** Sums over groups of equal values: t(t−1), t(t−1)(t−2), t(t−1)(2t+5). */
function tieSums(values: ArrayLike<number>) {
  const sorted = Float64Array.from(values).sort();
  const sums = { two: 0, three: 0, five: 0 };
  for (let from = 0, to = 0; from < sorted.length; from = to) {
    while (to < sorted.length && sorted[to] === sorted[from]) to++;
    const t = to - from;
    sums.two += t * (t - 1);
    sums.three += t * (t - 1) * (t - 2);
    sums.five += t * (t - 1) * (2 * t + 5);
  }
  return sums;
}

function sign(value: number): number {
  return value > 0 ? 1 : value < 0 ? -1 : 0;
}
