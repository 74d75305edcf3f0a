/** Stations whose gains lie far off: their prior is widened, one station after the other, and the fit repeated.
 *
 *  A station is far off when the median of its log gains over the scans exceeds twice the standard deviation of its
 *  prior: with twenty scans and independent gains that is nine standard errors. Its new prior is as wide as one and a
 *  half times the rms of its gains, at least 0.5 (common practice: 50 % for a bad station). */

import type { Visibilities } from '../data.ts';
import { median } from '../numerics/statistics.ts';
import type { ScanGains } from './scan-gains.ts';

export interface StationGains {
  readonly station: string;
  readonly scans: number;
  /** Of the log gain over scans. */
  readonly median: number;
  readonly rms: number;
  readonly prior: number;
}

export interface Widening {
  readonly station: string;
  /** Index of the station. */
  readonly index: number;
  readonly median: number;
  readonly from: number;
  readonly to: number;
}

const FAR_OFF = 2;
const BAD_STATION = 0.5;
const OVER_RMS = 1.5;

/** Gains of every station that has any. */
export function summariseGains(
  data: Visibilities,
  gains: readonly ScanGains[],
  deviations: Float64Array,
): StationGains[] {
  return data.stations.flatMap(({ name }, index) => {
    const values = gains.flatMap((scan) => {
      const place = scan.stations.indexOf(index);
      return place < 0 ? [] : [scan.logGains[place]];
    });
    if (values.length === 0) return [];
    const square = values.reduce((sum, value) => sum + value * value, 0) / values.length;
    return [
      {
        station: name,
        scans: values.length,
        median: median(values),
        rms: Math.sqrt(square),
        prior: deviations[index],
      },
    ];
  });
}

/** The station furthest off whose prior may be widened, or null. @param named  stations whose prior the recipe states */
export function findFarOff(
  data: Visibilities,
  summary: readonly StationGains[],
  named: Readonly<Record<string, number>>,
): Widening | null {
  const off = summary
    .filter(({ station, median: m, prior }) => !(station in named) && Math.abs(m) > FAR_OFF * prior)
    .sort((a, b) => Math.abs(b.median) / b.prior - Math.abs(a.median) / a.prior);
  if (off.length === 0) return null;
  const [{ station, median: m, rms, prior }] = off;
  const index = data.stations.findIndex(({ name }) => name === station);
  return { station, index, median: m, from: prior, to: Math.max(BAD_STATION, OVER_RMS * rms) };
}
