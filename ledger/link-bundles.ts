/** Bundles: what each entry names, in one piece for 256 entries, so that all that depends on something is found in one
 *  pass over memory instead of a look at the index for each step. Part of the index, derived like the rest of it.
 *
 *  An entry names earlier entries only. So going through the entries in order, everything that one names is settled
 *  before the entry itself is: one pass finds what depends on the starts, and the length of the shortest way.
 *
 *  A bundle is a list of numbers of 32 bits in this machine's order of bytes. Of each entry: 4 n + what it is, the n
 *  entries that it names; of a run then the count of its published numbers and the entry that holds each. */

import type { Entry } from './entry.ts';
import type { Index } from './index.ts';

/** Entries in a bundle. Each append writes the last bundle anew: some 4 kB. */
export const IN_BUNDLE = 256;
/** Bundles in memory at a time while they are gone through. */
const AT_ONCE = 500;
/** The same, where they are gone through backwards and few may do. */
const BACK_AT_ONCE = 50;
const BUNDLES = 'SELECT bundle, links FROM bundles WHERE bundle >= ? AND bundle < ? ORDER BY bundle';

const NO_WORDS = new Uint32Array(0);

const OTHER = 0;
const RUN = 1;
const PLATE = 2;

/** Something that depends on the starts. */
export interface Dependant {
  readonly type: 'run' | 'plate' | 'number';
  /** Steps on the shortest way. */
  readonly distance: number;
  /** The run, the plate, or the entry that holds the number. */
  readonly entry: number;
  /** The entry of the run that published the number, or was the first to publish the plate; of a run itself. Null for a
   *  plate without. */
  publisher: number | null;
  /** Of a number, its place among those of the run, from 0. */
  readonly place: number;
}

/** What a bundle holds of an entry. @param targets  the entries that it names, each once */
export function linksOf(entry: Entry, targets: readonly number[]): number[] {
  const what = entry.type === 'run' ? RUN : entry.type === 'plate' ? PLATE : OTHER;
  const links = [4 * targets.length + what, ...targets];
  if (entry.type === 'run') links.push(entry.numbers.length, ...entry.numbers.map((number) => number.entry));
  return links;
}

/** Gathers the links of consecutive entries.
 *  @param entries  how many entries came before
 *  @param begun  the bundle that these have begun, if it is not whole
 *  @param write  takes a bundle that is whole, or the last */
export function bundleWriter(
  entries: number,
  begun: Uint8Array | null,
  write: (bundle: number, links: Uint8Array) => void,
) {
  let count = entries;
  let links: number[] = begun === null ? [] : [...wordsOf(begun)];
  const end = () => {
    if (links.length > 0)
      write(Math.floor((count - 1) / IN_BUNDLE), new Uint8Array(Uint32Array.from(links).buffer));
  };
  return {
    add(more: readonly number[]): void {
      for (const link of more) links.push(link);
      count += 1;
      if (count % IN_BUNDLE !== 0) return;
      end();
      links = [];
    },
    /** Writes what is not whole yet. */
    end,
  };
}

/** Everything that depends on some entries, those among them included that are runs or plates and at least one step away.
 *  @param starts  by number of the entry, how far it is from the subject
 *  @param near    published numbers that are one step away: by run's entry their places, or all of that run's
 *  @returns nearest first; equally far, the older entry first, then the older run
 *  Cost: reads the bundles from the first start to the end; 10 ms and 6 MB for a million entries, and 4 bytes for each. */
export function dependantsOf(
  index: Index,
  starts: ReadonlyMap<number, number>,
  near: ReadonlyMap<number, ReadonlySet<number> | 'all'>,
): Dependant[] {
  const count = index.extent().entries;
  // One more than the distance; 0 where there is no way.
  const steps = new Uint32Array(count + 1);
  for (const [number, distance] of starts) steps[number] = distance + 1;
  let first = count;
  for (const number of [...starts.keys(), ...near.keys()]) first = Math.min(first, number);
  const found: Dependant[] = [];
  const plates = new Map<number, Dependant>();

  const takeRun = (number: number, step: number, words: Uint32Array, at: number, end: number) => {
    if (step > 1) found.push({ type: 'run', distance: step - 1, entry: number, publisher: number, place: 0 });
    for (let i = at; i < end && plates.size > 0; i += 1) {
      const plate = plates.get(words[i] as number);
      if (plate !== undefined) plate.publisher ??= number;
    }
    const close = near.get(number);
    const numbers = words[end] as number;
    for (let place = 0; place < numbers; place += 1) {
      const holder = words[end + 1 + place] as number;
      const isNear = close === 'all' || close?.has(place) === true;
      const distance = isNear ? 1 : (steps[holder] as number);
      if (distance > 0) found.push({ type: 'number', distance, entry: holder, publisher: number, place });
    }
  };

  for (const { bundle, links } of bundlesFrom(index, bundleOf(first))) {
    const words = wordsOf(links);
    let number = bundle * IN_BUNDLE + 1;
    for (let at = 0; at < words.length; number += 1) {
      const head = words[at] as number;
      const end = at + 1 + (head >>> 2);
      const step = settle(steps, number, words, at + 1, end);
      const what = head & 3;
      if (what === RUN && (step > 0 || near.size > 0)) takeRun(number, step, words, at + 1, end);
      if (what === PLATE && step > 1) {
        const plate: Dependant = {
          type: 'plate',
          distance: step - 1,
          entry: number,
          publisher: null,
          place: 0,
        };
        plates.set(number, plate);
        found.push(plate);
      }
      at = what === RUN ? end + 1 + (words[end] as number) : end;
    }
  }
  // What was found first is the older run, and stays before what is otherwise equal.
  return found.sort((a, b) => a.distance - b.distance || a.entry - b.entry);
}

/** Puts down how many steps an entry is away, one more than the nearest of those that it names. */
function settle(steps: Uint32Array, number: number, words: Uint32Array, at: number, end: number): number {
  let least = steps[number] as number;
  for (let i = at; i < end; i += 1) {
    const step = steps[words[i] as number] as number;
    if (step !== 0 && (least === 0 || step + 1 < least)) least = step + 1;
  }
  steps[number] = least;
  return least;
}

/** Everything that some entries depend on, themselves included, the newest first. Cost: a few bundles of the lineage. */
export function upstreamOf(index: Index, entries: Iterable<number>): number[] {
  const targets = targetsReader(index);
  const found = new Set<number>();
  const waiting = [...entries];
  for (let number = waiting.pop(); number !== undefined; number = waiting.pop()) {
    if (found.has(number)) continue;
    found.add(number);
    waiting.push(...targets(number));
  }
  return [...found].sort((a, b) => b - a);
}

/** Reads what entries name; keeps the bundles that it has read. */
export function targetsReader(index: Index): (number: number) => Uint32Array {
  const known = new Map<number, { words: Uint32Array; starts: Uint32Array }>();
  return (number) => {
    const bundle = bundleOf(number);
    let found = known.get(bundle);
    if (found === undefined) {
      const row = index.get<{ links: Uint8Array }>('SELECT links FROM bundles WHERE bundle = ?', bundle);
      const words = row === undefined ? NO_WORDS : wordsOf(row.links);
      found = { words, starts: startsOf(words) };
      known.set(bundle, found);
    }
    const at = found.starts[number - 1 - bundle * IN_BUNDLE];
    if (at === undefined || at >= found.words.length) return NO_WORDS;
    return found.words.subarray(at + 1, at + 1 + ((found.words[at] as number) >>> 2));
  };
}

/** Where the records of a bundle start; beyond the last one, the bundle's end. */
function startsOf(words: Uint32Array): Uint32Array {
  const starts = new Uint32Array(IN_BUNDLE).fill(words.length);
  for (let at = 0, i = 0; at < words.length; i += 1) {
    starts[i] = at;
    at = after(words, at);
  }
  return starts;
}

/** Where the record after the one at a place starts. */
function after(words: Uint32Array, at: number): number {
  const head = words[at] as number;
  const end = at + 1 + (head >>> 2);
  return (head & 3) === RUN ? end + 1 + (words[end] as number) : end;
}

/** Tells whether an entry is one of some runs or named by one. @param runs  their entries
 *  Cost: reads the bundles from the newest back to the oldest entry that is asked for. */
export function namedByRuns(index: Index, runs: Iterable<number>): (number: number) => boolean {
  const marks = new Uint8Array(index.extent().entries + 1);
  for (const run of runs) marks[run] = 1;
  /** Bundles from here on have been read: an entry is named by later ones only. */
  let read = bundleOf(marks.length - 1) + 1;
  return (number) => {
    const wanted = bundleOf(number);
    while (read > wanted) {
      const from = Math.max(0, read - BACK_AT_ONCE);
      const bundles = index.all<{ bundle: number; links: Uint8Array }>(BUNDLES, from, read);
      for (const { bundle, links } of bundles.reverse()) markNamed(marks, bundle, wordsOf(links));
      read = from;
    }
    return marks[number] === 1;
  };
}

/** Marks what the marked runs of a bundle name. */
function markNamed(marks: Uint8Array, bundle: number, words: Uint32Array): void {
  let entry = bundle * IN_BUNDLE + 1;
  for (let at = 0; at < words.length; at = after(words, at), entry += 1) {
    const head = words[at] as number;
    if ((head & 3) !== RUN || marks[entry] !== 1) continue;
    for (let i = at + 1, end = at + 1 + (head >>> 2); i < end; i += 1) marks[words[i] as number] = 1;
  }
}

/** The entries of runs that name an entry, oldest first. Cost: reads the bundles from the entry on, as far as wanted. */
export function* runsNaming(index: Index, number: number): Generator<number> {
  for (const { bundle, links } of bundlesFrom(index, bundleOf(number))) {
    const words = wordsOf(links);
    for (const { entry, what, at, end } of recordsOf(bundle, words)) {
      if (what === RUN && words.subarray(at, end).includes(number)) yield entry;
    }
  }
}

/** The records of a bundle: what each entry is, and where the entries that it names stand. */
function* recordsOf(bundle: number, words: Uint32Array) {
  let entry = bundle * IN_BUNDLE + 1;
  for (let at = 0; at < words.length; entry += 1) {
    const head = words[at] as number;
    const what = head & 3;
    const end = at + 1 + (head >>> 2);
    yield { entry, what, at: at + 1, end };
    at = after(words, at);
  }
}

function bundleOf(number: number): number {
  return Math.floor((number - 1) / IN_BUNDLE);
}

function* bundlesFrom(index: Index, from: number): Generator<{ bundle: number; links: Uint8Array }> {
  for (let next = Math.max(0, from); ; next += AT_ONCE) {
    const bundles = index.all<{ bundle: number; links: Uint8Array }>(BUNDLES, next, next + AT_ONCE);
    if (bundles.length === 0) return;
    yield* bundles;
  }
}

function wordsOf(bytes: Uint8Array): Uint32Array {
  const isAligned = bytes.byteOffset % 4 === 0;
  const whole = isAligned ? bytes : bytes.slice();
  return new Uint32Array(whole.buffer, whole.byteOffset, whole.length / 4);
}
