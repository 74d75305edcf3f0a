/** The index: a database derived from the ledger, for fast questions. It can be deleted at any moment and is made
 *  again. It holds where each line lies and its digest, so that a line that was changed is noticed when it is read.
 *
 *  Write-ahead logging lets readers read while one process writes. Only `remembered` (the digests of files outside) is
 *  not derived; losing it costs one reading of each file. `settings` holds the values of parameters by the number that
 *  settingsOf gives a whole set of them: sets repeat from run to run, so it grows much slower than the ledger. */

import { existsSync, linkSync, rmSync, statSync } from 'node:fs';
import { endianness } from 'node:os';
import { DatabaseSync, type StatementSync } from 'node:sqlite';
import { pathToFileURL } from 'node:url';
import { DIGEST_OF_NOTHING } from './digest.ts';
import { addLines, type IndexedLine, IndexMoved, type Prepare } from './index-filling.ts';
import type { Value } from './index-rows.ts';

/** Changes when the tables do; an index of another version, or of a machine with another order of bytes, is made again. */
const VERSION = endianness() === 'LE' ? 3 : 0x10003;
/** How long a write may wait for another process's; both last a millisecond. */
const PATIENCE_MILLISECONDS = 500;
/** Pages held in memory, kB: SQLite's own default, and what sorting millions of rows asks for. */
const CACHE = 2_000;
const CACHE_WHILE_MAKING = 16_000;

const SCHEMA = `
  CREATE TABLE entries(number INTEGER PRIMARY KEY, position INTEGER, length INTEGER, digest TEXT, type TEXT, time TEXT,
    name TEXT, kind TEXT, key INTEGER, run INTEGER, settings INTEGER);
  CREATE TABLE files(mark INTEGER, rest INTEGER, role TEXT, name TEXT, entry INTEGER);
  CREATE TABLE bundles(bundle INTEGER PRIMARY KEY, links BLOB);
  CREATE TABLE plates(plate TEXT, entry INTEGER PRIMARY KEY, drawn INTEGER, output TEXT, name TEXT);
  CREATE TABLE numbers(name TEXT, place INTEGER, entry INTEGER, output TEXT, publisher INTEGER,
    PRIMARY KEY(publisher, place)) WITHOUT ROWID;
  CREATE TABLE withdrawals(withdraws INTEGER, entry INTEGER);
  CREATE TABLE countersignatures(signs INTEGER, entry INTEGER);
  CREATE TABLE settings(name TEXT, value TEXT, settings INTEGER, PRIMARY KEY(name, value, settings)) WITHOUT ROWID;
  CREATE TABLE extent(book TEXT, entries INTEGER, bytes INTEGER, last TEXT);
  CREATE TABLE IF NOT EXISTS remembered(path TEXT PRIMARY KEY, stamp TEXT, digest TEXT, bytes INTEGER);
  PRAGMA user_version = ${VERSION};
`;

/** Made after a new index has been filled: sorting once is faster than keeping them sorted. Those of entries end with
 *  the number, by which the latest are found first. */
const INDEXES = `
  CREATE INDEX entries_key ON entries(key, number) WHERE key IS NOT NULL;
  CREATE INDEX entries_run ON entries(run) WHERE run IS NOT NULL;
  CREATE INDEX entries_digest ON entries(substr(digest, 1, 16));
  CREATE INDEX entries_type ON entries(type, number);
  CREATE INDEX entries_time ON entries(time, number);
  CREATE INDEX entries_kind ON entries(kind, number) WHERE kind IS NOT NULL;
  CREATE INDEX entries_stage ON entries(name, number) WHERE kind IS NOT NULL;
  CREATE INDEX entries_recipe ON entries(name, number) WHERE run IS NOT NULL;
  CREATE INDEX entries_settings ON entries(settings, number) WHERE settings IS NOT NULL;
  CREATE INDEX files_mark ON files(mark, entry);
  CREATE INDEX plates_plate ON plates(plate);
  CREATE INDEX plates_drawn ON plates(drawn);
  CREATE INDEX numbers_entry ON numbers(entry);
  CREATE INDEX withdrawals_withdraws ON withdrawals(withdraws, entry);
  CREATE INDEX countersignatures_signs ON countersignatures(signs, entry);
`;

/** The number of the last run. Not max(run): that would read every entry. */
export const LAST_RUN = 'SELECT run FROM entries WHERE run IS NOT NULL ORDER BY run DESC LIMIT 1';

/** How much of the ledger the index has. */
export interface Extent {
  readonly book: string;
  readonly entries: number;
  readonly bytes: number;
  readonly last: string;
}

/** Where an entry's line lies. */
export interface Row {
  readonly number: number;
  readonly position: number;
  /** Without the line feed. */
  readonly length: number;
  readonly digest: string;
  readonly type: string;
}

export interface FileRow {
  readonly role: string;
  readonly name: string;
  readonly entry: number;
}

export interface PlateRow {
  readonly plate: string;
  readonly entry: number;
  readonly drawn: number;
  readonly output: string;
  /** As published. */
  readonly name: string;
}

export interface Index {
  /** Not in a file: it is made anew by every process. */
  readonly isInMemory: boolean;
  extent(): Extent;
  /** Adds entries that follow the extent. All or nothing. */
  add(lines: Iterable<IndexedLine>): void;
  /** Forgets everything that is derived, and adds entries from the first. All or nothing.
   *  @param seen  the extent that is to be replaced  @throws IndexMoved when it is another by now */
  rebuild(book: string, lines: Iterable<IndexedLine>, seen?: Extent): void;
  /** Rows of a question in SQL; statements are prepared once. */
  all<T>(sql: string, ...values: Value[]): T[];
  get<T>(sql: string, ...values: Value[]): T | undefined;
  remember(path: string, stamp: string, digest: string, bytes: number): void;
  close(): void;
}

/** Opens the index in a file, or ':memory:', and makes its tables when they are missing or of another version.
 *  @throws SQLite's error when the file is no database or cannot be written. */
export function openIndex(path: string, book: string): Index {
  const database = new DatabaseSync(path, { timeout: PATIENCE_MILLISECONDS });
  const index = indexOver(database, path === ':memory:');
  try {
    database.exec('PRAGMA journal_mode = WAL; PRAGMA synchronous = NORMAL');
    if (!isCurrent(database)) index.rebuild(book, []);
    return index;
  } catch (error) {
    database.close();
    throw error;
  }
}

/** Opens an index in a place that cannot be written, as it stands; null when it is not whole without its journal, or of another version.
 *  @throws SQLite's error */
export function openIndexToRead(path: string): Index | null {
  const journal = statSync(`${path}-wal`, { throwIfNoEntry: false });
  if (!existsSync(path) || (journal !== undefined && journal.size > 0)) return null;
  const place = pathToFileURL(path);
  // Nobody writes to it: SQLite need not look for locks and journals, for which it would have to write.
  place.searchParams.set('immutable', '1');
  const database = new DatabaseSync(place, { readOnly: true });
  if (isCurrent(database)) return indexOver(database, false);
  database.close();
  return null;
}

function sameExtent(a: Extent, b: Extent): boolean {
  return a.book === b.book && a.bytes === b.bytes && a.last === b.last;
}

function indexOver(database: DatabaseSync, isInMemory: boolean): Index {
  const prepare = preparing(database);
  const index: Index = {
    isInMemory,
    extent: () => prepare('SELECT book, entries, bytes, last FROM extent').get() as unknown as Extent,
    add(lines) {
      transact(database, () => addLines(prepare, index.extent(), lines));
    },
    rebuild(name, lines, seen) {
      database.exec(`PRAGMA cache_size = ${-CACHE_WHILE_MAKING}`);
      transact(database, () => {
        if (seen !== undefined && !sameExtent(seen, index.extent())) throw new IndexMoved();
        makeTables(database, name);
        addLines(prepare, index.extent(), lines);
        database.exec(INDEXES);
      });
      database.exec(`PRAGMA cache_size = ${-CACHE}`);
    },
    all: (sql, ...values) => prepare(sql).all(...values) as never,
    get: (sql, ...values) => prepare(sql).get(...values) as never,
    remember(at, stamp, digest, bytes) {
      prepare('INSERT OR REPLACE INTO remembered VALUES (?, ?, ?, ?)').run(at, stamp, digest, bytes);
    },
    close: () => database.close(),
  };
  return index;
}

/** Makes the index of a book in a new file, where there is none, and gives it its name when it is whole: nobody sees it
 *  before, so it needs no journal. Half the time of rebuilding in place.
 *  @returns false when there was one, or somebody else was faster. @throws SQLite's error, the file system's error */
export function makeIndexFile(path: string, book: string, lines: Iterable<IndexedLine>): boolean {
  if (existsSync(path)) return false;
  const made = `${path}.new-${process.pid}`;
  rmSync(made, { force: true });
  try {
    const database = new DatabaseSync(made);
    try {
      database.exec(`PRAGMA journal_mode = OFF; PRAGMA synchronous = OFF; PRAGMA threads = 2;
        PRAGMA cache_size = ${-CACHE_WHILE_MAKING}`);
      const prepare = preparing(database);
      transact(database, () => {
        makeTables(database, book);
        addLines(prepare, { book, entries: 0, bytes: 0, last: DIGEST_OF_NOTHING }, lines);
        database.exec(INDEXES);
      });
    } finally {
      database.close();
    }
    // What a deleted index has left beside it would be taken for this one's. In this order: an index that somebody else
    // has made meanwhile was there before its journal was.
    const left = ['-wal', '-shm', '-journal']
      .map((suffix) => `${path}${suffix}`)
      .filter((file) => existsSync(file));
    if (existsSync(path)) return false;
    for (const file of left) rmSync(file, { force: true });
    linkSync(made, path);
    return true;
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code === 'EEXIST') return false;
    throw error;
  } finally {
    rmSync(made, { force: true });
  }
}

/** Opens an index that exists, for reading only; for audits. @throws SQLite's error */
export function openForAudit(path: string): DatabaseSync {
  return new DatabaseSync(path, { readOnly: true, timeout: PATIENCE_MILLISECONDS });
}

/** Whether a database has the tables of this version. */
export function isCurrent(database: DatabaseSync): boolean {
  return (database.prepare('PRAGMA user_version').get() as { user_version: number }).user_version === VERSION;
}

/** Prepares each statement once. */
function preparing(database: DatabaseSync): Prepare {
  const statements = new Map<string, StatementSync>();
  return (sql) => {
    const statement = statements.get(sql) ?? database.prepare(sql);
    statements.set(sql, statement);
    return statement;
  };
}

function makeTables(database: DatabaseSync, book: string): void {
  // Those of another version too.
  const tables = database.prepare(
    "SELECT name FROM sqlite_master WHERE type = 'table' AND name <> 'remembered'",
  );
  for (const { name } of tables.all() as { name: string }[]) database.exec(`DROP TABLE ${name}`);
  database.exec(SCHEMA);
  database.prepare('INSERT INTO extent VALUES (?, 0, 0, ?)').run(book, DIGEST_OF_NOTHING);
}

function transact(database: DatabaseSync, work: () => void): void {
  database.exec('BEGIN IMMEDIATE');
  try {
    work();
    database.exec('COMMIT');
  } catch (error) {
    database.exec('ROLLBACK');
    throw error;
  }
}
