/** Coherent averages over intervals, per baseline, with weights w = 1/sigma²:
 *    V = Σ w V_k / Σ w,   sigma = 1/sqrt(Σ w),   (u, v, t) alike, integration Σ.
 *  Beside each: the scatter of its records over their stated noise, as reduced chi-square per real component,
 *    Σ w |V_k − V|² / (2 (n − 1)),
 *  and the loss of amplitude against the root mean square of the records, both freed of their noise bias
 *  (E|V + n|² = |V|² + 2 sigma², CONVENTIONS):
 *    loss = 1 − sqrt(|V|² − 2/Σw) / sqrt((Σ w |V_k|² − 2 n) / Σw).
 *  Common practice. Sums run in an order that the contents alone decide, so that the order of rows in a file has no
 *  influence on any bit. */

import { drop, type Records, type Tally } from './records.ts';
import type { Timetable } from './scans.ts';

/** Averages: entry k is one baseline in one interval. */
export interface Averages {
  count: number;
  readonly interval: Int32Array;
  readonly station1: Int32Array;
  readonly station2: Int32Array;
  readonly timeMjd: Float64Array;
  readonly integrationSeconds: Float64Array;
  readonly u: Float64Array;
  readonly v: Float64Array;
  readonly re: Float64Array;
  readonly im: Float64Array;
  readonly sigma: Float64Array;
  /** Records in the average. */
  readonly records: Int32Array;
  readonly samples: Int32Array;
  /** Reduced chi-square of the scatter; NaN with a single record. */
  readonly scatter: Float64Array;
  /** Lost fraction of amplitude; NaN with a single record or where noise leaves nothing to compare. */
  readonly loss: Float64Array;
}

export interface AveragingChoice {
  /** Least fraction of an interval's records that a baseline must be in. */
  readonly completeness: number;
  readonly leastSnr?: number | undefined;
}

export interface AveragingResult {
  readonly averages: Averages;
  /** Baselines of intervals dropped. */
  readonly incomplete: number;
  readonly faint: number;
  /** Rows that shared baseline and record with another row of other content. */
  readonly crowded: number;
}

/** Averages the records; counts what it drops in `tally`. Cost O(n log n). */
export function average(
  rows: Records,
  timetable: Timetable,
  choice: AveragingChoice,
  tally: Tally,
): AveragingResult {
  const order = sortRows(rows, timetable);
  const { unique, crowded } = withoutDoubles(rows, timetable, order, tally);
  const recordsIn = new Int32Array(timetable.scanOfInterval.length);
  for (const interval of timetable.intervalOf) recordsIn[interval]++;
  const averages = makeAverages(unique.length);
  let incomplete = 0;
  let faint = 0;
  for (let from = 0, to = 0; from < unique.length; from = to) {
    while (to < unique.length && sameAverage(rows, timetable, unique[from], unique[to])) to++;
    const k = averages.count;
    accumulate(averages, rows, timetable, unique, from, to);
    if (!(averages.records[k] >= choice.completeness * recordsIn[averages.interval[k]])) {
      incomplete++;
      drop(tally, 'too few records in the scan', averages.samples[k]);
    } else if (choice.leastSnr !== undefined && !(snrOf(averages, k) >= choice.leastSnr)) {
      faint++;
      drop(tally, 'below the least signal-to-noise ratio', averages.samples[k]);
    } else averages.count++;
  }
  return { averages, incomplete, faint, crowded };
}

export function snrOf(averages: Averages, k: number): number {
  return Math.sqrt(averages.re[k] * averages.re[k] + averages.im[k] * averages.im[k]) / averages.sigma[k];
}

/** Row numbers by interval, baseline, record, and then content. */
function sortRows(rows: Records, { recordOf, intervalOf }: Timetable): Uint32Array {
  const order = new Uint32Array(rows.count).map((_, k) => k);
  return order.sort(
    (a, b) =>
      intervalOf[recordOf[a]] - intervalOf[recordOf[b]] ||
      rows.station1[a] - rows.station1[b] ||
      rows.station2[a] - rows.station2[b] ||
      recordOf[a] - recordOf[b] ||
      rows.timeMjd[a] - rows.timeMjd[b] ||
      rows.re[a] - rows.re[b] ||
      rows.im[a] - rows.im[b] ||
      rows.weight[a] - rows.weight[b] ||
      rows.u[a] - rows.u[b] ||
      rows.v[a] - rows.v[b] ||
      rows.integrationSeconds[a] - rows.integrationSeconds[b] ||
      rows.samples[a] - rows.samples[b],
  );
}

/** Leaves out rows that repeat the one before them in all that counts; a file that holds a row twice holds one
 *  measurement. */
function withoutDoubles(rows: Records, timetable: Timetable, order: Uint32Array, tally: Tally) {
  const unique = new Uint32Array(order.length);
  let count = 0;
  let crowded = 0;
  for (const k of order) {
    const before = count > 0 ? unique[count - 1] : k;
    if (before !== k && sameAverage(rows, timetable, before, k)) {
      if (isDouble(rows, before, k)) {
        drop(tally, 'row doubled', rows.samples[k]);
        continue;
      }
      if (timetable.recordOf[before] === timetable.recordOf[k]) crowded++;
    }
    unique[count++] = k;
  }
  return { unique: unique.subarray(0, count), crowded };
}

function isDouble(rows: Records, a: number, b: number): boolean {
  return (
    rows.timeMjd[a] === rows.timeMjd[b] &&
    rows.re[a] === rows.re[b] &&
    rows.im[a] === rows.im[b] &&
    rows.weight[a] === rows.weight[b] &&
    rows.u[a] === rows.u[b] &&
    rows.v[a] === rows.v[b]
  );
}

function sameAverage(rows: Records, { recordOf, intervalOf }: Timetable, a: number, b: number): boolean {
  return (
    intervalOf[recordOf[a]] === intervalOf[recordOf[b]] &&
    rows.station1[a] === rows.station1[b] &&
    rows.station2[a] === rows.station2[b]
  );
}

/** Writes the average of rows unique[from..to) at entry `averages.count`, without counting it. */
function accumulate(
  averages: Averages,
  rows: Records,
  { recordOf, intervalOf }: Timetable,
  unique: Uint32Array,
  from: number,
  to: number,
): void {
  const k = averages.count;
  const first = unique[from];
  // Times are averaged as differences from the first: whole days would take the digits that seconds need.
  const t0 = rows.timeMjd[first];
  let sumW = 0;
  let sumRe = 0;
  let sumIm = 0;
  let sumU = 0;
  let sumV = 0;
  let sumT = 0;
  let seconds = 0;
  let samples = 0;
  let records = 0;
  let power = 0;
  for (let n = from; n < to; n++) {
    const j = unique[n];
    const w = rows.weight[j];
    sumW += w;
    sumRe += w * rows.re[j];
    sumIm += w * rows.im[j];
    sumU += w * rows.u[j];
    sumV += w * rows.v[j];
    sumT += w * (rows.timeMjd[j] - t0);
    power += w * (rows.re[j] * rows.re[j] + rows.im[j] * rows.im[j]);
    seconds += rows.integrationSeconds[j];
    samples += rows.samples[j];
    if (n === from || recordOf[j] !== recordOf[unique[n - 1]]) records++;
  }
  const re = sumRe / sumW;
  const im = sumIm / sumW;
  averages.interval[k] = intervalOf[recordOf[first]];
  averages.station1[k] = rows.station1[first];
  averages.station2[k] = rows.station2[first];
  averages.timeMjd[k] = t0 + sumT / sumW;
  averages.integrationSeconds[k] = seconds;
  averages.u[k] = sumU / sumW;
  averages.v[k] = sumV / sumW;
  averages.re[k] = re;
  averages.im[k] = im;
  averages.sigma[k] = 1 / Math.sqrt(sumW);
  averages.records[k] = records;
  averages.samples[k] = samples;
  averages.scatter[k] = scatterOf(rows, unique, from, to, re, im);
  const n = to - from;
  const apart = (power - 2 * n) / sumW;
  const together = re * re + im * im - 2 / sumW;
  averages.loss[k] = n > 1 && apart > 0 && together > 0 ? 1 - Math.sqrt(together / apart) : Number.NaN;
}

function scatterOf(
  rows: Records,
  unique: Uint32Array,
  from: number,
  to: number,
  re: number,
  im: number,
): number {
  let chi2 = 0;
  for (let n = from; n < to; n++) {
    const j = unique[n];
    const dRe = rows.re[j] - re;
    const dIm = rows.im[j] - im;
    chi2 += rows.weight[j] * (dRe * dRe + dIm * dIm);
  }
  return to - from > 1 ? chi2 / (2 * (to - from - 1)) : Number.NaN;
}

function makeAverages(capacity: number): Averages {
  return {
    count: 0,
    interval: new Int32Array(capacity),
    station1: new Int32Array(capacity),
    station2: new Int32Array(capacity),
    timeMjd: new Float64Array(capacity),
    integrationSeconds: new Float64Array(capacity),
    u: new Float64Array(capacity),
    v: new Float64Array(capacity),
    re: new Float64Array(capacity),
    im: new Float64Array(capacity),
    sigma: new Float64Array(capacity),
    records: new Int32Array(capacity),
    samples: new Int32Array(capacity),
    scatter: new Float64Array(capacity),
    loss: new Float64Array(capacity),
  };
}
