/** Gains against time without co-located stations and without a fit: amplitudes of all baselines of one station that fall
 *  and rise together from scan to scan, while those of the others do not.
 *
 *  For every baseline the mean log amplitude of two scans is compared with the mean of the two before and the two after:
 *    D_ij = (l_t + l_t+1)/2 − (l_t−2 + l_t−1 + l_t+2 + l_t+3)/4,   l = ln|V_ij|
 *  in which a source whose log amplitude runs straight along the track drops out. Then D_ij = d_i + d_j + rest, where the
 *  rest is what the track bends, large beside a null of one baseline. So it is solved for least absolute deviations
 *  (iterated weights; Schlossmacher 1973, J. Am. Stat. Assoc. 68, 857), which a few such baselines do not move. Log
 *  closure amplitudes cannot see d_i; this sees it only where it changes within some scans. The first and the last two
 *  scans have nothing on one side and are not judged. As with co-located pairs, departures of a station that scatters much
 *  are scaled down (gain-history.ts). */

import type { Visibilities } from '../data.ts';
import { scanNumbers } from '../numerics/closures.ts';
import { ln } from '../numerics/elementary.ts';
import { type LogGainEquation, solveLogGains } from '../numerics/gains.ts';
import type { Outcome } from './checks.ts';
import { judge } from './findings.ts';
import { scaledSizes } from './gain-history.ts';
import type { CheckParameters } from './parameters.ts';

/** A station on fewer baselines is not told from them. */
const LEAST_BASELINES = 3;
const STEPS = 30;
/** Log amplitudes; below it residuals count alike, which keeps the weights finite. */
const FLOOR = 0.01;
/** Standard deviation of departures up to which they count in full: 0.09 for a station good to 10 %, with room for chance
 *  and what the source bends. */
const USUAL = 0.11;
/** Standard deviation of a log gain that the equations leave free. */
const PRIOR = 10;

export interface StationDip {
  readonly station: number;
  /** The two scans. */
  readonly scans: readonly [number, number];
  /** Of the log gain against the scans around. */
  readonly departure: number;
}

/** Departures of every station in every two successive scans that have two before and two after. */
export function stationDips(visibilities: Visibilities, minimumSnr: number): StationDip[] {
  const levels = levelsByBaseline(visibilities, minimumSnr);
  const scans = scanNumbers(visibilities);
  return scans.slice(2, -3).flatMap((_, k) => dipsAt(levels, scans.slice(k, k + 6)));
}

export function checkStationAmplitudes(visibilities: Visibilities, parameters: CheckParameters): Outcome {
  const check = 'stationAmplitudes';
  const dips = stationDips(visibilities, parameters.minimumSnr);
  if (dips.length < parameters.least) {
    return {
      check,
      tooLittle: `${dips.length} pairs of scans have a station on ${LEAST_BASELINES} baselines with two scans before and after, at least ${parameters.least} are needed`,
    };
  }
  const { worst, value } = largestDip(dips);
  const detail =
    `Log amplitudes of all baselines of one station in two scans against the two before and after, largest of ${dips.length}: ` +
    `${visibilities.stations[worst.station].name}, ${Math.abs(worst.departure).toFixed(2)} ${worst.departure < 0 ? 'low' : 'high'} in scans ${worst.scans.join(' and ')}.`;
  return judge(check, value, parameters.limits.stationAmplitudes, detail);
}

function largestDip(dips: readonly StationDip[]): { worst: StationDip; value: number } {
  const judged = [...new Set(dips.map(({ station }) => station))].flatMap((station) => {
    const own = dips.filter((dip) => dip.station === station);
    const values = scaledSizes(
      own.map(({ departure }) => departure),
      USUAL,
    );
    return own.map((worst, k) => ({ worst, value: values[k] }));
  });
  return judged.reduce((a, b) => (b.value > a.value ? b : a));
}

/** Log amplitude by baseline `i-j` and scan. */
type Levels = ReadonlyMap<
  string,
  { readonly i: number; readonly j: number; readonly byScan: Map<number, number> }
>;

function levelsByBaseline(data: Visibilities, minimumSnr: number): Levels {
  const levels = new Map<string, { i: number; j: number; byScan: Map<number, number> }>();
  for (let k = 0; k < data.count; k++) {
    const power = data.re[k] * data.re[k] + data.im[k] * data.im[k];
    const least = minimumSnr * data.sigma[k];
    if (!(power > 0 && power >= least * least)) continue;
    const [i, j] = [data.station1[k], data.station2[k]];
    const found = levels.get(`${i}-${j}`) ?? { i, j, byScan: new Map() };
    found.byScan.set(data.scan[k], 0.5 * ln(power));
    levels.set(`${i}-${j}`, found);
  }
  return levels;
}

function dipsAt(levels: Levels, six: readonly number[]): StationDip[] {
  const equations: { i: number; j: number; value: number }[] = [];
  for (const { i, j, byScan } of levels.values()) {
    const l = six.map((scan) => byScan.get(scan) ?? Number.NaN);
    const value = (l[2] + l[3]) / 2 - (l[0] + l[1] + l[4] + l[5]) / 4;
    if (Number.isFinite(value)) equations.push({ i, j, value });
  }
  const used = stationsOnEnough(equations);
  const kept = equations.filter(({ i, j }) => used.includes(i) && used.includes(j));
  const departures = leastAbsolute(kept, used);
  if (departures === null) return [];
  return used.map((station, k) => ({ station, scans: [six[2], six[3]], departure: departures[k] }));
}

/** Stations that stand on enough baselines among each other. */
function stationsOnEnough(equations: readonly { readonly i: number; readonly j: number }[]): number[] {
  let used = [...new Set(equations.flatMap(({ i, j }) => [i, j]))].sort((a, b) => a - b);
  for (;;) {
    const inside = equations.filter(({ i, j }) => used.includes(i) && used.includes(j));
    const left = used.filter(
      (station) => inside.filter(({ i, j }) => i === station || j === station).length >= LEAST_BASELINES,
    );
    if (left.length === used.length) return left;
    used = left;
  }
}

/** Log gains d with the least sum of |D_ij − d_i − d_j|; null when the equations do not determine them. */
function leastAbsolute(
  equations: readonly { readonly i: number; readonly j: number; readonly value: number }[],
  used: readonly number[],
): Float64Array | null {
  if (used.length === 0) return null;
  const at = (station: number) => used.indexOf(station);
  let d: Float64Array | null = null;
  for (let step = 0; step < STEPS; step++) {
    const weighted = equations.map(({ i, j, value }): LogGainEquation => {
      const rest = d === null ? 1 : Math.abs(value - d[at(i)] - d[at(j)]);
      return { stations: [at(i), at(j)], signs: [1, 1], value, sigma: Math.sqrt(Math.max(rest, FLOOR)) };
    });
    d = solveLogGains(weighted, used.length, PRIOR)?.logGain ?? null;
    if (d === null) return null;
  }
  return d;
}
