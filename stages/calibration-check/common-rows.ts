/** Rows that two sets of visibilities have in common: one observation in two bands or two hands, or the same tracks on two
 *  days. Stations are the same by name; scans by time, since each set counts its own; by sidereal time when the two were
 *  observed half a day apart or more. */

import type { Station, Visibilities } from '../data.ts';
import { type ClosureData, scanNumbers } from '../numerics/closures.ts';
import { mean } from '../numerics/statistics.ts';
import { InputProblem } from '../problem.ts';

/** The common rows in the numbering of the first set: scans, stations, (u,v) and visibilities are its own. */
export interface CommonRows {
  readonly first: ClosureData & { readonly stations: readonly Station[] };
  /** Visibilities of the other set on the same baselines, in the same direction. */
  readonly other: {
    readonly re: Float64Array;
    readonly im: Float64Array;
    readonly sigma: Float64Array;
    readonly sigmaPhase: Float64Array;
  };
  /** Rows in common before those were left out whose (u,v) differ too much. */
  readonly found: number;
  /** Median relative difference of (u,v) over those; 0 without any. */
  readonly uvDifference: number;
  /** By how many days the other was observed later; 0 when at the same time. */
  readonly days: number;
}

/** Degrees; a second of arc. */
const SAME_PLACE = 1 / 3600;

/** @param most        largest relative difference of (u,v), |(u,v) - (u',v')| / |(u,v)|
 *  @param minimumSnr  least signal-to-noise ratio of both visibilities
 *  @throws InputProblem when the two do not have one target */
export function commonRows(
  first: Visibilities,
  other: Visibilities,
  most: number,
  minimumSnr: number,
): CommonRows {
  requireOneTarget(first, other);
  const days = daysBetween(first, other);
  const matches = matchRows(first, other, minimumSnr, days);
  const kept = matches.filter(({ difference }) => difference <= most);
  const differences = matches.map(({ difference }) => difference).sort((a, b) => a - b);
  const own = (values: Float64Array) => Float64Array.from(kept, ({ row }) => values[row]);
  const ownIndex = (values: Int32Array) => Int32Array.from(kept, ({ row }) => values[row]);
  const others = (values: Float64Array) => Float64Array.from(kept, ({ otherRow }) => values[otherRow]);
  const { stations, station1, station2, scan, u, v, re, im, sigma, sigmaPhase } = first;
  return {
    first: {
      stations,
      count: kept.length,
      station1: ownIndex(station1),
      station2: ownIndex(station2),
      scan: ownIndex(scan),
      u: own(u),
      v: own(v),
      re: own(re),
      im: own(im),
      sigma: own(sigma),
      sigmaPhase: own(sigmaPhase),
    },
    other: {
      re: others(other.re),
      im: Float64Array.from(kept, ({ otherRow, sense }) => sense * other.im[otherRow]),
      sigma: others(other.sigma),
      sigmaPhase: others(other.sigmaPhase),
    },
    found: matches.length,
    uvDifference: differences[Math.floor(differences.length / 2)] ?? 0,
    days,
  };
}

/** Turns of the Earth against the stars in a day (Aoki et al. 1982, A&A 105, 359). */
const TURNS_PER_DAY = 1.00273790935;

/** From the middle of one observation to that of the other, rounded to whole turns of the Earth, days; 0 below half. */
function daysBetween(first: Visibilities, other: Visibilities): number {
  if (first.count === 0 || other.count === 0) return 0;
  return Math.round((middleOf(other) - middleOf(first)) * TURNS_PER_DAY) / TURNS_PER_DAY;
}

function middleOf({ timeMjd }: Visibilities): number {
  let [least, most] = [timeMjd[0], timeMjd[0]];
  for (const time of timeMjd) {
    least = Math.min(least, time);
    most = Math.max(most, time);
  }
  return (least + most) / 2;
}

function requireOneTarget({ target }: Visibilities, { target: other }: Visibilities): void {
  const apart = Math.max(
    Math.abs(target.raDegrees - other.raDegrees),
    Math.abs(target.decDegrees - other.decDegrees),
  );
  if (apart <= SAME_PLACE) return;
  throw new InputProblem({
    code: 'other-target',
    place: 'input other',
    expected: `the target of the input visibilities, ${target.name} at ${target.raDegrees}, ${target.decDegrees} deg`,
    found: `${other.name} at ${other.raDegrees}, ${other.decDegrees} deg`,
    advice: 'Give the same observation in another band or hand.',
  });
}

interface Match {
  readonly row: number;
  readonly otherRow: number;
  /** -1 where the other set counts the baseline the other way. */
  readonly sense: 1 | -1;
  readonly difference: number;
}

function matchRows(first: Visibilities, other: Visibilities, minimumSnr: number, days: number): Match[] {
  const scans = matchScans(first, other, days);
  const rows = new Map<string, number>();
  for (let k = 0; k < other.count; k++) {
    if (isBright(other, k, minimumSnr)) rows.set(rowKey(other, other.scan[k], k), k);
  }
  const found: Match[] = [];
  for (let row = 0; row < first.count; row++) {
    const scan = scans.get(first.scan[row]);
    if (scan === undefined || !isBright(first, row, minimumSnr)) continue;
    const forward = rows.get(rowKey(first, scan, row));
    const otherRow = forward ?? rows.get(rowKey(first, scan, row, true));
    if (otherRow === undefined) continue;
    const sense = forward === undefined ? -1 : 1;
    const du = first.u[row] - sense * other.u[otherRow];
    const dv = first.v[row] - sense * other.v[otherRow];
    const apart = Math.sqrt(du * du + dv * dv);
    const length = Math.sqrt(first.u[row] * first.u[row] + first.v[row] * first.v[row]);
    found.push({ row, otherRow, sense, difference: apart === 0 ? 0 : apart / length });
  }
  return found;
}

function isBright({ re, im, sigma }: Visibilities, row: number, minimumSnr: number): boolean {
  const square = re[row] * re[row] + im[row] * im[row];
  const least = minimumSnr * sigma[row];
  return square > 0 && square >= least * least;
}

function rowKey(
  { stations, station1, station2 }: Visibilities,
  scan: number,
  row: number,
  turned = false,
): string {
  const names = [stations[station1[row]].name, stations[station2[row]].name];
  return JSON.stringify([scan, ...(turned ? names.reverse() : names)]);
}

interface ScanTime {
  readonly scan: number;
  readonly mjd: number;
  /** Half the longest average, days; half a second at least. */
  readonly half: number;
}

/** Scans of the first set with the scan of the other that was observed at the same time, or so many days later: each is the nearest of the
 *  other, and their mean times differ by less than half an average. */
function matchScans(first: Visibilities, other: Visibilities, days: number): Map<number, number> {
  const own = scanTimes(first);
  const others = scanTimes(other).map((scan) => ({ ...scan, mjd: scan.mjd - days }));
  const pairs = own.flatMap((scan): [number, number][] => {
    const near = nearest(others, scan.mjd);
    if (near === undefined || nearest(own, near.mjd) !== scan) return [];
    return Math.abs(near.mjd - scan.mjd) <= Math.max(near.half, scan.half) ? [[scan.scan, near.scan]] : [];
  });
  return new Map(pairs);
}

function scanTimes(data: Visibilities): ScanTime[] {
  return scanNumbers(data).map((scan) => {
    const times: number[] = [];
    let longest = 1;
    for (let k = 0; k < data.count; k++) {
      if (data.scan[k] !== scan) continue;
      times.push(data.timeMjd[k]);
      longest = Math.max(longest, data.integrationSeconds[k]);
    }
    return { scan, mjd: mean(times), half: longest / 2 / 86400 };
  });
}

function nearest(scans: readonly ScanTime[], mjd: number): ScanTime | undefined {
  return scans.reduce<ScanTime | undefined>(
    (best, scan) => (best === undefined || Math.abs(scan.mjd - mjd) < Math.abs(best.mjd - mjd) ? scan : best),
    undefined,
  );
}
