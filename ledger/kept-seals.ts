/** The kept seals: `seals/kept`, notes one after the other, oldest first, append-only. A note ends with its signature
 *  lines, and no text begins with what begins a signature line, so they come apart again.
 *
 *  Kept is the seal that was the latest when a run had ended, at the moment before the next append replaces it. So the
 *  seal of every run is either the latest or kept, kept seals never run ahead of the latest, and a crash between the
 *  two does no harm. A write to this file that was cut off is cut away and made again: what it held is the latest. */

import { closeSync, existsSync, fsyncSync, ftruncateSync, openSync } from 'node:fs';
import { join } from 'node:path';
import type { Announce } from './book.ts';
import { syncDirectory, writeAll } from './durable.ts';
import { linesOf, readRange, sizeOf } from './ledger-file.ts';
import type { Seal } from './seal.ts';

/** A note is some 600 bytes; a torn write and a whole note before it lie within this. */
const WINDOW = 1 << 16;
const SIGNATURE = Buffer.from('— ');

/** The path of the kept seals. */
export function keptPath(directory: string): string {
  return join(directory, 'seals', 'kept');
}

/** Adds the latest seal to those that are kept, unless it stands there as the last. Only within a turn. One sync. */
export function keepSeal(directory: string, { note }: Seal, announce: Announce): void {
  if (note === null) return;
  const bytes = Buffer.from(note);
  const isNew = !existsSync(keptPath(directory));
  const descriptor = openSync(keptPath(directory), 'a+');
  try {
    const size = sizeOf(descriptor);
    const from = Math.max(0, size - WINDOW);
    const tail = readRange(descriptor, from, size - from);
    const whole = endOfLastNote(tail);
    if (whole < tail.length) {
      ftruncateSync(descriptor, from + whole);
      announce(
        `A write to seals/kept was cut off: ${tail.length - whole} bytes were no whole seal and are written again.`,
        'put right',
      );
    }
    const stands = tail.subarray(0, whole).subarray(-bytes.length).equals(bytes);
    if (!stands) writeAll(descriptor, bytes);
    // Also where it stands: whoever wrote it may have died before this.
    fsyncSync(descriptor);
  } finally {
    closeSync(descriptor);
  }
  if (isNew) syncDirectory(join(directory, 'seals'));
}

/** The notes of the kept seals, oldest first; the last may be torn. */
export function* keptNotes(directory: string): Generator<Buffer> {
  if (!existsSync(keptPath(directory))) return;
  const descriptor = openSync(keptPath(directory), 'r');
  try {
    yield* notesIn(descriptor);
  } finally {
    closeSync(descriptor);
  }
}

function* notesIn(descriptor: number): Generator<Buffer> {
  let lines: Buffer[] = [];
  let signed = false;
  for (const { bytes, whole } of linesOf(descriptor, 0, sizeOf(descriptor))) {
    const isSignature = bytes.subarray(0, SIGNATURE.length).equals(SIGNATURE);
    if (signed && !isSignature) {
      yield Buffer.concat(lines);
      lines = [];
    }
    signed = isSignature;
    lines.push(whole ? Buffer.concat([bytes, Buffer.from('\n')]) : Buffer.from(bytes));
  }
  if (lines.length > 0) yield Buffer.concat(lines);
}

/** The byte after the last line that is a whole signature line; 0 when there is none. */
function endOfLastNote(tail: Buffer): number {
  for (let end = tail.lastIndexOf('\n'); end >= 0; ) {
    const before = end === 0 ? -1 : tail.lastIndexOf('\n', end - 1);
    const line = tail.subarray(before + 1, end);
    if (line.subarray(0, SIGNATURE.length).equals(SIGNATURE)) return end + 1;
    end = before;
  }
  return 0;
}
