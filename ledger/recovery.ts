/** What a crash can leave, and how it is put right. Up to the sealed byte nothing is ever changed: a difference there is
 *  damage. Beyond it lies at most what a writer had not finished: whole entries that continue the chain are sealed,
 *  anything else is moved to a file of its own. Both are announced. */

import { closeSync, fsyncSync, ftruncateSync, openSync } from 'node:fs';
import { join } from 'node:path';
import type { Announce } from './book.ts';
import { sha256 } from './digest.ts';
import { writeDurably } from './durable.ts';
import type { Entry } from './entry.ts';
import { ledgerPath, lineBefore, linesOf, parseEntry, readRange, sizeOf, withFile } from './ledger-file.ts';
import { readSeal, type Seal, writeSeal } from './seal.ts';

export type Standing =
  /** The ledger ends where the seal says, with the entry that the seal names. */
  | { readonly state: 'sealed'; readonly seal: Seal }
  /** The same, and bytes follow: a writer is at work, or was interrupted. */
  | { readonly state: 'unsealed'; readonly seal: Seal; readonly size: number }
  /** `entry` is the entry that is missing or changed, or whose seal is. */
  | {
      readonly state: 'damaged';
      readonly what: string;
      readonly entry: number;
      readonly file: 'ledger' | 'seal';
    };

/** How ledger and seal stand to each other. Reads the seal and the last line, never the whole ledger. */
export function standingOf(directory: string): Standing {
  const seal = readSeal(directory);
  return withFile(ledgerPath(directory), (descriptor) => compare(descriptor, seal));
}

/** Seals finished entries beyond the seal and moves away what is none. Only within a turn, only when 'unsealed'.
 *  @returns the new seal */
export function recover(
  directory: string,
  { seal, size }: { seal: Seal; size: number },
  announce: Announce,
): Seal {
  const path = ledgerPath(directory);
  const { grown, torn } = withFile(path, (descriptor) => {
    const grown = extend(descriptor, seal, size);
    return { grown, torn: readRange(descriptor, grown.bytes, size - grown.bytes) };
  });
  if (torn.length > 0) moveAway(directory, grown, torn, announce);
  if (grown.entries > seal.entries) {
    writeSeal(directory, grown);
    for (let number = seal.entries + 1; number <= grown.entries; number += 1) {
      announce(
        `Entry ${number} was written whole when its writer was interrupted: it stands, and is now sealed.`,
        'put right',
      );
    }
  }
  return grown;
}

function compare(descriptor: number, seal: Seal | 'missing' | 'unreadable'): Standing {
  const size = sizeOf(descriptor);
  if (typeof seal === 'string') {
    const what = `seals/latest.json is ${seal === 'missing' ? 'missing' : 'not a seal in canonical JSON'}`;
    return { state: 'damaged', what, entry: lastNumber(descriptor, size), file: 'seal' };
  }
  const damaged = (file: 'ledger' | 'seal', entry: number, what: string): Standing => ({
    state: 'damaged',
    what,
    entry,
    file,
  });
  if (size < seal.bytes) {
    const held = lastNumber(descriptor, size);
    const what = `the seal says ${seal.entries} entries in ${seal.bytes} bytes, the ledger ends at byte ${size}`;
    return held === seal.entries ? damaged('seal', held, what) : damaged('ledger', held + 1, what);
  }
  const sealed: Standing =
    size === seal.bytes ? { state: 'sealed', seal } : { state: 'unsealed', seal, size };
  if (seal.entries === 0) return sealed;
  const line = lineBefore(descriptor, seal.bytes);
  if (line === null) return damaged('ledger', seal.entries, `no line ends at the sealed byte ${seal.bytes}`);
  const entry = entryIn(line.bytes);
  if (sha256(line.bytes) === seal.last && entry?.number === seal.entries && entry.book === seal.book)
    return sealed;
  return damaged(
    'ledger',
    seal.entries,
    `the line that ends at byte ${seal.bytes} is not entry ${seal.entries} of book "${seal.book}" with the digest that the seal names`,
  );
}

/** The seal over all whole entries that continue the sealed ones. */
function extend(descriptor: number, seal: Seal, size: number): Seal {
  let grown = seal;
  for (const { bytes, whole } of linesOf(descriptor, seal.bytes, size)) {
    if (!whole || !continues(bytes, grown)) break;
    grown = {
      book: seal.book,
      bytes: grown.bytes + bytes.length + 1,
      entries: grown.entries + 1,
      last: sha256(bytes),
    };
  }
  return grown;
}

function continues(bytes: Buffer, seal: Seal): boolean {
  const entry = entryIn(bytes);
  return entry?.book === seal.book && entry.number === seal.entries + 1 && entry.before === seal.last;
}

/** Copies the torn bytes to a file named by their content and cuts them off the ledger; done twice it is the same. */
function moveAway(directory: string, seal: Seal, torn: Buffer, announce: Announce): void {
  const name = `torn-after-entry-${seal.entries}-${sha256(torn).slice(0, 12)}`;
  writeDurably(join(directory, name), join(directory, `${name}.new`), torn);
  const descriptor = openSync(ledgerPath(directory), 'r+');
  try {
    ftruncateSync(descriptor, seal.bytes);
    fsyncSync(descriptor);
  } finally {
    closeSync(descriptor);
  }
  announce(
    `A write to ledger.jsonl was cut off: ${torn.length} bytes after entry ${seal.entries} were no entry ` +
      `and lie in ${name} now. Entries 1 to ${seal.entries} stand.`,
    'put right',
  );
}

/** The number of the last whole entry, as far as it can be told; 0 when there is none. Reads the whole ledger. */
function lastNumber(descriptor: number, size: number): number {
  let count = 0;
  let last: number | undefined;
  for (const { bytes, whole } of linesOf(descriptor, 0, size)) {
    if (!whole) break;
    count += 1;
    last = entryIn(bytes)?.number;
  }
  return last ?? count;
}

function entryIn(bytes: Buffer): Entry | null {
  try {
    return parseEntry(bytes);
  } catch {
    return null;
  }
}
