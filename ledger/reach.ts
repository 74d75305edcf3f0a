/** What depends on something: forward to every run, plate and published number. Nearest first, by the length of the
 *  shortest way from the subject; equally far, the older entry first.
 *
 *  Of an entry: what names it, as the origin of an input, the drawing of a plate, a stage of a run, and so on from
 *  these. Of a file: what read it, the plates of a figure, the published numbers in it, the runs of a recipe. */

import type { Book } from './book.ts';
import type { PlateEntry, RunEntry } from './entry.ts';
import type { Index } from './index.ts';
import { type Dependant, dependantsOf } from './link-bundles.ts';
import type { FileSubject, Subject } from './subject.ts';

export interface Reached {
  /** The run's entry, the plate's, or the one that holds the number. */
  readonly entry: number;
  readonly type: 'run' | 'plate' | 'number';
  /** Of the recipe, of the figure as published, of the number. */
  readonly name: string;
  /** The run itself, the first that published the plate, or the one that published the number; null for a plate that
   *  no run has published. */
  readonly run: number | null;
  /** A plate's number. */
  readonly plate?: string;
}

export interface ReachDocument {
  readonly subject: Subject;
  readonly reached: readonly Reached[];
  /** How many there are of each type, also where not all are listed. */
  readonly counts: ReachCounts;
}

export interface ReachCounts {
  readonly runs: number;
  readonly plates: number;
  readonly numbers: number;
}

/** Published numbers that are read from one output. */
const IN_OUTPUT = 'SELECT publisher, place FROM numbers WHERE entry = ? AND output = ?';
const PLATES_OF = 'SELECT entry FROM plates WHERE drawn = ? AND output = ?';
const RUNS = `
  SELECT number AS entry, name, run FROM json_each(?) CROSS JOIN entries ON number = value WHERE run IS NOT NULL`;
const PLATES = 'SELECT entry, name, plate FROM json_each(?) CROSS JOIN plates ON entry = value';
const NUMBERS = 'SELECT publisher, place, name FROM json_each(?) CROSS JOIN numbers ON publisher = value';

/** What depends on a subject.
 *  @param most  how many are listed at most, the nearest; default all of them
 *  Cost: one pass over the links behind the subject, and a look at the index for each that is listed. */
export function reach(book: Book, subject: Subject, most = Number.POSITIVE_INFINITY): ReachDocument {
  return book.ask((index) => {
    const found = subject.type === 'file' ? ofFile(index, subject) : ofEntries(index, subject);
    const count = (type: Dependant['type']) => found.filter((each) => each.type === type).length;
    const counts = { runs: count('run'), plates: count('plate'), numbers: count('number') };
    return { subject, reached: named(index, found.slice(0, most)), counts };
  });
}

/** What a run publishes of what is reached: plates, then numbers. @param isReached  by number of the entry */
export function reachedInRun(
  { run, number: own, plates, numbers }: RunEntry,
  isReached: (entry: number) => boolean,
): Reached[] {
  return [
    ...plates
      .filter(({ entry }) => isReached(entry))
      .map(({ entry, name, plate }) => ({ entry, type: 'plate' as const, name, run, plate })),
    ...numbers
      .filter(({ entry }) => isReached(own) || isReached(entry))
      .map(({ entry, name }) => ({ entry, type: 'number' as const, name, run })),
  ];
}

/** A plate, as something reached. */
export function reachedPlate({ number, name, plate }: PlateEntry): Reached {
  return { entry: number, type: 'plate', name, run: null, plate };
}

function ofEntries(index: Index, { entries, ...subject }: Subject): Dependant[] {
  const isOfRun = subject.type === 'run' || subject.type === 'entry';
  const own = new Map(isOfRun ? [[subject.entry, 'all' as const]] : []);
  return dependantsOf(index, new Map(entries.map((entry) => [entry, 0])), own);
}

/** What reads a file is one step away; so is what it is to the book itself, a plate or a number in it. */
function ofFile(index: Index, { roles }: FileSubject): Dependant[] {
  const outputs = roles.filter(({ role }) => role === 'output');
  const readers = [
    ...roles.filter(({ role }) => role !== 'output' && role !== 'log').map(({ entry }) => entry),
    ...outputs.flatMap(({ entry, name }) =>
      index.all<{ entry: number }>(PLATES_OF, entry, name).map((plate) => plate.entry),
    ),
  ];
  const numbers = new Map<number, Set<number>>();
  for (const { entry, name } of outputs) {
    for (const { publisher, place } of index.all<{ publisher: number; place: number }>(
      IN_OUTPUT,
      entry,
      name,
    ))
      numbers.set(publisher, (numbers.get(publisher) ?? new Set()).add(place));
  }
  const starts = new Map([
    ...[...numbers.keys()].map((publisher) => [publisher, 2] as const),
    ...readers.map((reader) => [reader, 1] as const),
  ]);
  return dependantsOf(index, starts, numbers);
}

/** Puts the names to what was found. */
function named(index: Index, found: readonly Dependant[]): Reached[] {
  const rowsFor = <T>(sql: string, entries: Iterable<number | null>) =>
    index.all<T>(sql, JSON.stringify([...new Set(entries)].filter((entry) => entry !== null)));
  const ofType = (type: Dependant['type']) => found.filter((each) => each.type === type);
  const runs = new Map(
    rowsFor<{ entry: number; name: string; run: number }>(
      RUNS,
      found.map(({ publisher }) => publisher),
    ).map((row) => [row.entry, row]),
  );
  const plates = new Map(
    rowsFor<{ entry: number; name: string; plate: string }>(
      PLATES,
      ofType('plate').map(({ entry }) => entry),
    ).map((row) => [row.entry, row]),
  );
  const numbers = new Map<number, string[]>();
  for (const { publisher, place, name } of rowsFor<{ publisher: number; place: number; name: string }>(
    NUMBERS,
    ofType('number').map(({ publisher }) => publisher),
  )) {
    const names = numbers.get(publisher) ?? [];
    names[place] = name;
    numbers.set(publisher, names);
  }
  return found.map(({ type, entry, publisher, place }): Reached => {
    const publishing = runs.get(publisher ?? 0);
    const run = publishing?.run ?? null;
    if (type === 'run') return { entry, type, name: publishing?.name ?? '', run };
    if (type === 'number') return { entry, type, name: numbers.get(publisher ?? 0)?.[place] ?? '', run };
    const plate = plates.get(entry);
    return { entry, type, name: plate?.name ?? '', run, plate: plate?.plate ?? '' };
  });
}
