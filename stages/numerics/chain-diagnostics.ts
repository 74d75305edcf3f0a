/** Whether Markov chains agree and how much they are worth: rank-normalised split R-hat with its folded part, effective
 *  sample sizes of bulk and tails, Monte-Carlo standard error of the mean.
 *  Source: Vehtari, Gelman, Simpson, Carpenter and Buerkner 2021, Bayesian Analysis 16, 667; the estimate of the
 *  autocorrelation time by Geyer's initial monotone sequence (Geyer 1992, Stat. Sci. 7, 473). */

import { log10 } from './elementary.ts';
import { mean, normalQuantile, quantiles, standardDeviation } from './statistics.ts';

/** Draws of one quantity: chains of equal length, four draws or more. */
export type Chains = readonly Float64Array[];

export interface ChainDiagnostics {
  /** The larger of R-hat of the ranks and of the folded ranks; 1 when chains agree. */
  readonly rHat: number;
  readonly essBulk: number;
  /** The smaller one of the 5 % and 95 % quantiles. */
  readonly essTail: number;
  /** Standard error of the mean. */
  readonly mcseMean: number;
}

/** Cost: sorting, and one sum over the draws for each lag until the correlation has died away.
 *  @throws RangeError for chains of unequal length or of fewer than four draws */
export function diagnose(chains: Chains): ChainDiagnostics {
  requireChains(chains);
  const split = splitChains(chains);
  const all = pooled(chains);
  const [low, median, high] = quantiles(all, [0.05, 0.5, 0.95]);
  const folded = split.map((chain) => chain.map((value) => Math.abs(value - median)));
  const ranks = rankNormalised(split);
  const below = (limit: number) => split.map((chain) => chain.map((value) => (value <= limit ? 1 : 0)));
  return {
    rHat: Math.max(basicRHat(ranks), basicRHat(rankNormalised(folded))),
    essBulk: effectiveSize(ranks),
    essTail: Math.min(effectiveSize(below(low)), effectiveSize(below(high))),
    mcseMean: standardDeviation(all) / Math.sqrt(effectiveSize(split)),
  };
}

/** The root of the variance between and within chains over that within (Gelman and Rubin 1992, Stat. Sci. 7, 457),
 *  of chains as they are. NaN where no chain moves. */
export function basicRHat(chains: Chains): number {
  const n = chains[0].length;
  const within = mean(chains.map(variance));
  const between = n * variance(Float64Array.from(chains, mean));
  return Math.sqrt(((n - 1) / n) * 1 + between / (n * within));
}

/** Each chain as two, its middle draw left out when their number is odd. */
export function splitChains(chains: Chains): Float64Array[] {
  const n = chains[0].length;
  const half = Math.floor(n / 2);
  return chains.flatMap((chain) => [chain.slice(0, half), chain.slice(n - half)]);
}

/** Ranks over all chains, ties sharing their mean rank, as normal deviates: Phi^-1((r - 3/8) / (S + 1/4)) (Blom 1958). */
export function rankNormalised(chains: Chains): Float64Array[] {
  const all = pooled(chains);
  const order = Array.from(all.keys()).sort((a, b) => all[a] - all[b]);
  const scores = new Float64Array(all.length);
  for (let from = 0; from < order.length; ) {
    let to = from + 1;
    while (to < order.length && all[order[to]] === all[order[from]]) to++;
    // Ranks from + 1 … to.
    const score = normalQuantile(((from + 1 + to) / 2 - 3 / 8) / (all.length + 1 / 4));
    for (let k = from; k < to; k++) scores[order[k]] = score;
    from = to;
  }
  const n = chains[0].length;
  return chains.map((_, c) => scores.slice(c * n, (c + 1) * n));
}

/** How many independent draws tell as much about the mean. Draws that anticorrelate count for more than they are, up to
 *  log10 of their number each. */
export function effectiveSize(chains: Chains): number {
  const n = chains[0].length;
  const total = chains.length * n;
  const means = Float64Array.from(chains, mean);
  const centred = chains.map((chain, c) => chain.map((value) => value - means[c]));
  const covariance = (lag: number) => mean(centred.map((chain) => autocovariance(chain, lag)));
  const within = (covariance(0) * n) / (n - 1);
  const variancePlus = (within * (n - 1)) / n + (chains.length > 1 ? variance(means) : 0);
  // A quantity that never changes has no error.
  if (!(variancePlus > 0)) return total;
  const correlation = (lag: number) => 1 - (within - covariance(lag)) / variancePlus;
  const rho = [1, correlation(1)];
  let t = 0;
  let [even, odd] = [1, rho[1]];
  while (t < n - 5 && even + odd > 0) {
    t += 2;
    [even, odd] = [correlation(t), correlation(t + 1)];
    if (even + odd >= 0) {
      rho[t] = even;
      rho[t + 1] = odd;
    }
  }
  if (even > 0) rho[t] = even;
  for (let k = 2; k <= t - 2; k += 2) {
    if (!(rho[k] + rho[k + 1] > rho[k - 2] + rho[k - 1])) continue;
    rho[k] = (rho[k - 2] + rho[k - 1]) / 2;
    rho[k + 1] = rho[k];
  }
  let sum = 0;
  for (let k = 0; k < t; k++) sum += rho[k];
  const time = Math.max(-1 + 2 * sum + (rho[t] ?? 0), 1 / log10(total));
  return total / time;
}

/** Divisor n. @param centred  of mean zero */
function autocovariance(centred: Float64Array, lag: number): number {
  let sum = 0;
  for (let k = lag; k < centred.length; k++) sum += centred[k] * centred[k - lag];
  return sum / centred.length;
}

function variance(values: Float64Array): number {
  const deviation = standardDeviation(values);
  return deviation * deviation;
}

function pooled(chains: Chains): Float64Array {
  const n = chains[0].length;
  const all = new Float64Array(chains.length * n);
  chains.forEach((chain, c) => {
    all.set(chain, c * n);
  });
  return all;
}

function requireChains(chains: Chains): void {
  const lengths = chains.map(({ length }) => length);
  if (chains.length >= 1 && lengths[0] >= 4 && lengths.every((length) => length === lengths[0])) return;
  throw new RangeError(
    `diagnose: chains of ${lengths.join(', ')} draws; equal lengths from four on are needed`,
  );
}
