/** Reading entries: the index says where a line lies and what its digest is, the ledger has the line. */

import { sha256 } from './digest.ts';
import type { Entry } from './entry.ts';
import type { Index, Row } from './index.ts';
import type { IndexKeeper } from './index-keeper.ts';
import { ledgerPath, readRange, withFile } from './ledger-file.ts';
import { ledgerDamaged, notFound } from './problem.ts';

/** Lines read at a time when many are visited. */
const PAGE = 200;
const COLUMNS = 'SELECT number, position, length, digest, type FROM entries';

/** The entry of a number.
 *  @throws LedgerProblem 'not-found', or 'ledger-damaged' when its line is not what was written. */
export function readEntry(directory: string, keeper: IndexKeeper, number: number): Entry {
  const path = ledgerPath(directory);
  const entry = withFile(path, (descriptor) => entryAt(descriptor, rowOf(keeper, number)));
  if (entry !== null) return entry;
  // Index and ledger disagree. If the ledger is whole it was the index, and a new one is right.
  keeper.rebuild();
  const again = withFile(path, (descriptor) => entryAt(descriptor, rowOf(keeper, number)));
  if (again === null) throw ledgerDamaged(path, number, 'the line is not the entry that was written');
  return again;
}

/** The digest of an entry's line. @throws LedgerProblem 'not-found'. */
export function digestOfEntry(keeper: IndexKeeper, number: number): string {
  return rowOf(keeper, number).digest;
}

/** Entries from a number on, as far as the ledger is sealed when each page is read. */
export function* visitEntries(directory: string, keeper: IndexKeeper, from: number): Generator<Entry> {
  for (let next = Math.max(1, from); ; ) {
    const rows = keeper.ask((index) =>
      index.all<Row>(`${COLUMNS} WHERE number >= ? ORDER BY number LIMIT ?`, next, PAGE),
    );
    if (rows.length === 0) return;
    const entries = withFile(ledgerPath(directory), (descriptor) =>
      rows.map((row) => entryAt(descriptor, row)),
    );
    for (const [i, entry] of entries.entries()) {
      yield entry ?? readEntry(directory, keeper, next + i);
    }
    next += rows.length;
  }
}

function rowOf(keeper: IndexKeeper, number: number): Row {
  const row = keeper.ask((index) =>
    Number.isSafeInteger(number) ? index.get<Row>(`${COLUMNS} WHERE number = ?`, number) : undefined,
  );
  if (row !== undefined) return row;
  const count = keeper.ask((index: Index) => index.extent().entries);
  const has =
    count === 0 ? 'The book has no entry yet' : `The book has entries 1 to ${count}, and no entry ${number}`;
  throw notFound(has, 'Look at its contents.');
}

/** Null when the line's digest is another than the index has. */
function entryAt(descriptor: number, { position, length, digest }: Row): Entry | null {
  const bytes = readRange(descriptor, position, length);
  return sha256(bytes) === digest ? JSON.parse(bytes.toString('utf8')) : null;
}
