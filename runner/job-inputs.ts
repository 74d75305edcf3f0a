/** Files behind the inputs of a job: where they lie, their digests, and whether they stay as they are. */

import type { Origin, RecordedInput } from '../ledger/entry.ts';
import type { ExecutionOptions } from './execute.ts';
import type { Job, JobInput, Outcome } from './job.ts';
import { RunnerProblem } from './problem.ts';

export interface ResolvedInput extends RecordedInput {
  readonly path: string;
  readonly watched: string | null;
}

/** @throws RunnerProblem when a file changed since it was recorded, or an output is not in the store */
export function resolveInputs(job: Job, outcomes: ReadonlyMap<string, Outcome>, options: ExecutionOptions) {
  const resolve = (input: JobInput): ResolvedInput => {
    if (input.from === 'store') {
      return {
        ...input.file,
        origin: input.origin,
        path: options.book.store.path(input.file.digest),
        watched: null,
      };
    }
    if (input.from === 'file') return resolveFile(input, options);
    const upstream = outcomes.get(input.stage);
    const file = upstream?.outputs[input.output];
    if (upstream === undefined || file === undefined) throw missingOutput(input.stage, input.output);
    const origin: Origin = { entry: upstream.entry ?? 0, output: input.output };
    const path = options.book.store.path(file.digest);
    return { digest: file.digest, bytes: file.bytes, origin, path, watched: null };
  };
  return mapLists(job.inputs, resolve);
}

function resolveFile(input: Extract<JobInput, { from: 'file' }>, options: ExecutionOptions): ResolvedInput {
  const { digest, bytes } = options.book.digestOfFile(input.path, { strict: options.strict });
  if (input.expected !== null && input.expected !== digest) {
    throw new RunnerProblem(
      'input-changed',
      `${input.given}: expected the file with digest ${input.expected.slice(0, 12)}…, got one with digest ` +
        `${digest.slice(0, 12)}…. Restore the recorded file, or run the recipe anew on the present one.`,
      { file: input.path },
      1,
    );
  }
  if (input.keep) options.book.store.keepFile(input.path);
  return { digest, bytes, origin: { file: input.given }, path: input.path, watched: input.path };
}

function missingOutput(stage: string, output: string): RunnerProblem {
  const message = `${stage}.${output}: expected an output in the store, got none. Run again with --afresh.`;
  return new RunnerProblem('missing-output', message, {}, 1);
}

/** A file that changed while a stage read it leaves a result without a known input. */
export function confirmUnchanged(
  inputs: Readonly<Record<string, readonly ResolvedInput[]>>,
  options: ExecutionOptions,
): void {
  for (const input of Object.values(inputs).flat()) {
    if (input.watched === null) continue;
    const now = options.book.digestOfFile(input.watched, { strict: false });
    if (now.digest === input.digest) continue;
    throw new RunnerProblem(
      'input-changed',
      `${input.watched}: expected a file that stays as it is, got one that changed while a stage read it. ` +
        `Let its writer finish and run again.`,
      { file: input.watched },
      1,
    );
  }
}

export function mapLists<A, B>(
  lists: Readonly<Record<string, readonly A[]>>,
  each: (item: A) => B,
): Record<string, readonly B[]> {
  return Object.fromEntries(Object.entries(lists).map(([name, items]) => [name, items.map(each)]));
}
