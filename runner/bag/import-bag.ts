/** Takes a bag's entries over into a book, each as an `import` entry: its line as it stood in its own book, under its own
 *  digest, with its proof, and the files that it names and the bag holds. Imported numbers are of the other book; an
 *  import entry says which entries of this one stand for those that its line depends on.
 *
 *  The bag is checked as a whole before anything is written. All files are in the store before the first entry is
 *  appended; repeating an import that was cut short completes it, and an entry that stands is not entered again. */

import type { Book } from '../../ledger/book.ts';
import type { Entry, ImportDraft, ImportEntry, ImportedFile } from '../../ledger/entry.ts';
import { referencesOf } from '../../ledger/references.ts';
import { entryColumns } from '../commands/entry-title.ts';
import { keptCode } from '../recorded-code/keep.ts';
import type { Bag, BaggedEntry } from './open-bag.ts';
import { badBag } from './problem.ts';

const IMPORTS = "SELECT number FROM entries WHERE type = 'import' ORDER BY number";

export interface Imported {
  /** Numbers of the import entries made, in order. */
  readonly entries: readonly number[];
  /** Of those that stood already. */
  readonly standing: readonly number[];
}

/** @throws RunnerProblem 'bad-bag' when the bag changes meanwhile; LedgerProblem when the book cannot be written */
export function importBag(bag: Bag, book: Book): Imported {
  const standing = standingImports(book);
  const code = new Set<string>();
  const kept = new Map<number, KeptFiles>();
  for (const [number, bagged] of bag.entries) kept.set(number, keepFiles(bagged, bag, book, code));
  const numbers = new Map<number, number>();
  const made: number[] = [];
  const found: number[] = [];
  for (const [number, bagged] of bag.entries) {
    const stands = standing.get(bagged.digest);
    if (stands !== undefined) {
      numbers.set(number, stands);
      found.push(stands);
      continue;
    }
    const { entry } = book.append(draftOf(bagged, kept.get(number) as KeptFiles, numbers));
    numbers.set(number, entry.number);
    made.push(entry.number);
  }
  return { entries: made, standing: found };
}

/** Import entries of a book, by the digest of what they took over. */
function standingImports(book: Book): Map<string, number> {
  const rows = book.ask((index) => index.all<{ number: number }>(IMPORTS));
  return new Map(
    rows.map(({ number }) => {
      const entry = book.entry(number) as ImportEntry;
      return [entry.origin.digest, number];
    }),
  );
}

interface KeptFiles {
  readonly record: ImportDraft['record'];
  readonly proof: ImportDraft['proof'];
  readonly files: readonly ImportedFile[];
}

/** @param code  digests of code that an entry before this one names; files of code are named once */
function keepFiles({ entry, line, digest }: BaggedEntry, bag: Bag, book: Book, code: Set<string>): KeptFiles {
  const keep = (wanted: string) => {
    const file = book.store.keepBytes(bag.read(wanted));
    if (file.digest !== wanted) throw badBag(bag.directory, `bytes with digest ${wanted}`, file.digest);
    return file;
  };
  const record = book.store.keepBytes(line);
  if (record.digest !== digest) throw badBag(bag.directory, `a line with digest ${digest}`, record.digest);
  const proof = bag.proofs.get(entry.number);
  const files = namedFiles(entry).filter((file) => bag.has(file));
  const sources = codeOf(entry).filter(([, wanted]) => !code.has(wanted) && bag.holds(wanted));
  for (const [, wanted] of sources) code.add(wanted);
  return {
    record,
    proof: proof === undefined ? null : book.store.keepBytes(proof.text),
    files: [
      ...files.map((file) => ({ ...file, ...keep(file.digest) })),
      ...sources.map(([name, wanted]) => ({ role: 'code', name, ...keep(wanted) })),
    ],
  };
}

function codeOf(entry: Entry): [path: string, digest: string][] {
  return entry.type === 'stage' || entry.type === 'failure' ? keptCode(entry.code) : [];
}

/** Files that an entry brings with it, each once. */
function namedFiles(entry: Entry): ImportedFile[] {
  // An input that came from a stage is the output of another entry of the bag.
  const own = referencesOf(entry).files.filter(({ role, stored }) => role !== 'input' || !stored);
  const named = own.map(({ role, name, digest, bytes }) => ({
    role,
    name,
    digest,
    bytes,
  }));
  const unique = new Map(named.map((file) => [`${file.role} ${file.name} ${file.digest}`, file]));
  return [...unique.values()];
}

function draftOf(
  { entry, digest }: BaggedEntry,
  { record, proof, files }: KeptFiles,
  numbers: ReadonlyMap<number, number>,
): ImportDraft {
  const [type, name] = entryColumns(entry);
  const needed = [...new Set(referencesOf(entry).entries.map(({ number }) => number))].sort((a, b) => a - b);
  return {
    type: 'import',
    origin: { book: entry.book, number: entry.number, digest },
    imported: { type, name, by: entry.by },
    record,
    proof,
    files,
    entries: needed.flatMap((number) => {
      const here = numbers.get(number);
      return here === undefined ? [] : [{ number, entry: here }];
    }),
  };
}
