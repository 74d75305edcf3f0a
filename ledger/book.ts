/** The book: a directory in which entries are appended and never changed.
 *
 *      ledger.jsonl        the entries, one a line
 *      seals/              signed heads of the tree over the entries, and the keys that sign: seal.ts
 *      store/3f9/3f9a…     files named by their SHA-256, read-only
 *      logs/               what stages said, while they ran
 *      index.sqlite        derived from the ledger; can be deleted
 *      tree                hashes of the tree over the entries, derived; can be deleted
 *      turns.sqlite        empty; the lock by which writers take turns
 *      torn-after-entry-…  what an interrupted write left; see recovery.ts
 *
 *  Grammar of the ledger. A line is an object of entry.ts in canonical JSON (RFC 8785, UTF-8), then one line feed; there
 *  is nothing else in the file. `number` is the line's number, from 1. `before` is the SHA-256 of the line before without
 *  its line feed, of no bytes in the first. An entry's digest is the SHA-256 of its line without the line feed. A line in
 *  any other spelling is damage. Fields and types may be added; what stands keeps its meaning.
 *
 *  A book with one entry, a run of a recipe without stages (a test makes exactly this book):
 *
 *      {"before":"e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855","book":"lantern","by":{"name":"A. Keeper"},"finished":true,"number":1,"numbers":[],"overrides":[],"plates":[],"recipe":{"bytes":14,"digest":"77caf4937ae08aea6bf91729c88da5cfe69fe57505dec54d9650293990ac2177","name":"empty","path":"empty.yaml"},"run":1,"stages":[],"time":"2026-01-02T03:04:05.678Z","type":"run"}
 *
 *  and its seal, before the signature:
 *
 *      lantern
 *      1
 *      7ogfHgRBsxqkL3WjULhC0NtrvySksgYbT2BmkUSi7rM=
 *      bytes 388
 *      last 384808308cb00fd76d04d8b3135a373e1495d3834afaa4cb94d786539ee3ceec
 *      time 2026-01-02T03:04:05.678Z
 *
 *  Order of writing: the files an entry names (synced), the hashes of the tree (not synced), the line (synced), after a
 *  run the seal so far among those kept (synced), the seal (synced), the index. A crash between two of them leaves a book
 *  that opens. Readers go by the seal, take no turn and wait for nobody. */

import type { KeyObject } from 'node:crypto';
import { basename, join, resolve } from 'node:path';
import { appendEntry, type Writer } from './append.ts';
import type { Draft, Entry, Person, RunEntry, StageEntry, StoredFile } from './entry.ts';
import { type Index, LAST_RUN } from './index.ts';
import { keepIndex } from './index-keeper.ts';
import { markOf } from './index-rows.ts';
import { hasBook, nameOf, requireBook, startBook } from './layout.ts';
import { digestOfFile } from './outside-file.ts';
import { asProblem } from './problem.ts';
import { digestOfEntry, readEntry, visitEntries } from './reading.ts';
import { recover, type Sealing, standingOf, takeUp } from './recovery.ts';
import { signingKeyFile, useSigningKey } from './signing-key.ts';
import { openStore, type Store, sweepStore } from './store.ts';
import { formatTime } from './time.ts';
import { openTurns, type Turns } from './turns.ts';
import { withdrawalsUpstream } from './withdrawal.ts';

const STAGES_OF_KEY = 'SELECT number FROM entries WHERE key = ? ORDER BY number DESC';
const RUN = 'SELECT number FROM entries WHERE run = ?';

/** Hears what was put right after a crash, of damage, of keys that are new, and of a clock that is behind. */
export type Announce = (text: string, what: 'put right' | 'damaged' | 'key' | 'clock') => void;

export interface BookOptions {
  /** Who enters; without a person the book can only be read. */
  readonly by?: Person;
  /** The name of a book that is started; the directory's name when left out. A book keeps its name. */
  readonly name?: string;
  /** Start a book where there is none. Default false. */
  readonly create?: boolean;
  readonly now?: () => Date;
  /** The file with the key that signs seals, made when first needed; default: signingKeyFile of the environment. */
  readonly key?: string;
  /** Default: nobody. */
  readonly announce?: Announce;
}

export interface Book {
  /** Absolute. */
  readonly directory: string;
  readonly name: string;
  readonly store: Store;
  /** Enters a draft and returns when it is on the disk. Waits for its turn. Three syncs, four after a run.
   *  @throws LedgerProblem 'bad-draft' when something it names is not there, 'not-canonical', 'cannot-write',
   *  'ledger-damaged'; the book is then as before. */
  append(draft: Draft): { entry: Entry; digest: string };
  /** @throws LedgerProblem 'not-found', or 'ledger-damaged' when the line is not what was written. */
  entry(number: number): Entry;
  digestOf(number: number): string;
  count(): number;
  /** Entries in order, from a number on. */
  entries(from?: number): Iterable<Entry>;
  /** The newest stage entry of a key whose outputs all stand in the store, and of which nothing upstream is withdrawn. */
  findStage(key: string): StageEntry | undefined;
  findRun(run: number): RunEntry | undefined;
  lastRun(): RunEntry | undefined;
  /** Digest and size of a file outside; remembered, and read again only when it changed or with `strict`. */
  digestOfFile(path: string, options?: { readonly strict?: boolean }): StoredFile;
  /** Asks the index, level with the ledger. */
  ask<T>(question: (index: Index) => T): T;
  close(): void;
}

/** Opens the book in a directory, and puts right what a crash left. Reads the seal and the last line, not the ledger.
 *  Damage is announced and does not keep the book from opening; it keeps everybody from writing.
 *  @throws LedgerProblem 'no-book', 'cannot-write' when one is to be started, 'ledger-damaged' without a ledger. */
export function openBook(directory: string, options: BookOptions = {}): Book {
  const at = resolve(directory);
  const announce = options.announce ?? (() => {});
  const key = keyOf(options, announce);
  const turns = openTurns(at);
  const opened = options.now?.() ?? new Date();
  const time = formatTime(opened);
  try {
    if (options.create === true && !hasBook(at))
      startBook(at, { name: options.name ?? basename(at), key, time, announce }, turns);
    requireBook(at);
    putRight(at, turns, announce, options.by === undefined ? null : () => ({ key: key(), time }));
    if (options.by !== undefined) sweepStore(join(at, 'store'), opened.getTime());
    return bookIn(at, nameOf(at), turns, announce, key, options);
  } catch (error) {
    turns.close();
    throw asProblem(error, at, options.by !== undefined);
  }
}

/** The key that signs, read or made when it is first asked for. */
function keyOf({ key: file }: BookOptions, announce: Announce): () => KeyObject {
  let known: KeyObject | null = null;
  return () => {
    known ??= useSigningKey(file ?? signingKeyFile(process.env), announce);
    return known;
  };
}

/** @param sealing  null for a reader */
function putRight(
  directory: string,
  turns: Turns,
  announce: Announce,
  sealing: (() => Sealing) | null,
): void {
  let standing = standingOf(directory);
  const isDue = () =>
    standing.state === 'unsealed' ||
    (standing.state === 'sealed' && standing.seal.note === null && sealing !== null);
  if (isDue()) {
    turns.takeIfFree(() => {
      standing = standingOf(directory);
      if (standing.state === 'unsealed')
        standing = recover(directory, standing, announce, sealing?.() ?? null);
      if (standing.state === 'sealed' && standing.seal.note === null && sealing !== null)
        standing = takeUp(directory, standing, announce, sealing());
    });
  }
  if (standing.state === 'damaged')
    announce(`The book in ${directory} is damaged: ${standing.what}. Audit it.`, 'damaged');
}

function bookIn(
  directory: string,
  name: string,
  turns: Turns,
  announce: Announce,
  key: () => KeyObject,
  { by, now = () => new Date() }: BookOptions,
): Book {
  const store = openStore(join(directory, 'store'));
  const keeper = keepIndex(directory, name, announce);
  const writer: Writer = { directory, turns, keeper, store, by, now, announce, key, own: null };
  const entry = (number: number) => readEntry(directory, keeper, number);
  const lastRun = () => keeper.ask((index) => index.get<{ run: number }>(LAST_RUN))?.run ?? 0;
  const findRun = (run: number) => {
    const row = keeper.ask((index) => index.get<{ number: number }>(RUN, run));
    return row === undefined ? undefined : (entry(row.number) as RunEntry);
  };
  const book: Book = {
    directory,
    name,
    store,
    append: (draft) => appendEntry(writer, draft),
    entry,
    digestOf: (number) => digestOfEntry(keeper, number),
    count: () => keeper.ask((index) => index.extent().entries),
    entries: (from = 1) => visitEntries(directory, keeper, from),
    findStage(key) {
      const found = keeper.ask((index) => index.all<{ number: number }>(STAGES_OF_KEY, markOf(key)));
      for (const { number } of found) {
        const stage = entry(number) as StageEntry;
        if (stage.key !== key) continue;
        if (!Object.values(stage.outputs).every((file) => store.has(file))) continue;
        if (withdrawalsUpstream(book, number).length === 0) return stage;
      }
      return undefined;
    },
    findRun,
    lastRun: () => findRun(lastRun()),
    digestOfFile: (path, { strict = false } = {}) => digestOfFile(path, keeper, strict, now().getTime()),
    ask: (question) => keeper.ask(question),
    close() {
      keeper.close();
      turns.close();
    },
  };
  return book;
}
