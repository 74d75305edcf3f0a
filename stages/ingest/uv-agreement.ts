/** Computes (u,v) anew from station positions and compares: this alone betrays a wrong sign, since a picture turned by
 *  180° fits the visibilities as well (common practice; Thompson, Moran & Swenson, 3rd ed., eq. 4.1).
 *
 *  Hour angle at Greenwich: H = sidereal time − right ascension. Coordinates of J2000 should be brought to date; files
 *  exist in which they are used as they stand, off by 0.2 % in u and v. So both are tried, and what fits is said. The
 *  sidereal time is that of the antenna table; when that fits with neither sign, the mean one of Greenwich is tried.
 *  Mirrored positions are tried only to name the cause of a failure. */

import { acos, asin, atan2, cos, sin } from '../numerics/elementary.ts';
import { gmst1982 } from '../numerics/time.ts';
import { type Triple, uvwRotation } from '../numerics/uvw.ts';

const DEGREE = Math.PI / 180;
const ARCSECOND = DEGREE / 3600;
const J2000_MJD = 51544.5;

/** Largest difference over the longest baseline up to which (u,v) agree. Nutation and aberration, which nobody applies
 *  here, make 1e-4; a time mark at the start of a 10 s record instead of its middle 4e-4. */
export const GOOD_AGREEMENT = 1e-3;
/** Up to here they are taken to agree, with a remark; a wrong sign differs by about 2. */
export const POOR_AGREEMENT = 5e-3;

/** Candidates are tried on this many rows, spread over the file; the best is then measured on all. */
const TRIAL_ROWS = 400;

export interface UvRows {
  readonly count: number;
  /** Any unit of length, counted r_1 − r_2 (as random groups count). */
  readonly u: Float64Array;
  readonly v: Float64Array;
  /** Metres to that unit. */
  readonly unitsPerMetre: number;
  readonly timeMjd: Float64Array;
  readonly station1: Int32Array;
  readonly station2: Int32Array;
}

export interface Geometry {
  readonly positions: readonly Triple[];
  readonly raDegrees: number;
  readonly decDegrees: number;
  /** Sidereal time of Greenwich by the file, radians; undefined when it does not say. */
  readonly siderealTime: ((mjd: number) => number) | undefined;
  readonly statedJ2000: boolean;
}

interface Candidate {
  readonly sign: 1 | -1;
  readonly coordinates: 'as they stand' | 'brought from J2000 to date';
  readonly sidereal: 'of the file' | 'computed';
  readonly mirrored: boolean;
}

export interface Comparison extends Candidate {
  /** Largest and root mean square difference over the longest baseline. */
  readonly largest: number;
  readonly rms: number;
  readonly worstRow: number;
  readonly rows: number;
  /** Shift of (u,v) by precession since J2000, at most, over the longest baseline. */
  readonly precession: number;
  readonly statedJ2000: boolean;
  readonly fileHasSidereal: boolean;
  /** Two stations without whose exchange (u,v) do not agree, by index; null when none explains it, or nothing needs to be. */
  readonly exchanged: readonly [number, number] | null;
  /** Seconds by which the times must be moved for (u,v) to agree best, with its standard error from the scatter that is left. */
  readonly clock: { readonly seconds: number; readonly error: number };
}

/** The best account of (u,v): of the candidates with the file's sidereal time, else of all.
 *  Undefined when there is nothing to compare with: no rows, or no two positions that differ. Cost O(rows). */
export function compareUv(rows: UvRows, geometry: Geometry): Comparison | undefined {
  const longest = longestOf(rows);
  if (!(longest > 0) || !hasPositions(geometry.positions)) return undefined;
  const epoch = rows.timeMjd[0];
  const trial = (candidate: Candidate) => {
    const step = Math.max(1, Math.floor(rows.count / TRIAL_ROWS));
    return measure(rows, geometry, candidate, epoch, longest, step);
  };
  const tried = candidates(geometry).map((candidate) => ({ candidate, largest: trial(candidate).largest }));
  const best = choose(tried);
  const all = measure(rows, geometry, best, epoch, longest, 1);
  return {
    ...best,
    ...all,
    precession: precessionShift(geometry, epoch),
    statedJ2000: geometry.statedJ2000,
    fileHasSidereal: geometry.siderealTime !== undefined,
    exchanged: all.largest < POOR_AGREEMENT ? null : exchangedStations(rows, geometry, epoch, longest),
    clock: clockOf(rows, geometry, best, epoch),
  };
}

/** With more stations the search over all pairs would take minutes. */
const MOST_EXCHANGED = 64;

/** The pair of stations after whose exchange (u,v) agree; null when there is none, or the stations are too many. */
function exchangedStations(
  rows: UvRows,
  geometry: Geometry,
  epoch: number,
  longest: number,
): readonly [number, number] | null {
  const step = Math.max(1, Math.floor(rows.count / TRIAL_ROWS));
  const { positions } = geometry;
  if (positions.length > MOST_EXCHANGED) return null;
  const plain = candidates(geometry).filter(({ mirrored }) => !mirrored);
  for (let i = 0; i < positions.length; i++) {
    for (let j = i + 1; j < positions.length; j++) {
      const exchanged = positions.map((xyz, k) => (k === i ? positions[j] : k === j ? positions[i] : xyz));
      const agree = plain.some(
        (candidate) =>
          measure(rows, { ...geometry, positions: exchanged }, candidate, epoch, longest, step).largest <
          GOOD_AGREEMENT,
      );
      if (agree) return [i, j];
    }
  }
  return null;
}

/** Radians of sidereal time in a second of UT (Aoki et al. 1982, A&A 105, 359). */
const SIDEREAL_RATE = (2 * Math.PI * 1.00273790935) / 86400;

/** Least squares for one time offset: the difference of (u,v) along their motion with the rotation of the Earth. */
function clockOf(rows: UvRows, geometry: Geometry, candidate: Candidate, epoch: number) {
  const [ra, dec] = directionOf(geometry, candidate.coordinates, epoch);
  const sidereal = candidate.sidereal === 'of the file' ? (geometry.siderealTime ?? gmst1982) : gmst1982;
  const mirror = candidate.mirrored ? -1 : 1;
  const scale = candidate.sign * rows.unitsPerMetre;
  const step = Math.max(1, Math.floor(rows.count / TRIAL_ROWS));
  let [along, motion, squares, count] = [0, 0, 0, 0];
  for (let k = 0; k < rows.count; k += step) {
    const a = geometry.positions[rows.station1[k]];
    const b = geometry.positions[rows.station2[k]];
    const baseline: Triple = [a[0] - b[0], mirror * (a[1] - b[1]), a[2] - b[2]];
    const hourAngle = sidereal(rows.timeMjd[k]) - ra;
    const [u, v] = uvwRotation(hourAngle, dec)(baseline);
    const [later, laterV] = uvwRotation(hourAngle + SIDEREAL_RATE, dec)(baseline);
    const [du, dv] = [rows.u[k] - scale * u, rows.v[k] - scale * v];
    const [mu, mv] = [scale * (later - u), scale * (laterV - v)];
    along += du * mu + dv * mv;
    motion += mu * mu + mv * mv;
    squares += du * du + dv * dv;
    count++;
  }
  if (!(motion > 0)) return { seconds: 0, error: 0 };
  const seconds = along / motion;
  const left = Math.max(0, squares - seconds * along) / Math.max(1, 2 * count - 1);
  return { seconds, error: Math.sqrt(left / motion) };
}

function longestOf(rows: UvRows): number {
  let longest = 0;
  for (let k = 0; k < rows.count; k++) {
    longest = Math.max(longest, rows.u[k] * rows.u[k] + rows.v[k] * rows.v[k]);
  }
  return Math.sqrt(longest);
}

function hasPositions(positions: readonly Triple[]): boolean {
  const [first] = positions;
  return positions.some((xyz) => xyz.some((value, axis) => value !== first[axis]));
}

function candidates(geometry: Geometry): Candidate[] {
  const list: Candidate[] = [];
  for (const sidereal of geometry.siderealTime === undefined
    ? (['computed'] as const)
    : (['of the file', 'computed'] as const)) {
    for (const mirrored of [false, true]) {
      for (const coordinates of ['as they stand', 'brought from J2000 to date'] as const) {
        for (const sign of [1, -1] as const) list.push({ sign, coordinates, sidereal, mirrored });
      }
    }
  }
  return list;
}

/** The best of the first class that agrees: the file's own sidereal time before a computed one, positions as they stand
 *  before mirrored ones. When none agrees, the best of all that could be right. */
function choose(tried: readonly { candidate: Candidate; largest: number }[]): Candidate {
  const bestOf = (list: typeof tried) => list.reduce((a, b) => (b.largest < a.largest ? b : a));
  for (const sidereal of ['of the file', 'computed']) {
    for (const mirrored of [false, true]) {
      const group = tried.filter(
        (t) => t.candidate.sidereal === sidereal && t.candidate.mirrored === mirrored,
      );
      if (group.length === 0) continue;
      const best = bestOf(group);
      if (best.largest < POOR_AGREEMENT) return best.candidate;
    }
  }
  return bestOf(tried.filter((t) => !t.candidate.mirrored)).candidate;
}

function measure(
  rows: UvRows,
  geometry: Geometry,
  candidate: Candidate,
  epoch: number,
  longest: number,
  step: number,
) {
  const [ra, dec] = directionOf(geometry, candidate.coordinates, epoch);
  const sidereal = candidate.sidereal === 'of the file' ? (geometry.siderealTime ?? gmst1982) : gmst1982;
  const mirror = candidate.mirrored ? -1 : 1;
  const scale = candidate.sign * rows.unitsPerMetre;
  let largest = 0;
  let squares = 0;
  let worstRow = 0;
  let count = 0;
  let time = Number.NaN;
  let rotate = uvwRotation(0, 0);
  for (let k = 0; k < rows.count; k += step) {
    if (rows.timeMjd[k] !== time) {
      time = rows.timeMjd[k];
      rotate = uvwRotation(sidereal(time) - ra, dec);
    }
    const a = geometry.positions[rows.station1[k]];
    const b = geometry.positions[rows.station2[k]];
    const [u, v] = rotate([a[0] - b[0], mirror * (a[1] - b[1]), a[2] - b[2]]);
    const du = rows.u[k] - scale * u;
    const dv = rows.v[k] - scale * v;
    const square = du * du + dv * dv;
    squares += square;
    count++;
    // Written so that NaN becomes the largest and never passes for agreement.
    if (!(square <= largest)) {
      largest = square;
      worstRow = k;
    }
  }
  return {
    largest: Math.sqrt(largest) / longest,
    rms: Math.sqrt(squares / count) / longest,
    worstRow,
    rows: count,
  };
}

function directionOf(
  geometry: Geometry,
  coordinates: Candidate['coordinates'],
  mjd: number,
): [number, number] {
  const ra = geometry.raDegrees * DEGREE;
  const dec = geometry.decDegrees * DEGREE;
  return coordinates === 'as they stand' ? [ra, dec] : precess(ra, dec, mjd);
}

/** Right ascension and declination of J2000, radians, brought to the mean equator and equinox of `mjd`.
 *  Lieske 1979, A&A 73, 282; Meeus, Astronomical Algorithms, 2nd ed., eqs. 21.3 and 21.4. */
export function precess(ra: number, dec: number, mjd: number): [number, number] {
  const t = (mjd - J2000_MJD) / 36525;
  const zeta = (2306.2181 + (0.30188 + 0.017998 * t) * t) * t * ARCSECOND;
  const z = (2306.2181 + (1.09468 + 0.018203 * t) * t) * t * ARCSECOND;
  const theta = (2004.3109 - (0.42665 + 0.041833 * t) * t) * t * ARCSECOND;
  const a = cos(dec) * sin(ra + zeta);
  const b = cos(theta) * cos(dec) * cos(ra + zeta) - sin(theta) * sin(dec);
  const c = sin(theta) * cos(dec) * cos(ra + zeta) + cos(theta) * sin(dec);
  // Near a pole the arc sine loses half its digits (Meeus, p. 135).
  const nearPole = Math.abs(c) > 0.99;
  const polar = acos(Math.min(1, Math.sqrt(a * a + b * b)));
  return [atan2(a, b) + z, nearPole ? (c > 0 ? polar : -polar) : asin(c)];
}

/** The angle between the direction as it stands and brought to date, radians: (u,v) shift by that part of a baseline at
 *  most. */
function precessionShift(geometry: Geometry, epoch: number): number {
  const [ra0, dec0] = directionOf(geometry, 'as they stand', epoch);
  const [ra1, dec1] = directionOf(geometry, 'brought from J2000 to date', epoch);
  const dot = sin(dec0) * sin(dec1) + cos(dec0) * cos(dec1) * cos(ra0 - ra1);
  return acos(Math.max(-1, Math.min(1, dot)));
}
