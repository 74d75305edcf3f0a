/** Gains against time, whatever the source: the gain ratio of two co-located stations by scan, and the amplitude of the
 *  baseline between them, which sees one flux. With a and b the departures of their log gains from the usual,
 *    ratio:  a − b      short baseline:  a + b
 *  tell which of the two is off. Two successive scans are averaged: a drop that lasts an hour is in more than one, and
 *  what a single scan is off by is halved in variance. Departures of a pair that scatters more than stations good to 10 %
 *  do are scaled down to what these have: its calibration is poor, but that is no event. */

import type { Visibilities } from '../data.ts';
import { ln } from '../numerics/elementary.ts';
import { median, normalQuantile } from '../numerics/statistics.ts';
import type { Measured, Outcome } from './checks.ts';
import { baselineKey, rowsByBaseline } from './colocated.ts';
import { judge } from './findings.ts';
import type { CheckParameters } from './parameters.ts';
import type { PairGains } from './station-gains.ts';

/** Scans of a pair below which nothing is usual. */
const LEAST_SCANS = 4;
/** The least signal-to-noise ratio of the short baseline: a log amplitude is then good to a third. */
const SHORT_SNR = 3;

/** Standard deviation of departures up to which they count in full: 0.1 for two stations good to 10 %, with room for the
 *  chance of some ten scans. */
const USUAL = 0.12;

interface Jump {
  readonly gains: PairGains;
  /** Positions in `gains.scans`. */
  readonly at: number;
  /** Log gain ratio of two scans less the pair's median. */
  readonly departure: number;
  /** Its size, scaled down where the pair usually scatters much. */
  readonly value: number;
}

/** Sizes of departures, scaled down in proportion where their usual size is above that of sound stations. */
export function scaledSizes(departures: readonly number[], usual: number): number[] {
  const sizes = departures.map(Math.abs);
  const deviation = sizes.length === 0 ? 0 : median(sizes) / normalQuantile(0.75);
  const scale = deviation > usual ? usual / deviation : 1;
  return sizes.map((size) => size * scale);
}

export function checkPairGains(
  visibilities: Visibilities,
  { pairGains }: Measured,
  { limits }: CheckParameters,
): Outcome {
  const pairs = pairGains.filter(({ scans }) => scans.length >= LEAST_SCANS);
  if (pairs.length === 0) {
    const tooLittle = `no two co-located stations share a far baseline in ${LEAST_SCANS} scans`;
    return { check: 'pairGainsOverTime', tooLittle };
  }
  const jumps = pairs.flatMap(jumpsOf);
  const worst = jumps.reduce((a, b) => (b.value > a.value ? b : a));
  const { scans, pair } = worst.gains;
  const name = (station: number) => visibilities.stations[station].name;
  const detail =
    `Largest departure of a log gain ratio from its median over scans, two scans averaged: ${name(pair.a)} over ${name(pair.b)}, ` +
    `${Math.abs(worst.departure).toFixed(2)} ${worst.departure < 0 ? 'low' : 'high'} in scans ${scans[worst.at]} and ${scans[worst.at + 1]}; ` +
    `${culprit(visibilities, worst)}.`;
  return judge('pairGainsOverTime', worst.value, limits.pairGainsOverTime, detail);
}

function jumpsOf(gains: PairGains): Jump[] {
  const middle = median(gains.logRatio);
  const { logRatio } = gains;
  const departures = logRatio.slice(1).map((after, at) => (logRatio[at] + after) / 2 - middle);
  const values = scaledSizes(departures, USUAL);
  return departures.map((departure, at) => ({ gains, at, departure, value: values[at] }));
}

/** Which of the two stations is off, by the baseline between them. */
function culprit(visibilities: Visibilities, { gains: { pair, scans }, at, departure }: Jump): string {
  const levels = shortLevels(visibilities, pair.a, pair.b);
  const usual = [...levels.values()];
  const own = [scans[at], scans[at + 1]].map((scan) => levels.get(scan));
  if (usual.length < LEAST_SCANS || own.some((level) => level === undefined)) {
    return 'which of the two is off, the baseline between them does not say';
  }
  const sum = ((own[0] ?? 0) + (own[1] ?? 0)) / 2 - median(usual);
  const [a, b] = [(sum + departure) / 2, (sum - departure) / 2];
  const [station, off] = Math.abs(a) > Math.abs(b) ? [pair.a, a] : [pair.b, b];
  const name = visibilities.stations[station].name;
  return `by the baseline between them it is ${name}, ${Math.abs(off).toFixed(2)} ${off < 0 ? 'low' : 'high'}`;
}

/** Log amplitude of the baseline between two stations by scan. */
function shortLevels(visibilities: Visibilities, a: number, b: number): Map<number, number> {
  const { re, im, scan } = visibilities;
  const rows = rowsByBaseline(visibilities, SHORT_SNR);
  const levels = new Map<number, number>();
  for (const each of new Set(scan)) {
    const row = rows.get(baselineKey(each, a, b));
    if (row !== undefined) levels.set(each, 0.5 * ln(re[row] * re[row] + im[row] * im[row]));
  }
  return levels;
}
