/** What can be wrong with recorded code, each text built once. */

import type { StageEntry } from '../../ledger/entry.ts';
import { advice, RunnerProblem } from '../problem.ts';

/** An entry from before code was kept, or one whose code a bag does not hold. */
export function codeNotKept(stage: StageEntry, what: string): RunnerProblem {
  const message =
    `entry ${stage.number} (${stage.name}): expected its recorded code, got ${what}. ` +
    advice['code-not-kept'];
  return new RunnerProblem('code-not-kept', message, {}, 1);
}

/** Code that is there and cannot be made to run. */
export function codeNotRestored(
  place: string,
  expected: string,
  found: string,
  what: string = advice['code-not-restored'],
) {
  return new RunnerProblem(
    'code-not-restored',
    `${place}: expected ${expected}, got ${found}. ${what}`,
    {},
    1,
  );
}

/** Code out of a bag was asked for without saying that it is trusted. */
export function untrustedCode(stages: readonly StageEntry[]): RunnerProblem {
  const names = stages.map((stage) => stage.name).join(', ');
  const message =
    `${names}: expected code that is installed here, got code out of the bag, by ${writersOf(stages)}. ` +
    advice['untrusted-code'];
  return new RunnerProblem('untrusted-code', message, {}, 2);
}

/** Whose code it is: the persons who entered it. */
export function writersOf(stages: readonly StageEntry[]): string {
  const names = stages.map(({ by }) => (by.orcid === undefined ? by.name : `${by.name} (${by.orcid})`));
  return [...new Set(names)].join(' and ');
}
