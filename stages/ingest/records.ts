/** What every reader of `ingest` hands to the averaging: records, one per row of the file that has anything usable,
 *  and the tally of samples. A sample is one complex number of one row, hand, band and channel among those chosen. */

import type { SquaredVisibilities, Station, TripleProducts } from '../data.ts';

/** Reasons for which samples are dropped, in the order of the report. */
export const REASONS = [
  'flagged by a negative weight',
  'flagged in the file',
  'weight zero',
  'weight infinite',
  'weight not a number',
  'value not finite',
  'coordinates or time not finite',
  'autocorrelation',
  'station left out',
  'time not chosen',
  'row doubled',
  'too few records in the scan',
  'below the least signal-to-noise ratio',
] as const;

export type Reason = (typeof REASONS)[number];

/** Samples read and dropped. What is read is either dropped for exactly one reason or kept. */
export interface Tally {
  read: number;
  readonly dropped: Map<Reason, number>;
}

export function makeTally(): Tally {
  return { read: 0, dropped: new Map() };
}

export function drop(tally: Tally, reason: Reason, samples: number): void {
  if (samples > 0) tally.dropped.set(reason, (tally.dropped.get(reason) ?? 0) + samples);
}

/** Samples neither dropped nor, so far, anything but kept. */
export function kept(tally: Tally): number {
  let count = tally.read;
  for (const dropped of tally.dropped.values()) count -= dropped;
  return count;
}

/** Beyond this a number is no measurement: its square, or its product with another, would overflow. */
const HUGE = 1e100;

/** Why a sample's weight or value forbids its use; undefined when it is sound. */
export function faultOf(re: number, im: number, weight: number): Reason | undefined {
  if (Number.isNaN(weight)) return 'weight not a number';
  if (weight === 0) return 'weight zero';
  if (weight < 0) return 'flagged by a negative weight';
  if (!(weight < HUGE)) return 'weight infinite';
  if (!(Math.abs(re) < HUGE && Math.abs(im) < HUGE)) return 'value not finite';
  return undefined;
}

/** Records of one observation. Arrays are longer than `count` while they are being filled. */
export interface Records {
  count: number;
  /** Indices into the observation's stations; station1 < station2. */
  readonly station1: Int32Array;
  readonly station2: Int32Array;
  /** UTC. */
  readonly timeMjd: Float64Array;
  /** 0 when the file does not say. */
  readonly integrationSeconds: Float64Array;
  /** Wavelengths, station 1 to station 2 (CONVENTIONS). */
  readonly u: Float64Array;
  readonly v: Float64Array;
  /** Jy. */
  readonly re: Float64Array;
  readonly im: Float64Array;
  /** 1/sigma², sigma of one real component. */
  readonly weight: Float64Array;
  /** Samples that went into the record. */
  readonly samples: Int32Array;
}

export interface RecordFields {
  readonly station1: number;
  readonly station2: number;
  readonly timeMjd: number;
  readonly integrationSeconds: number;
  readonly u: number;
  readonly v: number;
  readonly re: number;
  readonly im: number;
  readonly weight: number;
  readonly samples: number;
}

export function makeRecords(capacity: number): Records {
  return {
    count: 0,
    station1: new Int32Array(capacity),
    station2: new Int32Array(capacity),
    timeMjd: new Float64Array(capacity),
    integrationSeconds: new Float64Array(capacity),
    u: new Float64Array(capacity),
    v: new Float64Array(capacity),
    re: new Float64Array(capacity),
    im: new Float64Array(capacity),
    weight: new Float64Array(capacity),
    samples: new Int32Array(capacity),
  };
}

/** Appends a record. A record with its stations in falling order is turned round: the value conjugated, u and v
 *  negated. */
export function addRecord(records: Records, fields: RecordFields): void {
  const k = records.count++;
  const turn = fields.station1 > fields.station2;
  const sign = turn ? -1 : 1;
  records.station1[k] = turn ? fields.station2 : fields.station1;
  records.station2[k] = turn ? fields.station1 : fields.station2;
  records.timeMjd[k] = fields.timeMjd;
  records.integrationSeconds[k] = nothingBelowZero(fields.integrationSeconds);
  records.u[k] = sign * fields.u;
  records.v[k] = sign * fields.v;
  records.re[k] = fields.re;
  records.im[k] = sign * fields.im;
  records.weight[k] = fields.weight;
  records.samples[k] = fields.samples;
}

/** NaN and negative numbers are 0: an integration time that is not known. */
function nothingBelowZero(seconds: number): number {
  return Number.isFinite(seconds) ? Math.max(0, seconds) : 0;
}

/** Every station of every row, pair or triple. */
export function stationsInRows(
  { count, station1, station2 }: Pick<Records, 'count' | 'station1' | 'station2'>,
  optical: OpticalData | undefined,
): Int32Array[] {
  const own = [station1.subarray(0, count), station2.subarray(0, count)];
  if (optical === undefined) return own;
  const { squared, triples } = optical;
  return [...own, squared.station1, squared.station2, triples.station1, triples.station2, triples.station3];
}

/** What was found when (u,v) were computed anew from the station positions. */
export interface UvAgreement {
  /** Whether there was anything to compare with. */
  readonly checked: boolean;
  /** Largest difference over the longest baseline; null when not checked. */
  readonly largest: number | null;
  readonly rms: number | null;
  readonly rows: number;
  /** In words: the sign, and the coordinates and sidereal time with which they agree. */
  readonly finding: string;
  /** What the reader did with u and v. */
  readonly applied: string;
  /** Two stations that stand exchanged in the table, by index. */
  readonly exchanged?: readonly [number, number] | null;
  /** Seconds by which the times are early, with the error; null when not checked. */
  readonly clock?: { readonly seconds: number; readonly error: number } | null;
}

/** Squared visibilities and triple products; indices into the observation's stations. */
export interface OpticalData {
  readonly squared: SquaredVisibilities;
  readonly triples: TripleProducts;
}

/** One observation as a reader hands it over. */
export interface Observation {
  readonly format: 'uv-fits' | 'oifits' | 'csv';
  readonly target: { readonly name: string; readonly raDegrees: number; readonly decDegrees: number };
  readonly arrayName: string;
  readonly remark: string;
  /** All stations of the file's table. */
  readonly stations: readonly Station[];
  readonly wavelengthMetres: number;
  readonly bandwidthMetres: number;
  /** Rows in the file. */
  readonly rows: number;
  readonly records: Records;
  readonly tally: Tally;
  /** What was chosen, in words. */
  readonly polarisation: string;
  readonly bands: readonly number[];
  readonly channels: readonly number[];
  /** Records made from two hands, from one, and from two hands that were the same number bit for bit. */
  readonly hands: { both: number; one: number; identical: number } | null;
  readonly leftOut: readonly string[];
  readonly uv: UvAgreement;
  /** What optical arrays measure; there are no records then. */
  readonly optical?: OpticalData;
  readonly warnings: readonly string[];
}
