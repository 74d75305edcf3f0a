/** The part of an audit that holds the index against the ledger: for each entry, the rows that it must have and those
 *  that it has, side by side in the order of entries. */

import { existsSync } from 'node:fs';
import { join } from 'node:path';
import type { DatabaseSync } from 'node:sqlite';
import type { LedgerLine, Problem } from './audit-ledger.ts';
import { isCurrent, openForAudit } from './index.ts';
import { LONGEST_VALUE, rowsOf, settingsOf, TABLES, type Table, valuesOf } from './index-rows.ts';
import { bundleWriter, IN_BUNDLE } from './link-bundles.ts';

const LIES = 'index.sqlite says something else of it than the ledger; remove index.sqlite, it is made again';

export interface IndexAudit {
  /** Takes the next line; lines come in order, and must all be entries. */
  visit(line: LedgerLine): void;
  /** What was found, and remarks. Closes the index. */
  finish(): { problems: Problem[]; remarks: string[] };
}

/** Begins to audit the index of a book. What cannot be read is worth a remark: an index can be made again. */
export function auditIndex(directory: string): IndexAudit {
  const path = join(directory, 'index.sqlite');
  if (!existsSync(path)) return remarking('is missing');
  try {
    const database = openForAudit(path);
    if (isCurrent(database)) return auditing(database);
    database.close();
    return remarking('is of another version');
  } catch (error) {
    if (!isOfDatabase(error)) throw error;
    return remarking(`cannot be read (${(error as Error).message})`);
  }
}

function remarking(what: string): IndexAudit {
  const found = { problems: [], remarks: [`index.sqlite ${what}; it is made again when needed`] };
  return { visit: () => {}, finish: () => found };
}

function auditing(database: DatabaseSync): IndexAudit {
  // An index that is behind tells no lies; entries appended since the ledger was read are not in question.
  const extent = database.prepare('SELECT entries FROM extent').get() as { entries: number } | undefined;
  const reach = extent?.entries ?? 0;
  const blamed = new Set<number>();
  const cursors = TABLES.map((table) => cursorOf(database, table, reach, blamed));
  const hasSetting = database.prepare('SELECT 1 FROM settings WHERE name = ? AND value = ? AND settings = ?');
  const known = new Set<number>();
  const bundles = bundlesOf(database, blamed);
  let count = 0;
  let broken: string | null = null;

  const compare = ({ entry, number, offset, digest, length }: LedgerLine) => {
    if (entry === null || number > reach) return;
    // Where a line was left out, the ledger is damaged, and what is found here does not count.
    if (number !== count + 1) return;
    count = number;
    const { rows, links } = rowsOf(entry, { position: offset, length, digest });
    for (const [i, expected] of rows.entries()) cursors[i]?.compare(number, expected);
    bundles.compare(links);
    const settings = settingsOf(entry);
    if (settings === null || known.has(settings)) return;
    known.add(settings);
    const stand = valuesOf(entry).every(
      ([name, value]) => hasSetting.get(name, value.slice(0, LONGEST_VALUE), settings) !== undefined,
    );
    if (!stand) blamed.add(number);
  };
  const guarded = (work: () => void) => {
    if (broken !== null) return;
    try {
      work();
    } catch (error) {
      if (!isOfDatabase(error)) throw error;
      broken = (error as Error).message;
    }
  };
  return {
    visit: (line) => guarded(() => compare(line)),
    finish() {
      guarded(() => {
        for (const cursor of cursors) cursor.rest(Math.min(count, reach));
        bundles.rest(count);
      });
      database.close();
      if (broken !== null) return remarking(`cannot be read (${broken})`).finish();
      const problems = [...blamed].map((entry): Problem => ({ entry, what: LIES, beside: true }));
      return { problems, remarks: [] };
    },
  };
}

/** Goes through a table in the order in which an honest one was written. */
function cursorOf(
  database: DatabaseSync,
  { name, columns, entry, order }: Table,
  reach: number,
  blamed: Set<number>,
) {
  const sql = `SELECT ${entry} AS of_entry, ${columns.join(', ')} FROM ${name} ORDER BY ${order}`;
  const statement = database.prepare(sql);
  statement.setReturnArrays(true);
  const rows = statement.iterate() as unknown as Iterator<unknown[]>;
  let row: unknown[] | null = null;
  const advance = () => {
    const next = rows.next();
    row = next.done === true ? null : next.value;
  };
  const numberOf = (of: unknown[]) => (typeof of[0] === 'number' ? of[0] : reach);
  advance();
  return {
    /** Takes the rows of an entry. Rows of an earlier one are out of place. */
    compare(number: number, expected: readonly (readonly unknown[])[]): void {
      let found = 0;
      let same = true;
      for (; row !== null && numberOf(row) <= number; advance()) {
        if (numberOf(row) < number) blamed.add(numberOf(row));
        else {
          const wanted = expected[found];
          same &&= wanted !== undefined && row.slice(1).every((value, i) => value === wanted[i]);
          found += 1;
        }
      }
      if (!same || found !== expected.length) blamed.add(number);
    },
    /** Takes what is left, which nothing in the ledger stands behind. */
    rest(last: number): void {
      for (; row !== null; advance()) if (numberOf(row) <= last) blamed.add(numberOf(row));
    },
  };
}

/** Holds each bundle against the links of its entries, when all of them have come. */
function bundlesOf(database: DatabaseSync, blamed: Set<number>) {
  const statement = database.prepare('SELECT links FROM bundles WHERE bundle = ?');
  const compare = (bundle: number, links: Uint8Array) => {
    const row = statement.get(bundle) as { links: Uint8Array } | undefined;
    // Entries that were appended meanwhile stand behind those in question.
    if (row === undefined || !Buffer.from(links).equals(row.links.subarray(0, links.length)))
      blamed.add(bundle * IN_BUNDLE + 1);
  };
  const writer = bundleWriter(0, null, compare);
  return {
    compare: (links: readonly number[]) => writer.add(links),
    /** Takes the last bundle, and what is left. */
    rest(count: number): void {
      if (count % IN_BUNDLE !== 0) writer.end();
      const { entries } = database.prepare('SELECT entries FROM extent').get() as { entries: number };
      const beyond = 'SELECT count(*) AS count FROM bundles WHERE bundle * ? >= ?';
      const { count: extra } = database.prepare(beyond).get(IN_BUNDLE, count) as { count: number };
      if (entries === count && extra > 0) blamed.add(count);
    },
  };
}

function isOfDatabase(error: unknown): boolean {
  return typeof error === 'object' && error !== null && 'errcode' in error;
}
