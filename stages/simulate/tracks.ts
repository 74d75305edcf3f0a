/** Who observes when, and where in the Fourier plane: scans, records, stations above their limits, (u, v, w). */

import { elevation } from '../numerics/geodesy.ts';
import { gmst1982, SIDEREAL_DEGREES_PER_DAY } from '../numerics/time.ts';
import { uvwRotation } from '../numerics/uvw.ts';
import { RADIANS_PER_DEGREE, type Simulation } from './parameters.ts';

const DAY_SECONDS = 86400;
/** m/s, exact. */
export const LIGHT = 299792458;

/** Rows in order of time, then of baseline. One row is baseline station1[k]–station2[k] in one record. */
export interface Tracks {
  readonly count: number;
  readonly scans: number;
  readonly station1: Int32Array;
  readonly station2: Int32Array;
  readonly scan: Int32Array;
  /** UTC, middle of the record. */
  readonly timeMjd: Float64Array;
  /** Baseline from station 2 to station 1, the sign of random groups, in seconds of light. */
  readonly u: Float64Array;
  readonly v: Float64Array;
  readonly w: Float64Array;
  /** Greenwich mean sidereal time at 0 h of the day of the start, degrees. */
  readonly gst0Degrees: number;
}

interface Record {
  readonly scan: number;
  readonly timeMjd: number;
  readonly up: readonly number[];
}

/** Lays out the observation. Scans in which fewer than two stations are up leave no rows but keep their number. */
export function layTracks(simulation: Simulation): Tracks {
  const gst0Degrees = gmst1982(Math.floor(simulation.startMjd)) / RADIANS_PER_DEGREE;
  const hourAngle = (mjd: number) => hourAngleAt(simulation, gst0Degrees, mjd);
  const records = listRecords(simulation, hourAngle);
  const count = records.reduce((sum, { up }) => sum + (up.length * (up.length - 1)) / 2, 0);
  const tracks: Tracks = {
    count,
    scans: countScans(simulation),
    station1: new Int32Array(count),
    station2: new Int32Array(count),
    scan: new Int32Array(count),
    timeMjd: new Float64Array(count),
    u: new Float64Array(count),
    v: new Float64Array(count),
    w: new Float64Array(count),
    gst0Degrees,
  };
  let k = 0;
  for (const record of records) k = fillRecord(tracks, k, record, simulation, hourAngle(record.timeMjd));
  return tracks;
}

/** Hour angle of the target at Greenwich, radians, with sidereal time as a file states it: a start and a rate. */
function hourAngleAt(simulation: Simulation, gst0Degrees: number, mjd: number): number {
  const days = mjd - Math.floor(simulation.startMjd);
  return (gst0Degrees + SIDEREAL_DEGREES_PER_DAY * days - simulation.target.raDegrees) * RADIANS_PER_DEGREE;
}

function countScans({ duration, scan, interval }: Simulation): number {
  return Math.floor((duration - scan) / interval + 1e-9) + 1;
}

function listRecords(simulation: Simulation, hourAngle: (mjd: number) => number): Record[] {
  const perScan = Math.floor(simulation.scan / simulation.record + 1e-9);
  const records: Record[] = [];
  for (let scan = 0; scan < countScans(simulation); scan++) {
    const time = (m: number) =>
      simulation.startMjd + (scan * simulation.interval + (m + 0.5) * simulation.record) / DAY_SECONDS;
    const up = stationsUp(simulation, hourAngle(time(0)), hourAngle(time(perScan - 1)));
    if (up.length < 2) continue;
    for (let m = 0; m < perScan; m++) records.push({ scan, timeMjd: time(m), up });
  }
  return records;
}

/** Stations above their limits in the first and the last record of a scan. */
function stationsUp(simulation: Simulation, first: number, last: number): number[] {
  const declination = simulation.target.decDegrees * RADIANS_PER_DEGREE;
  return [...simulation.stations.keys()].filter((k) => {
    const { latitude, longitude, elevationLimit } = simulation.stations[k];
    return [first, last].every(
      (angle) => elevation(latitude, declination, angle + longitude) >= elevationLimit,
    );
  });
}

function fillRecord(
  tracks: Tracks,
  from: number,
  record: Record,
  simulation: Simulation,
  angle: number,
): number {
  const rotate = uvwRotation(angle, simulation.target.decDegrees * RADIANS_PER_DEGREE);
  const places = simulation.stations.map(({ xyz }) => rotate(xyz));
  let k = from;
  for (const [a, i] of record.up.entries()) {
    for (const j of record.up.slice(a + 1)) {
      tracks.station1[k] = i;
      tracks.station2[k] = j;
      tracks.scan[k] = record.scan;
      tracks.timeMjd[k] = record.timeMjd;
      tracks.u[k] = (places[i][0] - places[j][0]) / LIGHT;
      tracks.v[k] = (places[i][1] - places[j][1]) / LIGHT;
      tracks.w[k] = (places[i][2] - places[j][2]) / LIGHT;
      k++;
    }
  }
  return k;
}
