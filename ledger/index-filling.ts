/** Filling the index with entries. Many rows go into one statement: a call costs more than a row. */

import type { StatementSync } from 'node:sqlite';
import type { Entry } from './entry.ts';
import type { Extent } from './index.ts';
import { LONGEST_VALUE, type Place, rowsOf, TABLES, type Value, valuesOf } from './index-rows.ts';
import { bundleWriter, IN_BUNDLE } from './link-bundles.ts';
import { ledgerDamaged } from './problem.ts';

/** Rows in a statement. Measured for files, microseconds a row: 1.7 one by one, 0.8 with 10, 1.3 with 50. */
const TOGETHER = 10;

export interface IndexedLine {
  readonly entry: Entry;
  readonly digest: string;
  /** Bytes, without the line feed. */
  readonly length: number;
}

const SETTINGS = TABLES[0].columns.indexOf('settings');

/** Another process has changed the index between a look at its extent and the turn to write to it. */
export class IndexMoved extends Error {
  override readonly name = 'IndexMoved';
}

export type Prepare = (sql: string) => StatementSync;

/** Adds entries that follow the extent, and moves it on. Only within a transaction.
 *  @throws IndexMoved for entries that do not follow; such as stand already are passed over */
export function addLines(prepare: Prepare, extent: Extent, lines: Iterable<IndexedLine>): void {
  let { entries, bytes, last } = extent;
  const tables = TABLES.map(({ name, columns }) => fillTable(prepare, name, columns.length));
  const settings = fillSettings(prepare);
  const bundles = bundleWriter(entries, begunBundle(prepare, entries), (bundle, links) =>
    prepare('INSERT OR REPLACE INTO bundles VALUES (?, ?)').run(bundle, links),
  );
  for (const { entry, digest, length } of lines) {
    if (entry.number !== entries + 1 || entry.before !== last) {
      // Another process added it in the meantime.
      if (entry.number <= entries) continue;
      throw new IndexMoved();
    }
    const { rows, links } = shapedRows(entry, { position: bytes, length, digest });
    for (const [i, table] of tables.entries()) table.add(rows[i] as Value[][]);
    settings.add(entry, rows[0]?.[0]?.[SETTINGS] as number | null);
    bundles.add(links);
    entries += 1;
    bytes += length + 1;
    last = digest;
  }
  for (const table of tables) table.finish();
  bundles.end();
  prepare('UPDATE extent SET entries = ?, bytes = ?, last = ?').run(entries, bytes, last);
}

function shapedRows(entry: Entry, place: Place): ReturnType<typeof rowsOf> {
  try {
    return rowsOf(entry, place);
  } catch (cause) {
    const what = `a ${entry.type} of another shape (${(cause as Error).message})`;
    throw ledgerDamaged('ledger.jsonl', entry.number, what);
  }
}

function begunBundle(prepare: Prepare, entries: number): Uint8Array | null {
  if (entries % IN_BUNDLE === 0) return null;
  const bundle = Math.floor(entries / IN_BUNDLE);
  const row = prepare('SELECT links FROM bundles WHERE bundle = ?').get(bundle);
  return (row as { links: Uint8Array } | undefined)?.links ?? null;
}

function fillTable(prepare: Prepare, name: string, columns: number) {
  const row = `(${Array(columns).fill('?').join()})`;
  const insert = (rows: number) => `INSERT INTO ${name} VALUES ${Array(rows).fill(row).join()}`;
  const [one, many] = [insert(1), insert(TOGETHER)];
  let waiting: Value[] = [];
  return {
    add(rows: readonly Value[][]): void {
      for (const values of rows) {
        for (const value of values) waiting.push(value);
        if (waiting.length < TOGETHER * columns) continue;
        prepare(many).run(...waiting);
        waiting = [];
      }
    },
    finish(): void {
      for (let at = 0; at < waiting.length; at += columns)
        prepare(one).run(...waiting.slice(at, at + columns));
      waiting = [];
    },
  };
}

const HAS_SETTING = 'SELECT 1 FROM settings WHERE name = ? AND value = ? AND settings = ?';
const ADD_SETTING = 'INSERT OR IGNORE INTO settings VALUES (?, ?, ?)';

function fillSettings(prepare: Prepare) {
  const met = new Set<number>();
  return {
    add(entry: Entry, settings: number | null): void {
      if (settings === null || met.has(settings)) return;
      met.add(settings);
      for (const [i, [name, value]] of valuesOf(entry).entries()) {
        const row = [name, value.slice(0, LONGEST_VALUE), settings] as const;
        // All values of a set come at once: where the first stands, so do the others.
        if (i === 0 && prepare(HAS_SETTING).get(...row) !== undefined) return;
        prepare(ADD_SETTING).run(...row);
      }
    },
  };
}
