/** What depends on something: forward to every run, plate and published number. Nearest first, by the length of the
 *  shortest way from the subject; equally far, the older entry first.
 *
 *  Of an entry: what names it, as the origin of an input, the drawing of a plate, a stage of a run, and so on from
 *  these. Of a file: what read it, the plates of a figure, the published numbers in it, the runs of a recipe. */

import type { Book } from './book.ts';
import type { PlateEntry, RunEntry } from './entry.ts';
import type { Index } from './index.ts';
import type { Value } from './index-rows.ts';
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
  SELECT dependant, name, run, min(distance)
  FROM ${STARTS} CROSS JOIN entries ON number = dependant WHERE run IS NOT NULL GROUP BY dependant`;
/** Entry of the first run that depends on a plate. */
const PUBLISHER = '(SELECT min(dependant) FROM lineages WHERE ancestor = plates.entry)';
const RUN = 'SELECT run FROM entries WHERE number = ?';
const PLATES = `
  SELECT dependant, plates.name, ${PUBLISHER}, min(distance), plate
  FROM ${STARTS} CROSS JOIN plates ON plates.entry = dependant GROUP BY dependant`;
const NUMBERS = `
  SELECT numbers.entry, name, run, lineages.numbers, place
  FROM ${STARTS} CROSS JOIN numbers ON publisher = dependant WHERE lineages.numbers IS NOT NULL`;
/** Numbers that a run published, where the run itself is the subject. */
const OF_RUN = 'SELECT entry, name, run, place FROM numbers WHERE publisher = ?';
/** Numbers that are read from one output. */
const IN_OUTPUT = 'SELECT entry, name, run, place, publisher FROM numbers WHERE entry = ? AND output = ?';
const PLATES_OF = 'SELECT entry FROM plates WHERE drawn = ? AND output = ? AND entry IS NOT NULL';
/** Those of some entries that are runs or plates themselves. */
const RUNS_AMONG = `
  SELECT number, name, run FROM json_each(?) CROSS JOIN entries ON number = value WHERE run IS NOT NULL`;
const PLATES_AMONG = `
  SELECT plates.entry, plates.name, ${PUBLISHER}, plate FROM json_each(?) CROSS JOIN plates ON plates.entry = value`;

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
  const own = isOfRun ? index.lists(OF_RUN, subject.entry).map((row) => numberRow(row, 1)) : [];
  return inOrder([...own, ...dependants(index, entries, 0)]);
}

/** What reads a file is one step away; so is what it is to the book itself, a plate or a number in it. */
function ofFile(index: Index, { roles }: FileSubject): Reached[] {
  const outputs = roles.filter(({ role }) => role === 'output');
  const numbers = outputs.flatMap(({ entry, name }) => index.lists(IN_OUTPUT, entry, name));
  const readers = [
    ...roles.filter(({ role }) => role !== 'output' && role !== 'log').map(({ entry }) => entry),
    ...outputs.flatMap(({ entry, name }) =>
      index.lists(PLATES_OF, entry, name).map(([plate]) => plate as number),
    ),
  ];
  return inOrder([
    ...numbers.map((row) => numberRow(row, 1)),
    ...among(index, readers, 1),
    ...dependants(index, readers, 1),
    ...among(
      index,
      numbers.map((row) => row[4] as number),
      2,
    ),
  ]);
}

/** Runs, plates and numbers that depend on entries. @param base  how far the entries are from the subject */
function dependants(index: Index, entries: readonly number[], base: number): Row[] {
  const starts = JSON.stringify([...new Set(entries)]);
  const found: Row[] = [];
  const runs = new Map<Value, Value>();
  for (const [entry = null, name, run = null, distance] of index.lists(RUNS, starts)) {
    runs.set(entry, run);
    found.push(rowOf('run', entry, name, run, base + (distance as number)));
  }
  // The run that published a plate depends on what the plate depends on: it was found above.
  for (const [entry, name, publisher = null, distance, plate] of index.lists(PLATES, starts)) {
    const row = rowOf('plate', entry, name, runs.get(publisher) ?? null, base + (distance as number));
    found.push({ ...row, plate: plate as string });
  }
  for (const [entry, name, run, distances, place] of index.lists(NUMBERS, starts)) {
    const distance = (distances as string).split(',')[place as number] ?? '';
    if (distance !== '') found.push(numberRow([entry, name, run, place] as Value[], base + Number(distance)));
  }
  return found;
}

function among(index: Index, entries: readonly number[], distance: number): Row[] {
  const which = JSON.stringify([...new Set(entries)]);
  return [
    ...index.lists(RUNS_AMONG, which).map(([entry, name, run]) => rowOf('run', entry, name, run, distance)),
    ...index.lists(PLATES_AMONG, which).map(([entry, name, publisher = null, plate]) => ({
      ...rowOf('plate', entry, name, index.lists(RUN, publisher)[0]?.[0] ?? null, distance),
      plate: plate as string,
    })),
  ];
}

function rowOf(type: Reached['type'], entry?: Value, name?: Value, run?: Value, distance = 0): Row {
  return {
    entry: entry as number,
    type,
    name: name as string,
    run: run as number | null,
    distance,
    place: 0,
  };
}

/** @param columns  entry, name, run, place */
function numberRow([entry, name, run, place]: readonly Value[], distance: number): Row {
  return { ...rowOf('number', entry, name, run, distance), place: place as number };
}

/** Nearest first, each once. */
function inOrder(rows: Row[]): Reached[] {
  rows.sort(
    (a, b) =>
      a.distance - b.distance || a.entry - b.entry || (a.run ?? 0) - (b.run ?? 0) || a.place - b.place,
  );
  const entries = new Set<number>();
  const numbers = new Set<string>();
  const reached: Reached[] = [];
  for (const { entry, type, name, run, plate } of rows) {
    const key = type === 'number' ? `${run} ${name}` : '';
    if (type === 'number' ? numbers.has(key) : entries.has(entry)) continue;
    if (type === 'number') numbers.add(key);
    else entries.add(entry);
    reached.push(plate === undefined ? { entry, type, name, run } : { entry, type, name, run, plate });
  }
  return reached;
}
