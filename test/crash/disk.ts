/** A model of a disk that loses its power: what can stand on it after the steps that file-layer.ts counts.
 *
 *  A step is on the disk for certain once its file (for bytes and sizes) or its directory (for names) has been synced
 *  after it. Until then it is pending, and each pending step may come out differently, whatever became of the others:
 *
 *      write       lost; whole; its first half; zeros in its place; its first half, then zeros
 *      truncate    lost; done
 *      a name made, taken away, or moved to another directory
 *                  lost; done (a move is two: the name that is made, the name that is taken away)
 *      a rename within a directory
 *                  lost; done; done with the old name still there
 *
 *  So of steps that were not ordered by a sync any later one may stand without the earlier ones. What the model takes
 *  for granted, as the program does: what was synced stays; a rename within a directory never loses both names; a file
 *  that keeps its bytes keeps those that it had. Modes are as last set. */

import { mkdirSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { ROOT, type Step } from './file-layer.ts';

type Outcome = 'lost' | 'done' | 'half' | 'zeros' | 'half, zeros' | 'both names';

const OF_WRITE: readonly Outcome[] = ['lost', 'done', 'half', 'zeros', 'half, zeros'];
const OF_NAME: readonly Outcome[] = ['lost', 'done'];
const OF_RENAME: readonly Outcome[] = ['lost', 'done', 'both names'];
/** Of a file with more pending steps than these, the outcomes are drawn together, to keep the states few. */
const APART = 3;

type Bytes = Extract<Step, { op: 'write' | 'truncate' }>;

interface NameChange {
  readonly op: 'set' | 'remove' | 'rename';
  readonly name: string;
  /** For a rename. */
  readonly from?: string;
  readonly id: number;
}

interface File {
  readonly kind: 'file';
  bytes: Buffer;
  mode: number;
  pending: Bytes[];
}

interface Directory {
  readonly kind: 'directory';
  names: Map<string, number>;
  pending: NameChange[];
}

/** Relative path to bytes and mode; null for a directory. */
export type State = ReadonlyMap<string, { readonly bytes: Buffer; readonly mode: number } | null>;

/** How pending steps come out: outcome by outcome, in the order of `Disk.pending`. */
type Choice = readonly (readonly Outcome[])[];

export interface Disk {
  /** Does a step. */
  apply(step: Step): void;
  /** The state when nothing pending is lost. */
  live(): State;
  /** States after a power cut now: all of them where there are at most `atMost`. Otherwise two in which all that is
   *  pending is lost or done; of each file and directory one in which it alone is lost or done, unless `atMost` is 0;
   *  and `samples` drawn at random. */
  afterPowerCut(options: { atMost: number; samples: number; random: () => number }): State[];
}

/** A disk on which a directory's files stand safely. @param files  as liveFiles() lists them, parents first */
export function makeDisk(files: ReadonlyMap<string, Buffer | null>): Disk {
  const things = new Map<number, File | Directory>([[ROOT, emptyDirectory()]]);
  const idsByPath = new Map<string, number>([['', ROOT]]);
  let next = ROOT + 1;
  for (const [path, bytes] of files) {
    things.set(next, bytes === null ? emptyDirectory() : { kind: 'file', bytes, mode: 0o600, pending: [] });
    const cut = path.lastIndexOf('/');
    const parent = idsByPath.get(path.slice(0, Math.max(0, cut))) as number;
    (things.get(parent) as Directory).names.set(path.slice(cut + 1), next);
    idsByPath.set(path, next++);
  }
  const file = (id: number) => things.get(id) as File;
  const directory = (id: number) => things.get(id) as Directory;

  function apply(step: Step): void {
    switch (step.op) {
      case 'create':
        things.set(step.id, step.kind === 'file' ? emptyFile() : emptyDirectory());
        directory(step.at.directory).pending.push({ op: 'set', name: step.at.name, id: step.id });
        return;
      case 'link':
        directory(step.at.directory).pending.push({ op: 'set', name: step.at.name, id: step.id });
        return;
      case 'unlink':
        directory(step.at.directory).pending.push({ op: 'remove', name: step.at.name, id: step.id });
        return;
      case 'rename':
        rename(step);
        return;
      case 'chmod':
        if (things.get(step.id)?.kind === 'file') file(step.id).mode = step.mode;
        return;
      case 'fsync':
        sync(things.get(step.id) as File | Directory);
        return;
      default:
        file(step.id).pending.push(step);
    }
  }

  function rename({ id, from, to }: Extract<Step, { op: 'rename' }>): void {
    if (from.directory === to.directory) {
      directory(to.directory).pending.push({ op: 'rename', name: to.name, from: from.name, id });
      return;
    }
    directory(to.directory).pending.push({ op: 'set', name: to.name, id });
    directory(from.directory).pending.push({ op: 'remove', name: from.name, id });
  }

  const pendingThings = () => [...things.entries()].filter(([, thing]) => thing.pending.length > 0);

  /** What would stand there. @param choice  of the pending things, in order */
  function stateOf(choice: Choice): State {
    const outcomes = new Map(pendingThings().map(([id], i) => [id, choice[i] as readonly Outcome[]]));
    const state = new Map<string, { bytes: Buffer; mode: number } | null>();
    const visit = (id: number, path: string) => {
      const { names, pending } = directory(id);
      for (const [name, child] of [...namesAfter(names, pending, outcomes.get(id))].sort(byName)) {
        const thing = things.get(child) as File | Directory;
        const at = path === '' ? name : `${path}/${name}`;
        if (thing.kind === 'directory') {
          state.set(at, null);
          visit(child, at);
        } else
          state.set(at, {
            bytes: bytesAfter(thing.bytes, thing.pending, outcomes.get(child)),
            mode: thing.mode,
          });
      }
    };
    visit(ROOT, '');
    return state;
  }

  return {
    apply,
    live: () => stateOf(pendingThings().map(([, { pending }]) => pending.map(() => 'done' as const))),
    afterPowerCut({ atMost, samples, random }) {
      const pending = pendingThings();
      const options = pending.map(([, thing]) => choicesOf(thing));
      const count = options.reduce((product, { length }) => product * length, 1);
      if (count <= atMost) return [...product(options)].map(stateOf);
      const alone = atMost === 0 ? [] : [...oneAlone(pending)];
      return [...extremes(pending), ...alone, ...sampled(pending, options, samples, random)].map(stateOf);
    },
  };
}

/** Writes a state below an empty directory. */
export function materialise(state: State, root: string): void {
  for (const [path, thing] of state) {
    if (thing === null) mkdirSync(join(root, path));
    else writeFileSync(join(root, path), thing.bytes, { mode: thing.mode | 0o200 });
  }
}

function emptyFile(): File {
  return { kind: 'file', bytes: Buffer.alloc(0), mode: 0o644, pending: [] };
}

function emptyDirectory(): Directory {
  return { kind: 'directory', names: new Map(), pending: [] };
}

function sync(thing: File | Directory): void {
  if (thing.kind === 'file') thing.bytes = bytesAfter(thing.bytes, thing.pending);
  else thing.names = namesAfter(thing.names, thing.pending);
  thing.pending = [];
}

function bytesAfter(bytes: Buffer, pending: readonly Bytes[], outcomes?: readonly Outcome[]): Buffer {
  return pending.reduce((now, step, i) => oneStep(now, step, outcomes?.[i] ?? 'done'), bytes);
}

function oneStep(now: Buffer, step: Bytes, outcome: Outcome): Buffer {
  if (outcome === 'lost') return now;
  if (step.op === 'truncate')
    return Buffer.concat([now, Buffer.alloc(Math.max(0, step.size - now.length))]).subarray(0, step.size);
  const { offset } = step;
  const half = Math.floor(step.bytes.length / 2);
  const put = Buffer.alloc(outcome === 'half' ? half : step.bytes.length);
  if (outcome !== 'zeros') step.bytes.copy(put, 0, 0, outcome === 'done' ? step.bytes.length : half);
  const grown = Buffer.alloc(Math.max(now.length, offset + put.length));
  now.copy(grown);
  put.copy(grown, offset);
  return grown;
}

function namesAfter(
  names: ReadonlyMap<string, number>,
  pending: readonly NameChange[],
  outcomes?: readonly Outcome[],
) {
  const now = new Map(names);
  for (const [i, { op, name, from, id }] of pending.entries()) {
    const outcome = outcomes?.[i] ?? 'done';
    if (outcome === 'lost') continue;
    if (op === 'remove') now.delete(name);
    else now.set(name, id);
    if (op === 'rename' && outcome === 'done') now.delete(from as string);
  }
  return now;
}

/** How the pending steps of one file or directory can come out. */
function choicesOf(thing: File | Directory): Outcome[][] {
  const single = outcomesOf(thing);
  if (thing.pending.length <= APART) return [...product(single)];
  const last = single.length - 1;
  return (['lost', 'done', 'zeros', 'last lost'] as const)
    .filter((how) => how !== 'zeros' || thing.kind === 'file')
    .map((how) =>
      single.map((outcomes, i) => {
        if (how === 'last lost') return i === last ? 'lost' : 'done';
        return outcomes.includes(how) ? how : 'done';
      }),
    );
}

function outcomesOf(thing: File | Directory): (readonly Outcome[])[] {
  return thing.pending.map(({ op }) => {
    if (op === 'write') return OF_WRITE;
    return op === 'rename' ? OF_RENAME : OF_NAME;
  });
}

type Pending = readonly (readonly [number, File | Directory])[];

function every(pending: Pending, outcome: 'lost' | 'done'): Outcome[][] {
  return pending.map(([, thing]) => thing.pending.map(() => outcome));
}

function extremes(pending: Pending): Choice[] {
  return [every(pending, 'lost'), every(pending, 'done')];
}

/** One file or directory whose steps are lost while all others are done, and the other way round. */
function* oneAlone(pending: Pending): Generator<Choice> {
  for (const [one, other] of [
    ['lost', 'done'],
    ['done', 'lost'],
  ] as const) {
    const [alone, rest] = [every(pending, one), every(pending, other)];
    for (const i of pending.keys())
      yield rest.map((outcomes, k) => (k === i ? (alone[i] as Outcome[]) : outcomes));
  }
}

/** At random, in turn file by file and step by step. */
function sampled(
  pending: Pending,
  options: readonly Outcome[][][],
  samples: number,
  random: () => number,
): Choice[] {
  return Array.from({ length: samples }, (_, n) =>
    n % 2 === 0
      ? options.map((all) => pick(all, random))
      : pending.map(([, thing]) => outcomesOf(thing).map((outcomes) => pick(outcomes, random))),
  );
}

function pick<T>(from: readonly T[], random: () => number): T {
  return from[Math.floor(random() * from.length)] as T;
}

function* product<T>(lists: readonly (readonly T[])[]): Generator<T[]> {
  const [first, ...rest] = lists;
  if (first === undefined) {
    yield [];
    return;
  }
  for (const item of first) for (const tail of product(rest)) yield [item, ...tail];
}

function byName([a]: readonly [string, number], [b]: readonly [string, number]): number {
  return a < b ? -1 : 1;
}
