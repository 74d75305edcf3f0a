/** What a crash can leave, and how it is put right. Up to the sealed byte nothing is ever changed: a difference there is
 *  damage, and so is a seal that no key of the book has signed. Beyond it lies at most what a writer had not finished:
 *  whole entries that continue the chain are sealed, anything else is moved to a file of its own. Both are announced.
 *
 *  Sealing takes a key, so whole entries wait for the next writer, whoever that is; to readers they do not stand yet.
 *  What is torn is moved away by readers too, when nothing is to be sealed before it.
 *
 *  A book of the first version, whose seal is unsigned, is taken up in the same way: its chain is followed from the
 *  first line to the last, its tree is made, and the first writer signs. What was never signed before that moment could
 *  have been rewritten before it; the announcement says so. */

import type { KeyObject } from 'node:crypto';
import { closeSync, fsyncSync, ftruncateSync, openSync } from 'node:fs';
import { join } from 'node:path';
import type { Announce } from './book.ts';
import { DIGEST_OF_NOTHING, sha256 } from './digest.ts';
import { writeDurably } from './durable.ts';
import type { Entry } from './entry.ts';
import { ledgerPath, lineBefore, linesOf, parseEntry, readRange, sizeOf, withFile } from './ledger-file.ts';
import { ledgerDamaged } from './problem.ts';
import { readSeal, type Seal, type SealFacts } from './seal.ts';
import { readKeys, signatureFault } from './seal-keys.ts';
import { replaceFirstSeal, replaceSeal, settle } from './sealing.ts';
import { growTree, rootOf, treeUnder } from './tree.ts';

export interface Sealed {
  /** The ledger ends where the seal says, with the entry that the seal names. */
  readonly state: 'sealed';
  readonly seal: Seal;
  /** Of the entry that the seal names; null in an empty ledger. */
  readonly lastType: string | null;
}

export type Standing =
  | Sealed
  /** The same, and bytes follow: a writer is at work, or was interrupted. */
  | (Omit<Sealed, 'state'> & { readonly state: 'unsealed'; readonly size: number })
  /** `entry` is the entry that is missing or changed, or whose seal is. */
  | {
      readonly state: 'damaged';
      readonly what: string;
      readonly entry: number;
      readonly file: 'ledger' | 'seal';
    };

/** With what a seal is made. */
export interface Sealing {
  readonly key: KeyObject;
  readonly time: string;
}

/** How ledger and seal stand to each other. Reads the seal, the keys and the last line, never the whole ledger.
 *  @param verified  a note whose signature needs no second look */
export function standingOf(directory: string, verified: string | null = null): Standing {
  const seal = readSeal(directory);
  return withFile(ledgerPath(directory), (descriptor) => {
    if (typeof seal !== 'string' && seal.note !== null && seal.note !== verified) {
      const fault = faultOf(directory, seal);
      if (fault !== null) return damagedSeal(descriptor, `seals/latest: ${fault}`);
    }
    return compare(descriptor, seal);
  });
}

/** Seals finished entries beyond the seal and moves away what is none. Only within a turn, only when 'unsealed'.
 *  @param sealing  null for a reader, who leaves whole entries to the next writer
 *  @returns how the book stands then */
export function recover(
  directory: string,
  { seal, size, lastType }: Omit<Extract<Standing, { state: 'unsealed' }>, 'state'>,
  announce: Announce,
  sealing: Sealing | null,
): Sealed {
  const path = ledgerPath(directory);
  const { grown, torn } = withFile(path, (descriptor) => {
    const grown = extend(descriptor, seal, size);
    return { grown, torn: readRange(descriptor, grown.bytes, size - grown.bytes) };
  });
  if (sealing === null && grown.entries > seal.entries) return { state: 'sealed', seal, lastType };
  if (torn.length > 0) moveAway(directory, grown, torn, announce);
  if (sealing === null || grown.entries === seal.entries) return { state: 'sealed', seal, lastType };
  settle(directory);
  let tree = treeUnder(directory, seal);
  for (const { bytes } of grown.lines) tree = growTree(directory, tree, bytes);
  const facts = { ...grown, root: rootOf(tree), time: sealing.time };
  const renewed = replaceSeal(directory, facts, sealing.key, announce, lastType === 'run' ? seal : null);
  for (let number = seal.entries + 1; number <= grown.entries; number += 1) {
    announce(
      `Entry ${number} was written whole when its writer was interrupted: it stands, and is now sealed.`,
      'put right',
    );
  }
  return { state: 'sealed', seal: renewed, lastType: grown.lines.at(-1)?.type ?? null };
}

/** Signs the ledger of a book of the first version, after following its chain. Only within a turn, only when 'sealed'.
 *  @throws LedgerProblem 'ledger-damaged'. Cost: one pass over the ledger. */
export function takeUp(
  directory: string,
  { seal, lastType }: Sealed,
  announce: Announce,
  { key, time }: Sealing,
): Sealed {
  followChain(directory, seal);
  const facts = { ...seal, root: rootOf(treeUnder(directory, seal)), time };
  settle(directory);
  const renewed = replaceFirstSeal(directory, facts, key, announce);
  announce(
    `The book was not signed so far. Its ${seal.entries} entries hold together and are now under a signed seal, which ` +
      'cannot speak for the time before.',
    'key',
  );
  return { state: 'sealed', seal: renewed, lastType };
}

function faultOf(directory: string, seal: Seal): string | null {
  try {
    return signatureFault(seal, readKeys(directory));
  } catch (error) {
    if ((error as Error).name !== 'LedgerProblem') throw error;
    return `seals/keys: ${(error as Error).message.replace(/\.$/, '')}`;
  }
}

function followChain(directory: string, seal: Seal): void {
  const path = ledgerPath(directory);
  withFile(path, (descriptor) => {
    let at: SealFacts = { ...seal, bytes: 0, entries: 0, last: DIGEST_OF_NOTHING };
    for (const { bytes } of linesOf(descriptor, 0, seal.bytes)) {
      if (!continues(bytes, at))
        throw ledgerDamaged(path, at.entries + 1, 'the line does not continue the chain');
      at = { ...at, bytes: at.bytes + bytes.length + 1, entries: at.entries + 1, last: sha256(bytes) };
    }
    if (at.entries !== seal.entries || at.last !== seal.last)
      throw ledgerDamaged(path, at.entries, `the seal says ${seal.entries} entries, the last ${seal.last}`);
  });
}

function damagedSeal(descriptor: number, what: string): Standing {
  return { state: 'damaged', what, entry: lastNumber(descriptor, sizeOf(descriptor)), file: 'seal' };
}

function compare(descriptor: number, seal: Seal | 'missing' | 'unreadable'): Standing {
  const size = sizeOf(descriptor);
  if (typeof seal === 'string')
    return damagedSeal(descriptor, `seals/latest is ${seal === 'missing' ? 'missing' : 'not a seal'}`);
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
  const sealed = (lastType: string | null): Standing =>
    size === seal.bytes ? { state: 'sealed', seal, lastType } : { state: 'unsealed', seal, lastType, size };
  if (seal.entries === 0) return sealed(null);
  const line = lineBefore(descriptor, seal.bytes);
  if (line === null) return damaged('ledger', seal.entries, `no line ends at the sealed byte ${seal.bytes}`);
  const entry = entryIn(line.bytes);
  if (sha256(line.bytes) === seal.last && entry?.number === seal.entries && entry.book === seal.book)
    return sealed(entry.type);
  return damaged(
    'ledger',
    seal.entries,
    `the line that ends at byte ${seal.bytes} is not entry ${seal.entries} of book "${seal.book}" with the digest that the seal names`,
  );
}

/** What the seal over all whole entries that continue the sealed ones would say, and their lines. */
function extend(
  descriptor: number,
  seal: Seal,
  size: number,
): SealFacts & { lines: { bytes: Buffer; type: string }[] } {
  const lines: { bytes: Buffer; type: string }[] = [];
  let { bytes: end, entries, last } = seal;
  for (const { bytes, whole } of linesOf(descriptor, seal.bytes, size)) {
    const entry = whole ? continues(bytes, { ...seal, entries, last }) : null;
    if (entry === null) break;
    end += bytes.length + 1;
    entries += 1;
    last = sha256(bytes);
    lines.push({ bytes: Buffer.from(bytes), type: entry.type });
  }
  const { book, root, time } = seal;
  return { book, bytes: end, entries, last, root, time, lines };
}

/** The entry in a line, if it is the next one. */
function continues(bytes: Buffer, seal: SealFacts): Entry | null {
  const entry = entryIn(bytes);
  return entry?.book === seal.book && entry.number === seal.entries + 1 && entry.before === seal.last
    ? entry
    : null;
}

/** Copies the torn bytes to a file named by their content and cuts them off the ledger; done twice it is the same. */
function moveAway(directory: string, seal: SealFacts, torn: Buffer, announce: Announce): void {
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
