/** Reading `ledger.jsonl`: one entry a line, each line canonical JSON and a line feed. */

import { closeSync, fstatSync, openSync, readSync } from 'node:fs';
import { join } from 'node:path';
import { parseCanonical } from './canonical.ts';
import type { Entry } from './entry.ts';
import { lackOf } from './entry-shape.ts';
import { LedgerProblem } from './problem.ts';

const LINE_FEED = 0x0a;
const BLOCK = 1 << 20;

export interface Line {
  /** Byte at which it begins. */
  readonly offset: number;
  /** Without its line feed. */
  readonly bytes: Buffer;
  /** False for bytes at the end that no line feed closes. */
  readonly whole: boolean;
}

/** The path of a book's ledger. */
export function ledgerPath(directory: string): string {
  return join(directory, 'ledger.jsonl');
}

/** Opens a file for reading, hands it over, closes it. */
export function withFile<T>(path: string, read: (descriptor: number) => T): T {
  const descriptor = openSync(path, 'r');
  try {
    return read(descriptor);
  } finally {
    closeSync(descriptor);
  }
}

export function sizeOf(descriptor: number): number {
  return fstatSync(descriptor).size;
}

/** Up to `length` bytes from `offset`; fewer where the file ends. */
export function readRange(descriptor: number, offset: number, length: number): Buffer {
  const bytes = Buffer.alloc(length);
  let done = 0;
  while (done < length) {
    const count = readSync(descriptor, bytes, done, length - done, offset + done);
    if (count === 0) break;
    done += count;
  }
  return bytes.subarray(0, done);
}

/** The lines between two bytes, in order. Memory: the longest line and one block. */
export function* linesOf(descriptor: number, from: number, to: number): Generator<Line> {
  let offset = from;
  let rest: Buffer = Buffer.alloc(0);
  for (let at = from; at < to; ) {
    const block = readRange(descriptor, at, Math.min(BLOCK, to - at));
    if (block.length === 0) break;
    at += block.length;
    rest = rest.length === 0 ? block : Buffer.concat([rest, block]);
    let start = 0;
    for (let end = rest.indexOf(LINE_FEED); end >= 0; end = rest.indexOf(LINE_FEED, start)) {
      yield { offset, bytes: rest.subarray(start, end), whole: true };
      offset += end + 1 - start;
      start = end + 1;
    }
    rest = rest.subarray(start);
  }
  if (rest.length > 0) yield { offset, bytes: rest, whole: false };
}

/** The line whose line feed is the byte before `end`; null when no line feed stands there. Reads backwards. */
export function lineBefore(descriptor: number, end: number): Line | null {
  let span = Math.min(end, 1 << 14);
  for (;;) {
    const bytes = readRange(descriptor, end - span, span);
    if (bytes.length < span || bytes.at(-1) !== LINE_FEED) return null;
    const start = bytes.length < 2 ? -1 : bytes.lastIndexOf(LINE_FEED, bytes.length - 2);
    if (start >= 0 || span === end) {
      return { offset: end - span + start + 1, bytes: bytes.subarray(start + 1, -1), whole: true };
    }
    span = Math.min(end, span * 2);
  }
}

/** The entry in a line.
 *  @throws LedgerProblem 'not-canonical' when it is no canonical JSON or lacks what its type must have. */
export function parseEntry(bytes: Uint8Array): Entry {
  const entry: unknown = parseCanonical(bytes, 'entry');
  const lacks = lackOf(entry);
  if (lacks !== null) throw new LedgerProblem('not-canonical', `entry: ${lacks}.`);
  return entry as Entry;
}

/** The entry in a line whose digest something else vouches for, so that its spelling need not be looked at: it was, when
 *  the line was written. A third of the time. @throws SyntaxError, LedgerProblem 'not-canonical'. */
export function parseTrusted(bytes: Buffer): Entry {
  const entry: unknown = JSON.parse(bytes.toString('utf8'));
  const lacks = lackOf(entry);
  if (lacks !== null) throw new LedgerProblem('not-canonical', `entry: ${lacks}.`);
  return entry as Entry;
}
