/** Which records belong together: record times, scans separated by gaps, and the intervals that are averaged. */

import type { Records } from './records.ts';

const DAY_SECONDS = 86400;

/** Rows closer in time than this are one record, seconds. A day's fraction in one float32 is rounded by up to 3 ms
 *  (its quantum at 0.5 to 1 d is 2^-24 d = 5.1 ms); records of a correlator are 0.1 s or longer. */
const SAME_RECORD_SECONDS = 0.02;

export interface Scan {
  /** Indices of its first and last record. */
  readonly first: number;
  readonly last: number;
  /** Edges: half an integration time before the first record's middle and after the last one's. */
  readonly startMjd: number;
  readonly endMjd: number;
}

export interface Timetable {
  /** Record of each row. */
  readonly recordOf: Int32Array;
  /** Middle of each record, rising. */
  readonly recordMjd: Float64Array;
  readonly scans: readonly Scan[];
  /** Interval of each record, from 0, rising with time, and its scan. */
  readonly intervalOf: Int32Array;
  readonly scanOfInterval: Int32Array;
}

/** Sorts rows into records, records into scans and scans into intervals.
 *  @param gapSeconds  a scan ends where this much time or more, edge to edge, holds no data
 *  @param averaging   `scan`, `none`, or the length of an interval in seconds */
export function findScans(rows: Records, gapSeconds: number, averaging: 'scan' | 'none' | number): Timetable {
  const { recordOf, recordMjd, startMjd, endMjd } = findRecords(rows);
  // Times are rounded: a gap of just this length is one.
  const leastGap = gapSeconds - SAME_RECORD_SECONDS;
  const scans: Scan[] = [];
  for (let r = 0, first = 0; r < recordMjd.length; r++) {
    const isLast = r + 1 === recordMjd.length;
    if (!isLast && (startMjd[r + 1] - endMjd[r]) * DAY_SECONDS < leastGap) continue;
    scans.push({ first, last: r, startMjd: startMjd[first], endMjd: endMjd[r] });
    first = r + 1;
  }
  return { recordOf, recordMjd, scans, ...intervals(scans, recordMjd, averaging) };
}

function findRecords(rows: Records) {
  const order = Array.from({ length: rows.count }, (_, k) => k);
  order.sort((a, b) => rows.timeMjd[a] - rows.timeMjd[b]);
  const recordOf = new Int32Array(rows.count);
  const recordMjd: number[] = [];
  const startMjd: number[] = [];
  const endMjd: number[] = [];
  for (const k of order) {
    const t = rows.timeMjd[k];
    const half = rows.integrationSeconds[k] / 2 / DAY_SECONDS;
    let r = recordMjd.length - 1;
    if (r < 0 || (t - recordMjd[r]) * DAY_SECONDS > SAME_RECORD_SECONDS) {
      r = recordMjd.push(t) - 1;
      startMjd.push(t);
      endMjd.push(t);
    }
    recordOf[k] = r;
    startMjd[r] = Math.min(startMjd[r], t - half);
    endMjd[r] = Math.max(endMjd[r], t + half);
  }
  return { recordOf, recordMjd: Float64Array.from(recordMjd), startMjd, endMjd };
}

/** Numbers the intervals; a record lies in the interval that its middle is in. */
function intervals(scans: readonly Scan[], recordMjd: Float64Array, averaging: 'scan' | 'none' | number) {
  const intervalOf = new Int32Array(recordMjd.length);
  const scanOfInterval: number[] = [];
  for (const [scan, { first, last, startMjd }] of scans.entries()) {
    let part = -1;
    for (let r = first; r <= last; r++) {
      const here = partOf(r, recordMjd[r] - startMjd, averaging);
      if (here !== part) scanOfInterval.push(scan);
      part = here;
      intervalOf[r] = scanOfInterval.length - 1;
    }
  }
  return { intervalOf, scanOfInterval: Int32Array.from(scanOfInterval) };
}

function partOf(record: number, sinceStartDays: number, averaging: 'scan' | 'none' | number): number {
  if (averaging === 'scan') return 0;
  if (averaging === 'none') return record;
  return Math.floor((sinceStartDays * DAY_SECONDS) / averaging);
}
