/** The index: a database derived from the ledger, for fast questions. It can be deleted at any moment and is made
 *  again. It holds where each line lies and its digest, so that a line that was changed is noticed when it is read.
 *
 *  Write-ahead logging lets readers read while one process writes. Only `remembered` (the digests of files outside) is
 *  not derived; losing it costs one reading of each file. */

import { DatabaseSync, type StatementSync } from 'node:sqlite';
import { DIGEST_OF_NOTHING } from './digest.ts';
import type { Entry } from './entry.ts';
import { plateNumbersOf } from './plate-number.ts';
import { referencesOf } from './references.ts';

/** Changes when the tables do; an index of another version is made again. */
const VERSION = 1;
/** How long a write may wait for another process's; both last a millisecond. */
const PATIENCE_MILLISECONDS = 500;

/** The derived tables; audits compare them whole. */
export const TABLES = ['entries', 'files', 'links', 'plates', 'numbers'] as const;

const SCHEMA = `
  CREATE TABLE entries(number INTEGER PRIMARY KEY, position INTEGER, length INTEGER, digest TEXT, type TEXT, time TEXT,
    name TEXT, kind TEXT, key TEXT, run INTEGER);
  CREATE INDEX entries_key ON entries(key, number) WHERE key IS NOT NULL;
  CREATE INDEX entries_run ON entries(run) WHERE run IS NOT NULL;
  CREATE INDEX entries_digest ON entries(digest);
  CREATE INDEX entries_type ON entries(type, name, number);
  CREATE TABLE files(digest TEXT, bytes INTEGER, role TEXT, name TEXT, entry INTEGER);
  CREATE INDEX files_digest ON files(digest, entry);
  CREATE TABLE links(source INTEGER, target INTEGER);
  CREATE INDEX links_source ON links(source);
  CREATE INDEX links_target ON links(target);
  CREATE TABLE plates(plate TEXT, entry INTEGER, drawn INTEGER, output TEXT);
  CREATE INDEX plates_plate ON plates(plate);
  CREATE TABLE numbers(name TEXT, run INTEGER, place INTEGER);
  CREATE INDEX numbers_name ON numbers(name, run);
  CREATE TABLE extent(book TEXT, entries INTEGER, bytes INTEGER, last TEXT);
  CREATE TABLE IF NOT EXISTS remembered(path TEXT PRIMARY KEY, stamp TEXT, digest TEXT, bytes INTEGER);
  PRAGMA user_version = ${VERSION};
`;

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
  readonly digest: string;
  readonly bytes: number;
  readonly role: string;
  readonly name: string;
  readonly entry: number;
}

export interface PlateRow {
  readonly plate: string;
  /** The plate entry; null for a figure that no run has published. */
  readonly entry: number | null;
  readonly drawn: number;
  readonly output: string;
}

export type Value = string | number | null;

export interface IndexedLine {
  readonly entry: Entry;
  readonly digest: string;
  /** Bytes, without the line feed. */
  readonly length: number;
}

export interface Index {
  extent(): Extent;
  /** Adds entries that follow the extent. All or nothing. */
  add(lines: Iterable<IndexedLine>): void;
  /** Forgets everything that is derived, and adds entries from the first. All or nothing. */
  rebuild(book: string, lines: Iterable<IndexedLine>): void;
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
  const statements = new Map<string, StatementSync>();
  const prepare = (sql: string) => {
    const statement = statements.get(sql) ?? database.prepare(sql);
    statements.set(sql, statement);
    return statement;
  };

  const index: Index = {
    extent: () => prepare('SELECT book, entries, bytes, last FROM extent').get() as unknown as Extent,
    add(lines) {
      transact(database, () => addLines(prepare, index.extent(), lines));
    },
    rebuild(name, lines) {
      transact(database, () => {
        makeTables(database, name);
        addLines(prepare, index.extent(), lines);
      });
    },
    all: (sql, ...values) => prepare(sql).all(...values) as never,
    get: (sql, ...values) => prepare(sql).get(...values) as never,
    remember(at, stamp, digest, bytes) {
      prepare('INSERT OR REPLACE INTO remembered VALUES (?, ?, ?, ?)').run(at, stamp, digest, bytes);
    },
    close: () => database.close(),
  };
  try {
    database.exec('PRAGMA journal_mode = WAL; PRAGMA synchronous = NORMAL');
    if (!isCurrent(database)) index.rebuild(book, []);
    return index;
  } catch (error) {
    database.close();
    throw error;
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

function makeTables(database: DatabaseSync, book: string): void {
  for (const table of [...TABLES, 'extent']) database.exec(`DROP TABLE IF EXISTS ${table}`);
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

function addLines(
  prepare: (sql: string) => StatementSync,
  extent: Extent,
  lines: Iterable<IndexedLine>,
): void {
  let { entries, bytes, last } = extent;
  for (const { entry, digest, length } of lines) {
    if (entry.number !== entries + 1 || entry.before !== last) {
      // Another process added it in the meantime.
      if (entry.number <= entries) continue;
      throw new Error(`the index was offered entry ${entry.number} after ${entries}`);
    }
    addEntry(prepare, entry, digest, bytes, length);
    entries += 1;
    bytes += length + 1;
    last = digest;
  }
  prepare('UPDATE extent SET entries = ?, bytes = ?, last = ?').run(entries, bytes, last);
}

function addEntry(
  prepare: (sql: string) => StatementSync,
  entry: Entry,
  digest: string,
  position: number,
  length: number,
): void {
  const { number, type, time } = entry;
  const { name, kind, key, run } = columnsOf(entry);
  prepare('INSERT INTO entries VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?)').run(
    number,
    position,
    length,
    digest,
    type,
    time,
    name,
    kind,
    key,
    run,
  );
  const { files, entries } = referencesOf(entry);
  const file = prepare('INSERT INTO files VALUES (?, ?, ?, ?, ?)');
  for (const { digest, bytes, role, name } of files) file.run(digest, bytes, role, name, number);
  const link = prepare('INSERT INTO links VALUES (?, ?)');
  for (const target of new Set(entries.map((named) => named.number))) link.run(number, target);
  addNames(prepare, entry, digest);
}

/** Plates and published numbers. A figure has its plate number from the moment it is drawn. */
function addNames(prepare: (sql: string) => StatementSync, entry: Entry, digest: string): void {
  const plate = prepare('INSERT INTO plates VALUES (?, ?, ?, ?)');
  if (entry.type === 'stage') {
    for (const [output, text] of plateNumbersOf(entry.number, digest, entry.outputs)) {
      plate.run(text, null, entry.number, output);
    }
  }
  if (entry.type === 'plate') plate.run(entry.plate, entry.number, entry.drawn, entry.output);
  if (entry.type === 'run') {
    const number = prepare('INSERT INTO numbers VALUES (?, ?, ?)');
    for (const [place, { name }] of entry.numbers.entries()) number.run(name, entry.run, place);
  }
}

function columnsOf(entry: Entry): {
  name: string | null;
  kind: string | null;
  key: string | null;
  run: number | null;
} {
  const none = { name: null, kind: null, key: null, run: null };
  switch (entry.type) {
    case 'stage':
      return { ...none, name: entry.name, kind: entry.kind, key: entry.key };
    case 'failure':
      return { ...none, name: entry.name, kind: entry.kind };
    case 'run':
      return { ...none, name: entry.recipe.name, run: entry.run };
    case 'plate':
      return { ...none, name: entry.name };
    default:
      return none;
  }
}
