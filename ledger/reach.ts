/** What depends on something: forward to every run, plate and published number. Nearest first, by the length of the
 *  shortest way from the subject; equally far, the older entry first.
 *
 *  Of an entry: what names it, as the origin of an input, the drawing of a plate, a stage of a run, and so on from
 *  these. Of a file: what read it, the plates of a figure, the published numbers in it, the runs of a recipe. */

import type { Book } from './book.ts';
import type { PlateEntry, RunEntry } from './entry.ts';
import type { Index } from './index.ts';
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
}

interface Row extends Reached {
  readonly distance: number;
  readonly place: number;
}

const STARTS = 'json_each(?) CROSS JOIN lineages ON ancestor = value';
const RUNS = `
  SELECT dependant AS entry, 'run' AS type, name, run, min(distance) AS distance, 0 AS place
  FROM ${STARTS} CROSS JOIN entries ON number = dependant WHERE run IS NOT NULL GROUP BY dependant`;
const PLATES = `
  SELECT dependant AS entry, 'plate' AS type, plates.name, plate, min(distance) AS distance, 0 AS place
  FROM ${STARTS} CROSS JOIN plates ON plates.entry = dependant GROUP BY dependant`;
const RUN_OF_PLATE = `
  SELECT min(run) AS run FROM links CROSS JOIN entries ON number = source WHERE target = ?`;
const NUMBERS = `
  SELECT numbers.entry, 'number' AS type, name, run, lineages.numbers AS distances, place
  FROM ${STARTS} CROSS JOIN numbers ON publisher = dependant WHERE lineages.numbers IS NOT NULL`;
/** Numbers that a run published, where the run itself is the subject. */
const OF_RUN = `
  SELECT entry, 'number' AS type, name, run, 1 AS distance, place FROM numbers WHERE publisher = ?`;
/** Numbers that are read from one output. */
const IN_OUTPUT = `
  SELECT entry, 'number' AS type, name, run, publisher, 1 AS distance, place
  FROM numbers WHERE entry = ? AND output = ?`;
const PLATES_OF = 'SELECT entry FROM plates WHERE drawn = ? AND output = ? AND entry IS NOT NULL';
const ITSELF = `
  SELECT entries.number AS entry, type, name, run, NULL AS plate FROM entries WHERE number = ? AND run IS NOT NULL
  UNION ALL SELECT entry, 'plate', name, NULL, plate FROM plates WHERE entry = ?`;

/** What depends on a subject. Cost: a few looks at the index for each thing that is reached, none for what lies between;
 *  the ledger is not read. */
export function reach(book: Book, subject: Subject): ReachDocument {
  return {
    subject,
    reached: book.ask((index) =>
      subject.type === 'file' ? ofFile(index, subject) : ofEntries(index, subject),
    ),
  };
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

function ofEntries(index: Index, { entries, ...subject }: Subject): Reached[] {
  const isOfRun = subject.type === 'run' || subject.type === 'entry';
  const own = isOfRun ? index.all<Row>(OF_RUN, subject.entry) : [];
  return inOrder(index, [...own, ...dependants(index, entries, 0)]);
}

/** What reads a file is one step away; so is what it is to the book itself, a plate or a number in it. */
function ofFile(index: Index, { roles }: FileSubject): Reached[] {
  const outputs = roles.filter(({ role }) => role === 'output');
  const numbers = outputs.flatMap(({ entry, name }) =>
    index.all<Row & { publisher: number }>(IN_OUTPUT, entry, name),
  );
  const readers = [
    ...roles.filter(({ role }) => role !== 'output' && role !== 'log').map(({ entry }) => entry),
    ...outputs.flatMap(({ entry, name }) =>
      index.all<{ entry: number }>(PLATES_OF, entry, name).map((plate) => plate.entry),
    ),
  ];
  const publishers = numbers.map(({ publisher }) => publisher);
  return inOrder(index, [
    ...numbers,
    ...itself(index, readers, 1),
    ...dependants(index, readers, 1),
    ...itself(index, publishers, 2),
  ]);
}

/** Runs, plates and numbers that depend on entries. @param base  how far the entries are from the subject */
function dependants(index: Index, entries: readonly number[], base: number): Row[] {
  const starts = JSON.stringify([...new Set(entries)]);
  const rows = [RUNS, PLATES].flatMap((sql) => index.all<Row>(sql, starts));
  const numbers = index.all<Row & { distances: string }>(NUMBERS, starts).flatMap((row) => {
    const distance = row.distances.split(',')[row.place] ?? '';
    return distance === '' ? [] : [{ ...row, distance: Number(distance) }];
  });
  return [...rows, ...numbers].map((row) => ({ ...row, distance: row.distance + base }));
}

/** Those of the entries that are runs or plates. */
function itself(index: Index, entries: readonly number[], distance: number): Row[] {
  return [...new Set(entries)].flatMap((entry) =>
    index.all<Row>(ITSELF, entry, entry).map((row) => ({ ...row, distance, place: 0 })),
  );
}

/** Nearest first, each once, with the run of each plate. */
function inOrder(index: Index, rows: Row[]): Reached[] {
  rows.sort(
    (a, b) =>
      a.distance - b.distance || a.entry - b.entry || (a.run ?? 0) - (b.run ?? 0) || a.place - b.place,
  );
  const seen = new Set<string>();
  return rows.flatMap(({ entry, type, name, run, plate }): Reached[] => {
    const key = type === 'number' ? `${name} ${run}` : entry;
    if (seen.has(`${key}`)) return [];
    seen.add(`${key}`);
    if (type !== 'plate') return [{ entry, type, name, run }];
    const publisher = index.get<{ run: number | null }>(RUN_OF_PLATE, entry)?.run ?? null;
    return [{ entry, type, name, run: publisher, plate: plate ?? '' }];
  });
}
