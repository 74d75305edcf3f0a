/** What the runner executes: a job is one stage with everything resolved. Jobs come from a recipe (`run`) or from the
 *  entries of an earlier run (`rerun`). */

import type { Json, Origin, RecordedCode, RecordedFinding, StageState, StoredFile } from '../ledger/entry.ts';
import type { Format, OutputDeclaration, StageKind } from '../stages/kind.ts';

export type JobInput =
  | {
      readonly from: 'file';
      /** As the recipe gives it. */
      readonly given: string;
      readonly path: string;
      readonly keep: boolean;
      /** The digest that the file must have, where an entry records one. */
      readonly expected: string | null;
    }
  | { readonly from: 'stage'; readonly stage: string; readonly output: string }
  | { readonly from: 'store'; readonly file: StoredFile; readonly origin: Origin };

export interface Job {
  readonly name: string;
  readonly kind: StageKind;
  readonly inputs: Readonly<Record<string, readonly JobInput[]>>;
  /** What the computation receives. */
  readonly parameters: Readonly<Record<string, unknown>>;
  /** What the entry records. */
  readonly recorded: Readonly<Record<string, Json>>;
  /** The recorded program that computes it; the installed one when absent. */
  readonly program?: RestoredProgram;
}

/** A program restored from recorded code; see recorded-code/restore.ts. */
export interface RestoredProgram {
  /** The module that declares the kind. */
  readonly kindFile: string;
  /** What the stage's process may read besides its inputs and our part of the program. */
  readonly readable: readonly string[];
  /** The Node executable of the recorded release. */
  readonly engine: string;
  readonly code: RecordedCode;
}

/** How a job ended. Outputs are in the store when it ended well. */
export interface Outcome {
  readonly name: string;
  readonly kind: string;
  readonly state: StageState;
  /** The stage's entry, or the failure's. */
  readonly entry: number | null;
  readonly outputs: Readonly<Record<string, StoredFile & { readonly format: Format }>>;
  readonly seconds: number;
  readonly findings: readonly RecordedFinding[];
  readonly warnings: readonly string[];
  readonly stop: string | null;
  readonly mark: string | null;
  readonly error: { readonly code: string; readonly message: string } | null;
  readonly codeDigest: string | null;
}

/** Outputs of a kind that are made with these inputs and parameters. */
export function madeOutputs(
  kind: StageKind,
  inputs: Readonly<Record<string, unknown>>,
  parameters: Readonly<Record<string, unknown>>,
): string[] {
  return Object.entries(kind.outputs)
    .filter(([, output]) => (output.needs ?? []).every((name) => name in inputs))
    .filter(([name, output]) => isChosen(name, output, parameters))
    .map(([name]) => name);
}

/** Whether the parameters leave an output in. */
export function isChosen(
  name: string,
  { chosenBy }: OutputDeclaration,
  parameters: Readonly<Record<string, unknown>>,
): boolean {
  const chosen = chosenBy === undefined ? undefined : parameters[chosenBy];
  return !Array.isArray(chosen) || chosen.includes(name);
}

/** Names of the stages that a job takes from. */
export function upstreamOf(job: Job): string[] {
  return Object.values(job.inputs)
    .flat()
    .flatMap((input) => (input.from === 'stage' ? [input.stage] : []));
}

export function isGood(outcome: Outcome): boolean {
  return outcome.state === 'computed' || outcome.state === 'carried forward';
}
