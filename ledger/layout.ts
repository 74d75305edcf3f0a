/** What lies in a book's directory, and how it gets there. */

import type { KeyObject } from 'node:crypto';
import { closeSync, existsSync, fsyncSync, mkdirSync, openSync, readdirSync, statSync } from 'node:fs';
import { basename, join } from 'node:path';
import type { Announce } from './book.ts';
import { makeDirectoryDurably, syncDirectory } from './durable.ts';
import { ledgerPath, linesOf, parseEntry, withFile } from './ledger-file.ts';
import { badBookName, cannotWrite, ledgerDamaged, noBook, notADirectory, otherDirectory } from './problem.ts';
import { emptySeal, hasSeal, readSeal } from './seal.ts';
import { replaceSeal } from './sealing.ts';
import type { Turns } from './turns.ts';

/** What a directory may hold in which starting a book was interrupted. */
const OURS = new Set([
  'index.sqlite',
  'index.sqlite-shm',
  'index.sqlite-wal',
  'ledger.jsonl',
  'logs',
  'seals',
  'store',
  'tree',
  'turns.sqlite',
  'turns.sqlite-journal',
]);

/** @throws LedgerProblem 'no-book' unless the directory holds a book; 'ledger-damaged' when it lost its ledger. */
export function requireBook(directory: string): void {
  const found = statSync(directory, { throwIfNoEntry: false });
  if (found !== undefined && !found.isDirectory()) throw notADirectory(directory);
  if (!hasBook(directory)) throw noBook(directory);
  if (!existsSync(ledgerPath(directory))) {
    throw ledgerDamaged(ledgerPath(directory), undefined, 'the ledger is missing, its seal is there');
  }
}

/** Whether a directory holds a book, sound or not. A ledger without a line and without a seal is none yet: starting it
 *  was interrupted. */
export function hasBook(directory: string): boolean {
  if (hasSeal(directory)) return true;
  const ledger = statSync(ledgerPath(directory), { throwIfNoEntry: false });
  return ledger !== undefined && ledger.size > 0;
}

/** How a book is started. */
export interface Start {
  readonly name: string;
  readonly key: () => KeyObject;
  /** Of the first seal. */
  readonly time: string;
  readonly announce: Announce;
}

/** Starts a book, unless there is one. Processes that do so at once make one.
 *  @throws LedgerProblem 'no-book' when the directory is something else, 'cannot-write'. */
export function startBook(directory: string, start: Start, turns: Turns): void {
  requireRoom(directory);
  if (!isBookName(start.name)) throw badBookName(start.name);
  start.key();
  try {
    makeDirectoryDurably(directory);
  } catch (cause) {
    throw cannotWrite(directory, cause);
  }
  turns.take(() => {
    if (hasBook(directory)) return;
    try {
      makeLayout(directory, start);
    } catch (cause) {
      throw cannotWrite(directory, cause);
    }
  });
}

/** The name that a book goes by: its seal's, or where that is damaged its first entry's. */
export function nameOf(directory: string): string {
  const seal = readSeal(directory);
  if (typeof seal !== 'string') return seal.book;
  return withFile(ledgerPath(directory), (descriptor) => {
    for (const { bytes } of linesOf(descriptor, 0, statSync(ledgerPath(directory)).size)) {
      try {
        return parseEntry(bytes).book;
      } catch {}
    }
    return basename(directory);
  });
}

function requireRoom(directory: string): void {
  const found = statSync(directory, { throwIfNoEntry: false });
  if (found === undefined) return;
  if (!found.isDirectory()) throw notADirectory(directory);
  const others = readdirSync(directory)
    .filter((name) => !OURS.has(name))
    .sort();
  if (others.length > 0) throw otherDirectory(directory, others);
}

/** The seal comes last: a book without it is not finished. */
function makeLayout(directory: string, { name, key, time, announce }: Start): void {
  for (const part of ['store/new', 'seals', 'logs']) mkdirSync(join(directory, part), { recursive: true });
  const descriptor = openSync(ledgerPath(directory), 'a');
  fsyncSync(descriptor);
  closeSync(descriptor);
  syncDirectory(directory);
  replaceSeal(directory, emptySeal(name, time), key(), announce, null);
}

function isBookName(name: string): boolean {
  return name.length >= 1 && name.length <= 100 && name.isWellFormed() && !/\p{Cc}/u.test(name);
}
