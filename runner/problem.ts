/** Errors of the runner. Each code has one row of advice here, used where a problem has no better of its own. Codes
 *  are append-only and never reused. */

import { reasonOf } from '../ledger/problem.ts';
import type { ExitStatus } from './command.ts';

export const advice = {
  // The recipe as a file.
  'no-recipe': 'Give the path of a recipe.',
  'too-large': 'A recipe declares stages; data belong into files of their own.',
  'not-text': 'Save the recipe as UTF-8.',
  'control-character': 'Delete the character.',
  // The recipe as YAML.
  syntax: 'Mend the YAML here.',
  'several-documents': 'Put each recipe into a file of its own.',
  tag: 'Delete the tag; recipes know only text, numbers, true, false, lists and maps.',
  'unknown-alias': 'Set the anchor before its alias.',
  'alias-loop': 'Write out what the alias stands for.',
  'too-deep': 'Write it flatter.',
  'too-many-nodes': 'Share less with aliases, or split the recipe.',
  'doubled-key': 'Keep one of the two.',
  'bad-key': 'Write a plain name.',
  // The recipe as a declaration.
  'wrong-type': 'Write it as expected.',
  'unknown-key': 'Delete it, or correct its name.',
  'missing-key': 'Add it.',
  'bad-name': 'Rename it.',
  'unknown-kind': 'See `platebook kinds`.',
  'unknown-input': 'Delete it, or correct its name.',
  'missing-input': 'Add a reference to a file or to a stage.',
  'unknown-parameter': 'Delete it, or correct its name.',
  'missing-parameter': 'Add it.',
  'out-of-range': 'Write a value inside the range.',
  'unknown-word': 'Write one of the words.',
  'bad-quantity': 'Write a number, a space and a unit.',
  'bad-unit': 'Write a unit of VOUnits.',
  'wrong-dimension': 'Write the quantity in a unit of the right dimension.',
  'unknown-stage': 'Declare the stage, or correct its name.',
  'unknown-output': 'Name an output that the kind makes.',
  'unknown-number': 'Publish one of those that the output can hold.',
  'wrong-format': 'Refer to an output of the right format.',
  'output-not-made': 'Give the stage that input, or refer to another output.',
  loop: 'Cut the loop: a stage cannot need its own outputs.',
  'no-file': 'Correct the path, which counts from the directory of the recipe.',
  'not-a-file': 'Name a regular file.',
  'unreadable-file': 'Make the file readable.',
  'outside-roots': 'Move the file below the directory of the recipe, or allow its directory with `--root`.',
  'bad-override': 'Write `--let STAGE.PARAMETER=VALUE`.',
  // The call and the work.
  'bad-configuration': 'Correct the configuration.',
  'nothing-to-rerun': 'Name the entry of a stage, a plate or a run.',
  'input-changed': 'Restore the recorded file, or run the recipe anew.',
  'missing-output': 'Report this as a fault of the stage kind.',
  // Recorded code.
  'code-not-kept': 'Leave out --as-recorded: the installed code computes, and what differs is said.',
  'code-not-restored': 'Leave out --as-recorded: the installed code computes, and what differs is said.',
  'cannot-write': 'Mend that, and repeat: what is finished is carried forward.',
  'untrusted-code': 'Read the code in the bag; if you trust whose it is, repeat with --trust-code.',
  // Bags.
  'bad-call': 'See `platebook bag --help`.',
  'no-bag': 'Name the directory of a bag.',
  'bad-bag': 'Do not use this bag; take it from whoever made it once more.',
  'bag-not-written': 'Mend the cause and repeat; nothing was left behind.',
} as const satisfies Readonly<Record<string, string>>;

export type RunnerCode = keyof typeof advice;

export interface ProblemPlace {
  readonly file?: string;
  /** From 1. */
  readonly line?: number;
  readonly column?: number;
}

/** What the command line shows as it stands; `exitStatus` is what the process then returns. */
export class RunnerProblem extends Error {
  override readonly name: string = 'RunnerProblem';
  readonly code: RunnerCode;
  readonly file: string | null;
  readonly line: number | null;
  readonly column: number | null;
  readonly exitStatus: ExitStatus;

  constructor(
    code: RunnerCode,
    message: string,
    place: ProblemPlace = {},
    exitStatus: ExitStatus = 2,
    options?: ErrorOptions,
  ) {
    super(message, options);
    this.code = code;
    this.file = place.file ?? null;
    this.line = place.line ?? null;
    this.column = place.column ?? null;
    this.exitStatus = exitStatus;
  }
}

/** A file outside the book cannot be written. */
export function cannotWriteOutside(file: string, cause: unknown): RunnerProblem {
  const why = `${file}: cannot be written (${reasonOf(cause)}). ${advice['cannot-write']}`;
  return new RunnerProblem('cannot-write', why, { file }, 1, { cause });
}
