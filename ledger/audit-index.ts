/** The part of an audit that holds the index against the ledger: a fresh one is made in memory, and every row of the
 *  one on disk must be the same. */

import { existsSync } from 'node:fs';
import { join } from 'node:path';
import type { DatabaseSync } from 'node:sqlite';
import type { LedgerLine, Problem } from './audit-ledger.ts';
import type { Entry } from './entry.ts';
import { type Index, isCurrent, openForAudit, openIndex, TABLES } from './index.ts';

/** @param blamed  entries already known as damaged: what the index says of them is no news */
export function auditIndex(
  directory: string,
  lines: readonly LedgerLine[],
  blamed: ReadonlySet<number>,
): { problems: Problem[]; remarks: string[] } {
  const path = join(directory, 'index.sqlite');
  const remark = (what: string) => ({
    problems: [],
    remarks: [`index.sqlite ${what}; it is made again when needed`],
  });
  if (!existsSync(path)) return remark('is missing');
  if (lines.some(({ entry }) => entry === null) || blamed.size > 0) {
    return { problems: [], remarks: ['index.sqlite was not compared: the ledger itself is damaged'] };
  }
  const fresh = openIndex(':memory:', '');
  try {
    fresh.rebuild(lines[0]?.entry?.book ?? '', indexed(lines));
    return compareFiles(path, fresh, lines.length) ?? remark('is of another version');
  } catch (error) {
    if (!('errcode' in (error as object))) throw error;
    return remark(`cannot be read (${(error as Error).message})`);
  } finally {
    fresh.close();
  }
}

function* indexed(lines: readonly LedgerLine[]) {
  for (const { entry, digest, length } of lines) yield { entry: entry as Entry, digest, length };
}

function compareFiles(
  path: string,
  fresh: Index,
  count: number,
): { problems: Problem[]; remarks: string[] } | null {
  const database = openForAudit(path);
  try {
    if (!isCurrent(database)) return null;
    // An index that is behind tells no lies; entries appended since the ledger was read are not in question.
    const extent = database.prepare('SELECT entries FROM extent').get() as { entries: number } | undefined;
    const reach = Math.min(count, extent?.entries ?? 0);
    const problems = new Map<number, Problem>();
    for (const table of TABLES) {
      for (const entry of differingEntries(database, fresh, table, reach)) {
        problems.set(entry, {
          entry,
          what: 'index.sqlite says something else of it than the ledger; remove index.sqlite, it is made again',
        });
      }
    }
    return { problems: [...problems.values()], remarks: [] };
  } finally {
    database.close();
  }
}

/** Which column of a table names the entry that a row is of. */
const ENTRY_OF: Readonly<Record<(typeof TABLES)[number], string>> = {
  entries: 'number',
  files: 'entry',
  links: 'source',
  plates: 'coalesce(entry, drawn)',
  numbers: '(SELECT number FROM entries WHERE entries.run = numbers.run)',
};

function differingEntries(
  database: DatabaseSync,
  fresh: Index,
  table: (typeof TABLES)[number],
  reach: number,
): number[] {
  const sql = `SELECT *, ${ENTRY_OF[table]} AS of_entry FROM ${table} ORDER BY rowid`;
  const have = byEntry(database.prepare(sql).all() as unknown as OfEntry[], reach);
  const want = byEntry(fresh.all<OfEntry>(sql), reach);
  return [...new Set([...have.keys(), ...want.keys()])].filter(
    (entry) => have.get(entry) !== want.get(entry),
  );
}

interface OfEntry {
  readonly of_entry: number | null;
}

/** Rows of the entries up to `reach`, as text; a row of no entry counts as the last's. */
function byEntry(rows: readonly OfEntry[], reach: number): Map<number, string> {
  const grouped = new Map<number, string>();
  for (const row of rows) {
    const entry = row.of_entry ?? reach;
    if (entry <= reach) grouped.set(entry, `${grouped.get(entry) ?? ''}${JSON.stringify(row)}\n`);
  }
  return grouped;
}
