/** Questions to the index that the runner asks: which plate entry stands, which run holds a stage. */

import type { Book } from './book.ts';
import type { PlateEntry, RunEntry } from './entry.ts';
import { runsNaming } from './link-bundles.ts';
import { withdrawalsOf } from './withdrawal.ts';

const PLATES = 'SELECT entry FROM plates WHERE plate = ? ORDER BY entry DESC';

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
  const newest = book.ask((index) => [...runsNaming(index, stage)].at(-1));
  return newest === undefined ? undefined : (book.entry(newest) as RunEntry);
}
