/** Gains of co-located stations: their ratios scan by scan, and from those a gain for each station, relative to the
 *  median of all stations compared. */

import type { Visibilities } from '../data.ts';
import { ln } from '../numerics/elementary.ts';
import { type LogGainEquation, solveLogGains } from '../numerics/gains.ts';
import { mean, median, standardDeviation } from '../numerics/statistics.ts';
import { amplitudeGroup, commonValue } from './agreement.ts';
import { baselineKey, type Pair, rowsByBaseline, type SharedScan } from './colocated.ts';

/** Log gains are believed to lie around 0 by this much; only what the equations leave free feels it. */
const PRIOR = 0.5;
/** How far the flux on two intra-site baselines may differ, as a fraction: stated, not measured. */
const SHORT_FLUX_ERROR = 0.05;

export interface PairGains {
  readonly pair: Pair;
  readonly scans: readonly number[];
  /** ln(g_a/g_b) by scan, with errors. */
  readonly logRatio: readonly number[];
  readonly sigma: readonly number[];
  /** Over scans. */
  readonly offset: number;
  /** Standard deviation over scans, less the noise. */
  readonly scatter: number;
}

/** Gain ratios of every pair that shares a far baseline in at least two scans. */
export function pairGains(visibilities: Visibilities, shared: readonly SharedScan[]): PairGains[] {
  const pairs = [...new Set(shared.map(({ pair }) => pair))];
  return pairs.flatMap((pair) => {
    const own = shared.filter((each) => each.pair === pair);
    if (own.length < 2) return [];
    const ratios = own.map((each) => commonValue(amplitudeGroup(visibilities, each)));
    const logRatio = ratios.map(({ value }) => value);
    const sigma = ratios.map((ratio) => ratio.sigma);
    const noise = mean(sigma.map((value) => value * value));
    const deviation = standardDeviation(logRatio);
    return [
      {
        pair,
        scans: own.map(({ scan }) => scan),
        logRatio,
        sigma,
        offset: mean(logRatio),
        scatter: Math.sqrt(Math.max(0, deviation * deviation - noise)),
      },
    ];
  });
}

export interface StationGain {
  readonly station: number;
  /** ln|g| less the median of all stations compared. */
  readonly logGain: number;
}

/** Gains of all stations that stand in pairs: pairs' ratios, and between pairs the amplitudes of their intra-site
 *  baselines, which see one flux. With one pair alone the ratio is halved between the two, and which of them is off
 *  cannot be said. */
export function stationGains(visibilities: Visibilities, pairs: readonly PairGains[]): StationGain[] {
  const stations = [...new Set(pairs.flatMap(({ pair }) => [pair.a, pair.b]))].sort((a, b) => a - b);
  const index = (station: number) => stations.indexOf(station);
  const equations: LogGainEquation[] = pairs.map(({ pair, offset, logRatio }) => ({
    stations: [index(pair.a), index(pair.b)],
    signs: [1, -1],
    value: offset,
    sigma: 0.01 + standardDeviation(logRatio) / Math.sqrt(logRatio.length),
  }));
  const sites = pairs.flatMap(({ pair }) => {
    const level = shortLevel(visibilities, pair);
    return level === undefined ? [] : [{ pair, level }];
  });
  for (const { pair, level } of sites.slice(1)) {
    equations.push({
      stations: [index(pair.a), index(pair.b), index(sites[0].pair.a), index(sites[0].pair.b)],
      signs: [1, 1, -1, -1],
      value: level - sites[0].level,
      sigma: SHORT_FLUX_ERROR,
    });
  }
  const solution = solveLogGains(equations, stations.length, PRIOR);
  if (solution === null || stations.length === 0) return [];
  const middle = median(solution.logGain);
  return stations.map((station, k) => ({ station, logGain: solution.logGain[k] - middle }));
}

/** Mean log amplitude of the baseline between the stations of a pair; undefined when it was not observed. */
function shortLevel(visibilities: Visibilities, { a, b }: Pair): number | undefined {
  const rows = rowsByBaseline(visibilities, 3);
  const levels: number[] = [];
  for (const scan of new Set(visibilities.scan)) {
    const row = rows.get(baselineKey(scan, a, b));
    if (row === undefined) continue;
    const { re, im } = visibilities;
    levels.push(0.5 * ln(re[row] * re[row] + im[row] * im[row]));
  }
  return levels.length === 0 ? undefined : mean(levels);
}
