/** Gains of stations from logarithms of amplitudes by weighted least squares.
 *
 *  Every equation is a signed sum of ln|g|: for ln|V_ij / M_ij| against a model it is a_i + a_j; for the same far
 *  baseline seen by two co-located stations, ln|V_ac / V_bc|, it is a_a − a_b. With one a_i + a_j of equal error for
 *  every baseline of N stations the covariance is [I − J/(2N−2)]/(N−2) times that error squared. */

import { cholesky, invertCholesky } from './linear.ts';

export interface LogGainEquation {
  /** Station numbers from 0 and the signs with which their log gains enter. */
  readonly stations: readonly number[];
  readonly signs: readonly number[];
  readonly value: number;
  readonly sigma: number;
}

export interface LogGains {
  /** ln|g| by station. */
  readonly logGain: Float64Array;
  /** Square, stations on a side. */
  readonly covariance: Float64Array;
}

/** Solves for the log gains of `n` stations; null when the equations do not determine them.
 *  @param prior  standard deviation of every log gain around 0 that is added as knowledge; Infinity for none
 *  Cost O(equations + n³). */
export function solveLogGains(
  equations: readonly LogGainEquation[],
  n: number,
  prior: number,
): LogGains | null {
  const N = new Float64Array(n * n);
  const right = new Float64Array(n);
  for (let i = 0; i < n; i++) N[i * n + i] = 1 / (prior * prior);
  for (const { stations, signs, value, sigma } of equations) {
    const weight = 1 / (sigma * sigma);
    for (let a = 0; a < stations.length; a++) {
      right[stations[a]] += weight * signs[a] * value;
      for (let b = 0; b < stations.length; b++) {
        N[stations[a] * n + stations[b]] += weight * signs[a] * signs[b];
      }
    }
  }
  const L = cholesky(N, n);
  if (L === null || !isDetermined(N, L, n)) return null;
  const covariance = invertCholesky(L, n);
  const logGain = new Float64Array(n);
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < n; j++) logGain[i] += covariance[i * n + j] * right[j];
  }
  return { logGain, covariance };
}

/** Whether every pivot of the elimination stands above rounding: a singular matrix may factor by a hair. */
function isDetermined(N: Float64Array, L: Float64Array, n: number): boolean {
  for (let i = 0; i < n; i++) {
    const pivot = L[i * n + i] * L[i * n + i];
    if (!(pivot > 1e-12 * N[i * n + i])) return false;
  }
  return true;
}
