/** Cuts the power of a simulated disk (disk.ts) at every step of a writer, and opens what can be left then:
 *
 *      node test/crash/power-cut.ts [--brief] [--seed N] [--sabotage HOW]
 *
 *  Four rounds. The writer alone, cut at every step. The writer killed at every step, and another that goes on with the
 *  book, cut at every step. Books that a cut left torn or unsealed, cut at every step of putting them right. A book of the
 *  first version, cut at every step of taking it up. With --brief the first round is whole and the others take samples.
 *  It prints how many steps and states it tried, then one line of JSON with the same and the faults. */

import { createHash } from 'node:crypto';
import { existsSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { parseArgs } from 'node:util';
import { faultsAfterCrash, type Known, linesIn, tornIn } from './after-crash.ts';
import { type Disk, makeDisk, materialise, type State } from './disk.ts';
import { installLayer, type Layer, liveFiles, type Sabotage, type Step, type Stop } from './file-layer.ts';
import { withScratch } from './scratch.ts';
import { PLACES, prepare, prepareFirstVersion, type Report, type Tell, write, writeAgain } from './writer.ts';

/** A writer's steps, and what it had reported before each. */
interface Recording {
  readonly before: ReadonlyMap<string, Buffer | null>;
  readonly events: readonly Event[];
  /** The event from which on the power may go. */
  readonly from: number;
  readonly lines: readonly Buffer[];
  /** The last index. */
  readonly index: Index;
}

type Event =
  | { readonly what: 'step'; readonly step: Step }
  | { readonly what: 'report'; readonly report: Report; readonly index: Index };

/** The index's files by suffix. Its database writes past the layer. */
type Index = ReadonlyMap<string, Buffer>;

interface Tally {
  steps: number;
  states: number;
  distinct: number;
  faults: string[];
  readonly seen: Set<string>;
}

interface Settings {
  readonly atMost: number;
  readonly samples: number;
  readonly random: () => number;
  /** Only after every so many events, and after each that reports an entry. */
  readonly every: number;
}

const MOST_FAULTS = 50;

/** Lays the layer, lets a writer work, and writes down what it did. */
function record(
  root: string,
  work: (tell: Tell, layer: Layer, begin: () => void) => void,
  sabotage?: Sabotage,
): Recording {
  const before = liveFiles(root);
  const events: Event[] = [];
  let from = 0;
  const begin = () => {
    from = events.length;
  };
  const layer = installLayer({
    root,
    ...(sabotage === undefined ? {} : { sabotage }),
    onStep: (step) => events.push({ what: 'step', step }),
  });
  try {
    work((report) => events.push({ what: 'report', report, index: indexIn(root) }), layer, begin);
  } finally {
    layer.remove();
  }
  requireNothingUnseen(root, before, events);
  const ledger = readFileSync(join(root, PLACES.book, 'ledger.jsonl'));
  return { before, events, from, lines: linesIn(ledger), index: indexIn(root) };
}

/** The model of the disk must hold what the real one does: else something was written past the layer. */
function requireNothingUnseen(root: string, before: Recording['before'], events: readonly Event[]): void {
  const disk = makeDisk(before);
  for (const event of events) if (event.what === 'step') disk.apply(event.step);
  const modelled = new Map([...disk.live()].map(([path, thing]) => [path, thing?.bytes ?? null]));
  const real = liveFiles(root);
  const unlike = [...new Set([...modelled.keys(), ...real.keys()])].filter((path) => {
    const [a, b] = [modelled.get(path), real.get(path)];
    return a === undefined || b === undefined || (a === null ? b !== null : b === null || !a.equals(b));
  });
  if (unlike.length > 0) throw new Error(`files that were changed past the layer: ${unlike.join(', ')}`);
}

/** Cuts the power after steps, and checks what may be left. */
function cutEverywhere(
  recording: Recording,
  { atMost, samples, random, every }: Settings,
  tally: Tally,
  onState: (state: State, known: Known) => void = () => {},
): void {
  const disk: Disk = makeDisk(recording.before);
  const reported: Report[] = [];
  let index: Index = new Map();
  for (const [i, event] of recording.events.entries()) {
    if (event.what === 'step') disk.apply(event.step);
    else {
      reported.push(event.report);
      index = event.index;
    }
    const isDue = i >= recording.from && (wasEntered(event) || i % every === recording.from % every);
    if (!isDue || tally.faults.length >= MOST_FAULTS) continue;
    if (event.what === 'step') tally.steps += 1;
    for (const state of disk.afterPowerCut({ atMost, samples, random })) {
      tally.states += 1;
      const key = digestOf(state, reported, recording.lines);
      if (tally.seen.has(key)) continue;
      tally.seen.add(key);
      const known = { reported: [...reported], lines: recording.lines };
      const faults = check(state, known, indexFor(tally.distinct, index, recording.index));
      tally.distinct += 1;
      tally.faults.push(...faults.map((fault) => `after ${describe(event)}: ${fault}`));
      onState(state, known);
    }
  }
}

function wasEntered(event: Event): boolean {
  return event.what === 'report' && event.report.what === 'entered';
}

/** None, the one of the moment, one that is ahead of the ledger, and one of zeros, in turn. */
function indexFor(count: number, current: Index, last: Index): Index {
  return [new Map(), current, last, new Map([['', Buffer.alloc(8192)]])][count % 4] as Index;
}

function check(state: State, known: Known, index: Index): string[] {
  return withScratch((root) => {
    materialise(state, root);
    if (known.reported.length > 0 && existsSync(join(root, PLACES.book))) {
      for (const [suffix, bytes] of index)
        writeFileSync(join(root, PLACES.book, `index.sqlite${suffix}`), bytes);
    }
    return faultsAfterCrash(root, known);
  });
}

/** The writer alone. @returns its steps, and states whose opening has something to put right, one of each shape */
function cutWriter(
  settings: Settings,
  tally: Tally,
  sabotage: Sabotage | undefined,
): { recoveries: { state: State; known: Known }[]; steps: Step[] } {
  const recoveries = new Map<string, { state: State; known: Known }>();
  const steps = withScratch((root) => {
    prepare(root);
    const recording = record(root, (tell) => write(root, tell), sabotage);
    cutEverywhere(recording, settings, tally, (state, known) => {
      const shape = shapeOf(state, known);
      if (shape !== null && !recoveries.has(shape)) recoveries.set(shape, { state, known });
    });
    return recording.events.flatMap((event) => (event.what === 'step' ? [event.step] : []));
  });
  return { recoveries: [...recoveries.values()], steps };
}

/** What an opening will have to put right: null when the ledger holds only what was reported. */
function shapeOf(state: State, { reported, lines }: Known): string | null {
  const ledger = state.get(join(PLACES.book, 'ledger.jsonl'))?.bytes ?? Buffer.alloc(0);
  const torn = tornIn(ledger, lines);
  const unreported = linesIn(ledger).length - reported.filter(({ what }) => what === 'entered').length;
  if (torn.length === 0) return unreported > 0 && reported.length > 0 ? `unsealed ${unreported}` : null;
  return torn.every((byte) => byte === 0) ? 'zeros' : torn.includes(0) ? 'half zeros' : 'half';
}

/** The writer is killed at a step, another goes on, the power goes at the steps of that one. */
function cutAfterKill(settings: Settings, tally: Tally, stop: Stop): void {
  withScratch((root) => {
    prepare(root);
    const recording = record(root, (tell, layer, begin) => {
      layer.stopAt(stop);
      try {
        write(root, tell);
      } catch (error) {
        if (!layer.died()) throw error;
      }
      layer.stopAt(null);
      begin();
      writeAgain(root, tell, settings.every === 1);
    });
    cutEverywhere(recording, settings, tally);
  });
}

/** The power goes while an opening puts right what an earlier cut left. */
function cutRecovery(
  settings: Settings,
  tally: Tally,
  { state, known }: { state: State; known: Known },
): void {
  withScratch((root) => {
    materialise(state, root);
    const recording = record(root, (tell, _, begin) => {
      for (const report of known.reported) tell(report);
      begin();
      writeAgain(root, tell);
    });
    cutEverywhere(recording, settings, tally);
  });
}

/** The power goes while a book of the first version is taken up and written to. */
function cutTakingUp(settings: Settings, tally: Tally): void {
  withScratch((root) => {
    prepareFirstVersion(root);
    const recording = record(root, (tell) => writeAgain(root, tell));
    cutEverywhere(recording, settings, tally);
  });
}

function indexIn(root: string): Index {
  const found = ['', '-wal', '-shm'].map(
    (suffix) => [suffix, join(root, PLACES.book, `index.sqlite${suffix}`)] as const,
  );
  return new Map(
    found.filter(([, path]) => existsSync(path)).map(([suffix, path]) => [suffix, readFileSync(path)]),
  );
}

/** Two states of which one digest is as good as the other: those that differ only in temporary names are one. */
function digestOf(state: State, reported: readonly Report[], lines: readonly Buffer[]): string {
  const sum = createHash('sha256');
  sum.update(JSON.stringify(reported));
  for (const line of lines) sum.update(line);
  for (const [path, thing] of state) {
    sum.update(`${path.replace(/\d+-\d+$/, '')}\0${thing?.bytes.length ?? -1}\0`);
    if (thing !== null) sum.update(thing.bytes);
  }
  return sum.digest('hex');
}

function describe(event: Event): string {
  if (event.what === 'report') return `report of what was ${event.report.what}`;
  const { step } = event;
  const place = 'at' in step ? step.at.name : 'to' in step ? step.to.name : `file ${step.id}`;
  return `${step.op} ${place}`;
}

/** A counter and a mixing function: even enough to draw samples with. */
function seeded(seed: number): () => number {
  let state = seed;
  return () => {
    state = (state + 0x6d2b79f5) | 0;
    let mixed = Math.imul(state ^ (state >>> 15), 1 | state);
    mixed = (mixed + Math.imul(mixed ^ (mixed >>> 7), 61 | mixed)) ^ mixed;
    return ((mixed ^ (mixed >>> 14)) >>> 0) / 4294967296;
  };
}

/** How thorough each round is. */
const FULL = {
  writer: { atMost: 12, samples: 4, every: 1 },
  second: { atMost: 12, samples: 4, every: 1 },
  kills: 1,
  recovery: { atMost: 12, samples: 4, every: 1 },
  recoveries: 8,
};
const BRIEF: typeof FULL = {
  writer: { atMost: 5, samples: 1, every: 1 },
  second: { atMost: 0, samples: 1, every: 13 },
  kills: 3,
  recovery: { atMost: 4, samples: 1, every: 3 },
  recoveries: 4,
};

function main(): void {
  const { values } = parseArgs({
    options: {
      sabotage: { type: 'string' },
      brief: { type: 'boolean', default: false },
      seed: { type: 'string', default: '1' },
    },
  });
  const random = seeded(Number(values.seed));
  const plan = values.brief ? BRIEF : FULL;
  const rounds: Record<string, Tally> = {};
  const round = (name: string) => {
    rounds[name] = { steps: 0, states: 0, distinct: 0, faults: [], seen: new Set() };
    return rounds[name];
  };
  const sabotage = values.sabotage as Sabotage | undefined;
  const { recoveries, steps } = cutWriter({ ...plan.writer, random }, round('writer'), sabotage);
  if (sabotage === undefined) {
    const killed = round('killed, then another writer');
    for (let at = 1; at <= steps.length; at += plan.kills) {
      cutAfterKill({ ...plan.second, random }, killed, { at, how: 'die' });
      if (steps[at - 1]?.op === 'write')
        cutAfterKill({ ...plan.second, random }, killed, { at, how: 'die half' });
    }
    const recovery = round('putting right');
    for (const one of recoveries.slice(0, plan.recoveries))
      cutRecovery({ ...plan.recovery, random }, recovery, one);
    cutTakingUp({ ...plan.recovery, random }, round('taking up'));
  }
  for (const [name, { steps, states, distinct, faults }] of Object.entries(rounds)) {
    const counts = `${steps} points, ${states} states, ${distinct} of them distinct, ${faults.length} faults`;
    process.stdout.write(`power cut, ${name}: ${counts}\n`);
  }
  process.stdout.write(`${JSON.stringify(rounds, (name, value) => (name === 'seen' ? undefined : value))}\n`);
}

main();
