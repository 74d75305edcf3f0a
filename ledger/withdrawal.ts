/** What is withdrawn, and what depends on it. A withdrawal that is itself withdrawn does not count.
 *
 *  What depends on an entry: entries that name it as the origin of an input, as the drawing of a plate, as a stage or a
 *  plate of a run, and so on from these. Withdrawing a run says that the run and the numbers it published do not stand;
 *  its stages may belong to other runs, and stand until they are withdrawn themselves. A plate stands as long as one of
 *  the runs that published it does. */

import type { Book } from './book.ts';
import type { WithdrawalEntry } from './entry.ts';
import type { Index } from './index.ts';
import { runsNaming, upstreamOf } from './link-bundles.ts';

const ANY = 'SELECT 1 FROM withdrawals LIMIT 1';
const OF = 'SELECT entry FROM withdrawals WHERE withdraws = ? ORDER BY entry';
/** Withdrawals and countersignatures name an entry without depending on it. */
const BESIDE = "SELECT type IN ('withdrawal', 'countersignature') AS beside FROM entries WHERE number = ?";
const PLATE = "SELECT 1 FROM entries WHERE number = ? AND type = 'plate'";
const OF_RUNS = `
  SELECT 1 FROM withdrawals JOIN entries ON entries.number = withdrawals.withdraws WHERE entries.type = 'run' LIMIT 1`;

/** The withdrawals that stand of an entry and of everything that it depends on, nearest first; the entry's own come
 *  first of all, those of the runs that published a plate last. Cost: none in a book without withdrawals, else one look
 *  at the index for each entry of the lineage. */
export function withdrawnUpstream(book: Book, entry: number): WithdrawalEntry[] {
  return withdrawalsUpstream(book, entry).map((number) => book.entry(number) as WithdrawalEntry);
}

/** The numbers of these withdrawals. */
export function withdrawalsUpstream(book: Book, entry: number): number[] {
  return book.ask((index) => {
    if (index.get(ANY) === undefined) return [];
    if (index.get<{ beside: number }>(BESIDE, entry)?.beside === 1) return standingOf(index, entry);
    const upstream = upstreamOf(index, [entry]).flatMap((number) => standingOf(index, number));
    return [...new Set([...upstream, ...ofPublishers(index, entry)])];
  });
}

/** The withdrawals of the runs that published a plate; none while one of these runs stands. Cost: none in a book without
 *  withdrawn runs; else it reads on from the plate to the first run that stands. */
function ofPublishers(index: Index, plate: number): number[] {
  if (index.get(OF_RUNS) === undefined || index.get(PLATE, plate) === undefined) return [];
  const found: number[] = [];
  for (const run of runsNaming(index, plate)) {
    const withdrawals = standingOf(index, run);
    if (withdrawals.length === 0) return [];
    found.push(...withdrawals);
  }
  return found;
}

/** The numbers of the withdrawals that stand of one entry, whatever it depends on. */
export function withdrawalsOf(book: Book, entry: number): number[] {
  return book.ask((index) => standingOf(index, entry));
}

/** The same of a published number: its run's own, then those upstream of the entry that holds it. */
export function withdrawalsOfNumber(book: Book, run: number, entry: number): number[] {
  return [...new Set([...withdrawalsOf(book, run), ...withdrawalsUpstream(book, entry)])];
}

/** The withdrawals of one entry that stand, in order. */
function standingOf(index: Index, entry: number): number[] {
  return index
    .all<{ entry: number }>(OF, entry)
    .map((row) => row.entry)
    .filter((withdrawal) => standingOf(index, withdrawal).length === 0);
}
