/** Writes uv data as FITS random groups, as an instrument would deliver them: two parallel hands, one band, one channel,
 *  u, v, w in seconds counted (r_i − r_j), the time split over two DATE parameters. Rows come out sorted by time, then
 *  by baseline; equal content gives equal bytes. See uv-groups.ts. */

import type { ByteSink } from '../bytes.ts';
import { formatDate, mjdOfJulianDate } from '../numerics/time.ts';
import { InternalError } from '../problem.ts';
import { appendGroupsHdu } from './fits/groups.ts';
import type { NewCard } from './fits/header.ts';
import { appendTableHdu } from './fits/table.ts';

export interface UvStation {
  readonly name: string;
  /** Geocentric (ITRF), metres. */
  readonly xyz: readonly [number, number, number];
}

/** Values of one parallel hand, one per row: Jy, and 1/sigma² (zero or less: flagged). */
export interface UvHand {
  readonly re: Float32Array;
  readonly im: Float32Array;
  readonly weight: Float32Array;
}

export interface UvWriteRequest {
  readonly target: { readonly name: string; readonly raDegrees: number; readonly decDegrees: number };
  readonly arrayName: string;
  /** Kept in keyword REMARK; such as that the data are invented. */
  readonly remark: string;
  readonly frequencyHz: number;
  readonly bandwidthHz: number;
  readonly stations: readonly UvStation[];
  /** JD at 0 h of the day from which the sidereal time counts. */
  readonly referenceDate: number;
  /** Sidereal time of Greenwich at the reference date. */
  readonly gst0Degrees: number;
  readonly degreesPerDay: number;
  readonly count: number;
  /** Indices into `stations`, station1 < station2. */
  readonly station1: Int32Array;
  readonly station2: Int32Array;
  readonly timeJd: Float64Array;
  /** Seconds, (r_1 − r_2)/c: u = U/c with U to the east. */
  readonly u: Float64Array;
  readonly v: Float64Array;
  readonly w: Float64Array;
  readonly integrationSeconds: Float64Array;
  readonly rr: UvHand;
  readonly ll: UvHand;
}

const PARAMETERS = ['UU---SIN', 'VV---SIN', 'WW---SIN', 'BASELINE', 'DATE', 'DATE', 'INTTIM'] as const;
const ROWS_AT_ONCE = 16384;
/** The first DATE holds whole 256ths of a day, which a float32 holds exactly for 180 years from the reference date; the
 *  second the rest, below 1/256 d, to 2^-33 d or 10 µs. */
const PARTS_OF_DAY = 256;
/** Beyond this many stations a code of 256·i + j has no room. */
const MOST_SHORT_STATIONS = 255;
const MOST_STATIONS = 2047;

/** Writes random groups, antenna table (AN) and frequency table (FQ).
 *  @throws InternalError when arrays and counts do not fit together */
export function writeUvGroups(sink: ByteSink, request: UvWriteRequest): void {
  requireShape(request);
  const order = sortedRows(request);
  appendGroupsHdu(sink, {
    count: request.count,
    parameters: PARAMETERS.map((name, k) => ({ name, scale: 1, zero: k === 4 ? request.referenceDate : 0 })),
    axes: axesOf(request),
    blocks: blocksOf(request, order),
    cards: primaryCards(request),
  });
  writeAntennas(sink, request);
  writeFrequencies(sink, request);
}

function requireShape(request: UvWriteRequest): void {
  const { count, stations, rr, ll } = request;
  const columns = [request.station1, request.station2, request.timeJd, request.u, request.v, request.w];
  const all = [...columns, request.integrationSeconds, rr.re, rr.im, rr.weight, ll.re, ll.im, ll.weight];
  if (all.some((column) => column.length !== count)) {
    throw new InternalError('writeUvGroups', `columns of other lengths than count ${count}`);
  }
  const wrong = request.station1.findIndex(
    (first, k) => !(first >= 0 && first < request.station2[k] && request.station2[k] < stations.length),
  );
  if (wrong >= 0 || stations.length > MOST_STATIONS) {
    throw new InternalError('writeUvGroups', `row ${wrong}, ${stations.length} stations`);
  }
}

function sortedRows({ count, timeJd, station1, station2 }: UvWriteRequest): Uint32Array {
  const order = new Uint32Array(count).map((_, k) => k);
  return order.sort(
    (a, b) => timeJd[a] - timeJd[b] || station1[a] - station1[b] || station2[a] - station2[b] || a - b,
  );
}

function axesOf({ target, frequencyHz, bandwidthHz }: UvWriteRequest) {
  const axis = (ctype: string, n: number, crval: number, cdelt: number) => ({
    ctype,
    n,
    crval,
    cdelt,
    crpix: 1,
  });
  return [
    axis('COMPLEX', 3, 1, 1),
    axis('STOKES', 2, -1, -1),
    axis('FREQ', 1, frequencyHz, bandwidthHz),
    axis('IF', 1, 1, 1),
    axis('RA', 1, target.raDegrees, 1),
    axis('DEC', 1, target.decDegrees, 1),
  ];
}

function* blocksOf(request: UvWriteRequest, order: Uint32Array) {
  for (let from = 0; from < order.length; from += ROWS_AT_ONCE) {
    const rows = order.subarray(from, from + ROWS_AT_ONCE);
    const pick = (value: (row: number) => number) => Float64Array.from(rows, value);
    const coarse = pick((row) => coarseDate(request, row));
    yield {
      count: rows.length,
      parameters: [
        pick((row) => request.u[row]),
        pick((row) => request.v[row]),
        pick((row) => request.w[row]),
        pick((row) => baselineCode(request, row)),
        coarse,
        Float64Array.from(rows, (row, k) => request.timeJd[row] - coarse[k]),
        pick((row) => request.integrationSeconds[row]),
      ],
      data: samplesOf(request, rows),
    };
  }
}

function coarseDate({ timeJd, referenceDate }: UvWriteRequest, row: number): number {
  return referenceDate + Math.floor((timeJd[row] - referenceDate) * PARTS_OF_DAY) / PARTS_OF_DAY;
}

/** 256·i + j, or 2048·i + j + 65536 with more than 255 stations; station numbers are indices and 1. */
function baselineCode({ station1, station2, stations }: UvWriteRequest, row: number): number {
  const [i, j] = [station1[row] + 1, station2[row] + 1];
  return stations.length > MOST_SHORT_STATIONS ? 2048 * i + j + 65536 : 256 * i + j;
}

function samplesOf({ rr, ll }: UvWriteRequest, rows: Uint32Array): Float64Array {
  const data = new Float64Array(6 * rows.length);
  for (const [k, row] of rows.entries()) {
    data[6 * k] = rr.re[row];
    data[6 * k + 1] = rr.im[row];
    data[6 * k + 2] = rr.weight[row];
    data[6 * k + 3] = ll.re[row];
    data[6 * k + 4] = ll.im[row];
    data[6 * k + 5] = ll.weight[row];
  }
  return data;
}

/** No EQUINOX: u, v, w belong to the coordinates as they stand, which makes them coordinates of date. */
function primaryCards({ target, arrayName, remark, referenceDate }: UvWriteRequest): NewCard[] {
  return [
    ['OBJECT', target.name],
    ['TELESCOP', arrayName],
    ['DATE-OBS', formatDate(mjdOfJulianDate(referenceDate))],
    ['BUNIT', 'JY'],
    ...(remark === '' ? [] : [['REMARK', remark] as const]),
  ];
}

function writeAntennas(sink: ByteSink, request: UvWriteRequest): void {
  const { stations } = request;
  const rows = stations.length;
  const width = Math.max(8, ...stations.map((station) => station.name.length));
  appendTableHdu(sink, {
    extname: 'AN',
    rows,
    columns: [
      { name: 'ANNAME', form: `${width}A`, values: stations.map((station) => station.name) },
      {
        name: 'STABXYZ',
        form: '3D',
        unit: 'METERS',
        values: stations.flatMap((station) => [...station.xyz]),
      },
      { name: 'NOSTA', form: '1J', values: stations.map((_, k) => k + 1) },
      { name: 'MNTSTA', form: '1J', values: new Int32Array(rows) },
      { name: 'STAXOF', form: '1E', unit: 'METERS', values: new Float64Array(rows) },
    ],
    cards: antennaCards(request),
  });
}

function antennaCards(request: UvWriteRequest): NewCard[] {
  return [
    ['EXTVER', 1],
    ['ARRAYX', 0],
    ['ARRAYY', 0],
    ['ARRAYZ', 0],
    ['GSTIA0', request.gst0Degrees],
    ['DEGPDY', request.degreesPerDay],
    ['FREQ', request.frequencyHz],
    ['RDATE', formatDate(mjdOfJulianDate(request.referenceDate))],
    ['ARRNAM', request.arrayName],
    ['FRAME', 'ITRF'],
    ['XYZHAND', 'RIGHT'],
    ['TIMSYS', 'UTC'],
    ['UT1UTC', 0],
  ];
}

function writeFrequencies(sink: ByteSink, { bandwidthHz }: UvWriteRequest): void {
  appendTableHdu(sink, {
    extname: 'FQ',
    rows: 1,
    columns: [
      { name: 'FRQSEL', form: '1J', values: [1] },
      { name: 'IF FREQ', form: '1D', unit: 'HZ', values: [0] },
      { name: 'CH WIDTH', form: '1E', unit: 'HZ', values: [bandwidthHz] },
      { name: 'TOTAL BANDWIDTH', form: '1E', unit: 'HZ', values: [bandwidthHz] },
      { name: 'SIDEBAND', form: '1J', values: [1] },
    ],
    cards: [
      ['EXTVER', 1],
      ['NO_IF', 1],
    ],
  });
}
