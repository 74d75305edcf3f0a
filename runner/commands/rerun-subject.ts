/** What is executed again: an entry alone, from its recorded inputs; a plate with all that it depends on; a run whole. */

import type { Entry, RunEntry, StageEntry } from '../../ledger/entry.ts';
import type { Subject as Asked } from '../../ledger/subject.ts';
import { advice, RunnerProblem } from '../problem.ts';

export interface RerunSubject {
  /** The entry that is named in the comparison. */
  readonly of: Entry;
  readonly run: RunEntry | null;
  /** In the order of computation. */
  readonly stages: readonly StageEntry[];
}

type EntryOf = (number: number) => Entry | undefined;

/** Every stage of a run that ended well. */
export function stagesOfRun(run: RunEntry, entryOf: EntryOf): StageEntry[] {
  return run.stages.flatMap(({ entry, state }) =>
    entry === null || state === 'failed' ? [] : [stageEntry(entry, entryOf)],
  );
}

/** A stage and all that it depends on, upstream first, in the order of their entries. */
export function withUpstream(stage: StageEntry, entryOf: EntryOf): StageEntry[] {
  const found = new Map<number, StageEntry>();
  const waiting = [stage];
  for (let next = waiting.pop(); next !== undefined; next = waiting.pop()) {
    if (found.has(next.number)) continue;
    found.set(next.number, next);
    for (const input of Object.values(next.inputs).flat()) {
      if ('entry' in input.origin) waiting.push(stageEntry(input.origin.entry, entryOf));
    }
  }
  return [...found.values()].sort((a, b) => a.number - b.number);
}

/** @throws RunnerProblem 'nothing-to-rerun' when it is no stage's */
export function stageEntry(number: number, entryOf: EntryOf): StageEntry {
  const entry = entryOf(number);
  if (entry?.type === 'stage') return entry;
  throw nothingToRerun(`entry ${number}`, entry === undefined ? 'nothing' : `a ${entry.type}`);
}

/** The entry that made what is asked for. */
export function nearestEntry(asked: Asked): number {
  if (asked.type === 'number') return asked.number.entry;
  if (asked.type === 'plate') return asked.drawn;
  if (asked.type !== 'file') return asked.entry;
  const made = asked.roles.find((role) => role.role !== 'input');
  if (made === undefined) throw nothingToRerun(asked.asked, 'a file that came from outside');
  return made.entry;
}

export function nothingToRerun(place: string, found: string): RunnerProblem {
  const message =
    `${place}: expected something that a stage, a plate or a run made, got ${found}. ` +
    advice['nothing-to-rerun'];
  return new RunnerProblem('nothing-to-rerun', message, {}, 2);
}
