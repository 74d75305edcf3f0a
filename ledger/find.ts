/** Questions to the index that the runner asks: which plate entry stands, which run holds a stage. */

import type { Book } from './book.ts';
import type { PlateEntry, RunEntry } from './entry.ts';
import { withdrawalsOf } from './withdrawal.ts';

const PLATES = 'SELECT entry FROM plates WHERE plate = ? ORDER BY entry DESC';
const RUNS =
  "SELECT source FROM links JOIN entries ON number = source WHERE target = ? AND type = 'run' ORDER BY source DESC";

/** The newest plate entry of this number, name and mark whose files stand in the store and that is not withdrawn. */
export function findPlate(
  book: Book,
  wanted: { readonly plate: string; readonly name: string; readonly mark: string | null },
): PlateEntry | undefined {
  for (const { entry } of book.ask((index) => index.all<{ entry: number }>(PLATES, wanted.plate))) {
    const plate = book.entry(entry) as PlateEntry;
    const same = plate.name === wanted.name && plate.mark === wanted.mark;
    if (withdrawalsOf(book, entry).length > 0) continue;
    if (same && book.store.has(plate.stamped.svg) && book.store.has(plate.stamped.png)) return plate;
  }
  return undefined;
}

/** The newest run that holds a stage's entry. */
export function findRunOfStage(book: Book, stage: number): RunEntry | undefined {
  const row = book.ask((index) => index.get<{ source: number }>(RUNS, stage));
  return row === undefined ? undefined : (book.entry(row.source) as RunEntry);
}
