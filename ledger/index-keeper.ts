/** Keeps the index level with the ledger. Before each question it is brought up to the seal; it is made again when it
 *  is missing, of another book, ahead of the ledger, or no database; where the directory cannot be written it is held
 *  in memory. When it is level, nothing but the seal is read. */

import { accessSync, constants, existsSync, rmSync } from 'node:fs';
import { join } from 'node:path';
import type { Announce } from './book.ts';
import { sha256 } from './digest.ts';
import type { Entry } from './entry.ts';
import { hashedLines } from './hashed-lines.ts';
import { type Extent, type Index, makeIndexFile, openIndex, openIndexToRead } from './index.ts';
import { type IndexedLine, IndexMoved } from './index-filling.ts';
import { ledgerPath, linesOf, parseEntry, parseTrusted, sizeOf, withFile } from './ledger-file.ts';
import { rememberingReader } from './line-reader.ts';
import { ledgerDamaged } from './problem.ts';
import { readSeal, type Seal } from './seal.ts';

// Result codes of SQLite, sqlite.org/rescode.html.
const BUSY = 5;
const CORRUPT = 11;
const NOT_A_DATABASE = 26;

/** Other processes may write to the index at the same time. */
const MOST_ATTEMPTS = 10;

export interface IndexKeeper {
  /** Asks the index, after it has been brought up to the seal.
   *  @throws LedgerProblem 'ledger-damaged' when it must be made again and the ledger is damaged. */
  ask<T>(question: (index: Index) => T): T;
  /** Makes the index again from the first line. */
  rebuild(): void;
  close(): void;
}

/** The index of the book in a directory; opened at the first question. */
export function keepIndex(directory: string, book: string, announce: Announce = () => {}): IndexKeeper {
  let index: Index | null = null;
  /** The seal with which the index was last found level. */
  let level: Seal | null = null;

  const opened = (): Index => {
    if (index === null) index = openOrReplace(directory, book, announce);
    return index;
  };
  const drop = (replacement: () => Index): Index => {
    index?.close();
    level = null;
    index = replacement();
    return index;
  };
  const sync = (): Index => {
    const current = opened();
    for (let attempt = 1; ; attempt += 1) {
      // In this order: the index is never ahead of the seal, so a seal that is read later is not behind it.
      const extent = current.extent();
      const seal = readSeal(directory);
      if (typeof seal !== 'string' && level !== null && sameSeal(seal, level)) return current;
      try {
        bringUp(current, extent, directory, typeof seal === 'string' ? null : seal, announce);
      } catch (error) {
        if (error instanceof IndexMoved && attempt < MOST_ATTEMPTS) continue;
        throw error;
      }
      level = typeof seal === 'string' ? null : seal;
      return current;
    }
  };

  return {
    ask(question) {
      try {
        return question(sync());
      } catch (error) {
        const code = sqliteCode(error);
        if (code === null) throw error;
        // The last level state is still a true answer; the next question tries again.
        if (code === BUSY && index !== null) return question(index);
        drop(() => (isBroken(code) ? openAgain(directory, book, announce) : openIndex(':memory:', book)));
        return question(sync());
      }
    },
    rebuild() {
      const seal = readSeal(directory);
      const name = typeof seal === 'string' ? book : seal.book;
      readNew(directory, emptyExtent(name), typeof seal === 'string' ? null : seal, (lines) =>
        opened().rebuild(name, lines),
      );
      level = null;
    },
    close() {
      index?.close();
      index = null;
      level = null;
    },
  };
}

/** Adds what the ledger has beyond the index, or makes the index again where it does not fit. */
function bringUp(
  index: Index,
  extent: Extent,
  directory: string,
  seal: Seal | null,
  announce: Announce,
): void {
  if (seal === null) {
    readNew(directory, extent, null, (lines) => index.add(lines));
    return;
  }
  if (extent.bytes === seal.bytes && extent.last === seal.last && extent.book === seal.book) return;
  // To sort once is faster than to keep sorted: from half on, making it again is less work.
  const isMuch = seal.entries - extent.entries >= extent.entries;
  const belongs = extent.book === seal.book && extent.bytes < seal.bytes && continues(directory, extent);
  const isEmpty = extent.entries === 0 && seal.entries > 1;
  if (index.isInMemory) announce(madeInMemory(seal), 'put right');
  else if (isEmpty || !belongs)
    announce(madeAgain(isEmpty ? 'is empty' : 'does not fit its ledger', seal), 'put right');
  if (belongs && !isMuch) readNew(directory, extent, seal, (lines) => index.add(lines));
  else readNew(directory, emptyExtent(seal.book), seal, (lines) => index.rebuild(seal.book, lines, extent));
}

/** Hands over the entries between the extent and the seal (or, without a seal, the end of the last whole line).
 *  @throws LedgerProblem 'ledger-damaged' at the first line that does not continue the chain. */
function readNew(
  directory: string,
  extent: Extent,
  seal: Seal | null,
  use: (lines: Iterable<IndexedLine>) => void,
): void {
  const path = ledgerPath(directory);
  const end = seal?.bytes ?? withFile(path, sizeOf);
  use(chain(path, extent, seal, end));
}

function* chain(path: string, extent: Extent, seal: Seal | null, end: number): Generator<IndexedLine, void> {
  let { entries, bytes: position, last } = extent;
  // Bytes that lead to the sealed digest are those that were written. How they are spelled is the audit's question.
  const read = rememberingReader(parseTrusted);
  for (const { bytes, whole, digest } of hashedLines(path, position, end)) {
    if (!whole) break;
    const entry = entryOf(read, path, entries + 1, bytes);
    if (entry.number !== entries + 1)
      throw ledgerDamaged(path, entries + 1, `expected entry ${entries + 1}, got ${entry.number}`);
    if (entry.before !== last) {
      throw ledgerDamaged(
        path,
        entries + 1,
        `the digest of the line before is ${last}, the entry says ${entry.before}`,
      );
    }
    entries += 1;
    last = digest;
    position += bytes.length + 1;
    yield { entry, digest, length: bytes.length };
  }
  if (seal !== null && (position !== seal.bytes || last !== seal.last)) {
    throw ledgerDamaged(path, seal.entries, `the seal says ${seal.entries} entries, the last ${seal.last}`);
  }
}

function entryOf(read: (bytes: Buffer) => Entry, path: string, line: number, bytes: Buffer): Entry {
  try {
    return read(bytes);
  } catch (error) {
    throw ledgerDamaged(path, line, (error as Error).message.replace(/\.$/, ''));
  }
}

/** Whether the line after the extent names the extent's last digest; false for another book's index. */
function continues(directory: string, extent: Extent): boolean {
  return withFile(ledgerPath(directory), (descriptor) => {
    for (const { bytes } of linesOf(descriptor, extent.bytes, sizeOf(descriptor))) {
      try {
        return parseEntry(bytes).before === extent.last;
      } catch {
        return false;
      }
    }
    return false;
  });
}

function openOrReplace(directory: string, book: string, announce: Announce): Index {
  makeWhereMissing(directory, book, announce);
  try {
    return openIndex(join(directory, 'index.sqlite'), book);
  } catch (error) {
    const code = sqliteCode(error);
    if (code === null) throw error;
    return isBroken(code) ? openAgain(directory, book, announce) : openUnwritable(directory, book);
  }
}

/** Makes the index of a book that has entries and none. Where that fails, the usual way says why. */
function makeWhereMissing(directory: string, book: string, announce: Announce): void {
  const path = join(directory, 'index.sqlite');
  const seal = readSeal(directory);
  if (existsSync(path) || typeof seal === 'string' || seal.entries === 0) return;
  try {
    accessSync(directory, constants.W_OK);
    announce(madeAgain('is missing', seal), 'put right');
    readNew(directory, emptyExtent(book), seal, (lines) => makeIndexFile(path, book, lines));
  } catch {}
}

/** A new index in place of one that is no database. */
function openAgain(directory: string, book: string, announce: Announce): Index {
  try {
    for (const suffix of ['', '-wal', '-shm'])
      rmSync(join(directory, `index.sqlite${suffix}`), { force: true });
    makeWhereMissing(directory, book, announce);
    return openIndex(join(directory, 'index.sqlite'), book);
  } catch {
    return openIndex(':memory:', book);
  }
}

function madeAgain(why: string, { entries }: Seal): string {
  return `The index of the book ${why}: it is made again from the ledger's ${entries} entries. Nothing is lost.`;
}

function madeInMemory({ entries }: Seal): string {
  return `The index of the book cannot be kept where it lies: one is made in memory from the ledger's ${entries} entries. Nothing is lost.`;
}

/** Where it cannot be written: what lies there, or a new one in memory. */
function openUnwritable(directory: string, book: string): Index {
  try {
    const found = openIndexToRead(join(directory, 'index.sqlite'));
    if (found !== null) return found;
  } catch {}
  return openIndex(':memory:', book);
}

function emptyExtent(book: string): Extent {
  return { book, entries: 0, bytes: 0, last: sha256('') };
}

function sameSeal(a: Seal, b: Seal): boolean {
  return a.bytes === b.bytes && a.last === b.last && a.book === b.book;
}

function isBroken(code: number): boolean {
  return code === CORRUPT || code === NOT_A_DATABASE;
}

/** The primary result code of SQLite's error; null for any other error. */
function sqliteCode(error: unknown): number | null {
  const { errcode } = error as { errcode?: number };
  return typeof errcode === 'number' ? errcode & 0xff : null;
}
