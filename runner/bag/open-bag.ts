/** A bag as a source of entries and files: opened only when the bag is sound, every entry in it is one entry of one book
 *  in its one spelling, and everything that the subject's lineage names is there with the digest and size named. */

import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { objectionsTo } from '../../ledger/acceptance.ts';
import { canonicalJson } from '../../ledger/canonical.ts';
import { DIGEST_OF_NOTHING, sha256 } from '../../ledger/digest.ts';
import type { Entry, FailureEntry, Json, StageEntry, StoredFile } from '../../ledger/entry.ts';
import { parseEntry } from '../../ledger/ledger-file.ts';
import { storeMissing } from '../../ledger/problem.ts';
import { referencesOf } from '../../ledger/references.ts';
import { type CheckedBag, checkBag } from './check-bag.ts';
import { badBag } from './problem.ts';
import { type CheckedProof, checkProofs } from './proofs.ts';

const LARGEST_ENTRY = 1 << 24;

export interface BaggedEntry {
  readonly entry: Entry;
  readonly digest: string;
  /** Without line feed. */
  readonly line: Buffer;
}

export interface Bag {
  readonly directory: string;
  /** The name of the book that it comes from. */
  readonly book: string;
  /** The number of the entry that was bagged, with all that it depends on. */
  readonly subject: number;
  readonly entries: ReadonlyMap<number, BaggedEntry>;
  /** What the proofs in the bag show; empty when it has none. */
  readonly proofs: ReadonlyMap<number, CheckedProof>;
  has(file: StoredFile): boolean;
  /** Whether a file with this digest is in it. */
  holds(digest: string): boolean;
  /** A file's bytes, held against the digest once more. @throws LedgerProblem 'store-missing'; RunnerProblem 'bad-bag' */
  read(digest: string): Buffer;
  /** Files of the payload. */
  readonly size: { readonly files: number; readonly bytes: number };
}

/** @throws RunnerProblem 'no-bag', 'bad-bag'. Cost: every file is read once, entries twice. */
export function openBag(directory: string): Bag {
  const checked = checkBag(directory);
  const paths = new Map([...checked.payload].map(([path, digest]) => [digest, path]));
  const read = (digest: string) => {
    const path = paths.get(digest);
    if (path === undefined) throw storeMissing(`${directory} (digest ${digest})`);
    const bytes = readFileSync(join(checked.directory, path));
    if (sha256(bytes) !== digest)
      throw badBag(path, 'a bag that stays as it is', 'one that changed while it was read');
    return bytes;
  };
  const has = ({ digest, bytes }: StoredFile) => {
    const path = paths.get(digest);
    return path !== undefined && checked.sizes.get(path) === bytes;
  };
  const entries = readEntries(checked, read);
  const book = requireOneBook(entries);
  requireChain(entries);
  const subject = subjectOf(checked, entries);
  requireLineage(entries, subject, has);
  const proofs = checkProofs(checked, entries, read);
  const bytes = [...checked.payload.keys()].reduce((sum, path) => sum + (checked.sizes.get(path) ?? 0), 0);
  const size = { files: checked.payload.size, bytes };
  const holds = (digest: string) => paths.has(digest);
  return { directory: checked.directory, book, subject, entries, proofs, has, holds, read, size };
}

/** Where the line of an entry lies; its digest in the manifest is the entry's. */
export function entryPath(number: number): string {
  return `data/entries/${number}.json`;
}

function readEntries(checked: CheckedBag, read: (digest: string) => Buffer): Map<number, BaggedEntry> {
  const entries = new Map<number, BaggedEntry>();
  for (const [path, digest] of checked.payload) {
    if (!path.startsWith('data/entries/')) continue;
    const size = checked.sizes.get(path) ?? 0;
    if (size > LARGEST_ENTRY) throw badBag(path, `at most ${LARGEST_ENTRY} bytes`, `${size}`);
    const line = read(digest);
    const entry = readEntry(path, line);
    if (path !== entryPath(entry.number))
      throw badBag(path, `the entry of this number`, `entry ${entry.number}`);
    requireCode(path, entry);
    entries.set(entry.number, { entry, digest, line });
  }
  if (entries.size === 0) throw badBag('data/entries', 'entries of a book', 'none');
  return new Map([...entries].sort(([a], [b]) => a - b));
}

function readEntry(path: string, line: Buffer): Entry {
  try {
    return parseEntry(line);
  } catch (error) {
    throw badBag(path, 'an entry in canonical JSON', (error as Error).message.replace(/\.$/, ''));
  }
}

/** The digest of a stage's code is that of what it lists, and the key that of what went in (entry.ts). */
function requireCode(path: string, entry: Entry): void {
  if (entry.type !== 'stage' && entry.type !== 'failure') return;
  const { files, packages, runtime, version, digest } = entry.code;
  const found = sha256(canonicalJson({ files, packages, runtime, version } as Json));
  if (found !== digest)
    throw badBag(path, `code with digest ${digest}`, `a list of code with digest ${found}`);
  const key = sha256(canonicalJson(keyParts(entry)));
  if (key !== entry.key) throw badBag(path, `the key ${key}`, `${entry.key}`);
}

function keyParts({ kind, code, inputs, parameters }: StageEntry | FailureEntry): Json {
  const digests = Object.entries(inputs).map(
    ([name, list]) => [name, list.map(({ digest }) => digest)] as const,
  );
  return { kind, code: code.digest, inputs: Object.fromEntries(digests), parameters };
}

function requireOneBook(entries: ReadonlyMap<number, BaggedEntry>): string {
  const books = new Set([...entries.values()].map(({ entry }) => entry.book));
  const [book] = books;
  if (book === undefined || books.size > 1) {
    throw badBag(
      'data/entries',
      'entries of one book',
      `entries of ${[...books].map((name) => `"${name}"`).join(', ')}`,
    );
  }
  return book;
}

/** Where two entries follow each other, the second names the digest of the first. */
function requireChain(entries: ReadonlyMap<number, BaggedEntry>): void {
  for (const [number, { entry }] of entries) {
    const before = number === 1 ? DIGEST_OF_NOTHING : entries.get(number - 1)?.digest;
    if (before !== undefined && entry.before !== before) {
      throw badBag(entryPath(number), `the digest of the entry before it, ${before}`, entry.before);
    }
  }
}

function subjectOf({ info }: CheckedBag, entries: ReadonlyMap<number, BaggedEntry>): number {
  const stated = info.filter(([label]) => label === 'Platebook-Entry').map(([, value]) => value);
  const subject = Number(stated[0]);
  if (stated.length === 1 && /^\d+$/.test(stated[0] ?? '') && entries.has(subject)) return subject;
  throw badBag(
    'bag-info.txt',
    'one Platebook-Entry, the number of an entry in the bag',
    stated.join(', ') || 'none',
  );
}

/** The subject and everything that it depends on is there; the book would accept each of these entries. */
function requireLineage(
  entries: ReadonlyMap<number, BaggedEntry>,
  subject: number,
  hasFile: Bag['has'],
): void {
  for (const number of lineageIn(entries, subject)) {
    const { entry } = entries.get(number) as BaggedEntry;
    const earlier = (n: number) => (n < number ? entries.get(n) : undefined);
    const [objection] = objectionsTo(entry, {
      book: entry.book,
      hasFile,
      entry: earlier,
      rootAt: () => null,
    });
    if (objection !== undefined) throw badBag(entryPath(number), 'all that it names in the bag', objection);
  }
}

/** An entry of a bag and those in the bag that it depends on, by number. */
export function lineageIn(entries: ReadonlyMap<number, BaggedEntry>, subject: number): number[] {
  const found = new Set<number>();
  const waiting = [subject];
  for (let next = waiting.pop(); next !== undefined; next = waiting.pop()) {
    const bagged = entries.get(next);
    if (bagged === undefined || found.has(next)) continue;
    found.add(next);
    for (const { number } of referencesOf(bagged.entry).entries) waiting.push(number);
  }
  return [...found].sort((a, b) => a - b);
}
