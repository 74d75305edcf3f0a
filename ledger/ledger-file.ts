/** Reading `ledger.jsonl`: one entry a line, each line canonical JSON and a line feed. */

import { closeSync, fstatSync, openSync, readSync } from 'node:fs';
import { join } from 'node:path';
import { parseCanonical } from './canonical.ts';
import type { Entry } from './entry.ts';
import { lackOf, lackOfFields } from './entry-shape.ts';
import { LedgerProblem, notJson } from './problem.ts';

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
  const bytes = Buffer.allocUnsafe(length);
  return bytes.subarray(0, readInto(descriptor, bytes, 0, offset));
}

/** Fills a buffer from `start` on with what stands from `offset` on. @returns how many bytes there were */
function readInto(descriptor: number, buffer: Buffer, start: number, offset: number): number {
  let end = start;
  while (end < buffer.length) {
    const count = readSync(descriptor, buffer, end, buffer.length - end, offset + end - start);
    if (count === 0) break;
    end += count;
  }
  return end - start;
}

/** The lines between two bytes, in order. Memory: the longest line and one block. The bytes of a line stay as they are
 *  when the next is read. */
export function* linesOf(descriptor: number, from: number, to: number): Generator<Line> {
  let offset = from;
  let rest: Buffer = Buffer.alloc(0);
  for (let at = from; at < to; ) {
    // What a line has left over from the block before goes to the beginning of the next.
    const block = Buffer.allocUnsafeSlow(rest.length + Math.min(BLOCK, to - at));
    rest.copy(block);
    const count = readInto(descriptor, block, rest.length, at);
    if (count === 0) break;
    at += count;
    const bytes = block.subarray(0, rest.length + count);
    let start = 0;
    for (let end = bytes.indexOf(LINE_FEED, rest.length); end >= 0; end = bytes.indexOf(LINE_FEED, start)) {
      yield { offset, bytes: bytes.subarray(start, end), whole: true };
      offset += end + 1 - start;
      start = end + 1;
    }
    rest = bytes.subarray(start);
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
  return requireEntry(parseCanonical(bytes, 'entry'), lackOf);
}

/** The entry in a line whose digest something else vouches for, so that its spelling and what it names need not be
 *  looked at: they were, when the line was written. A quarter of the time. @throws LedgerProblem 'not-canonical'. */
export function parseTrusted(bytes: Buffer): Entry {
  let entry: unknown;
  try {
    entry = JSON.parse(bytes.toString('utf8'));
  } catch (cause) {
    throw notJson('entry', cause);
  }
  return requireEntry(entry, lackOfFields);
}

function requireEntry(value: unknown, lackIn: typeof lackOf): Entry {
  const lacks = lackIn(value);
  if (lacks !== null) throw new LedgerProblem('not-canonical', `entry: ${lacks}.`);
  return value as Entry;
}
