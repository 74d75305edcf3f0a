/** `rerun WHAT`: executes again what an entry, a plate or a run records, and compares byte for byte. The comparison is
 *  an entry of its own. An entry is executed alone, from its recorded inputs; a plate with all that it depends on; a
 *  run whole. */

import { dirname, resolve } from 'node:path';
import { type Book, openBook } from '../../ledger/book.ts';
import type {
  Entry,
  PublishedNumber,
  RecordedInput,
  RerunDraft,
  RunEntry,
  StageEntry,
  Verdict,
} from '../../ledger/entry.ts';
import { findRunOfStage } from '../../ledger/find.ts';
import { type Subject as Asked, findSubject } from '../../ledger/subject.ts';
import type { StageKind } from '../../stages/kind.ts';
import { stageKinds } from '../../stages/kinds.ts';
import type { CommonOptions, ExitStatus, Io } from '../command.ts';
import { type ComparedOutput, compareStage, overallVerdict } from '../compare-outputs.ts';
import { writer } from '../configuration.ts';
import { execute } from '../execute.ts';
import type { Job, JobInput, Outcome } from '../job.ts';
import { advice, RunnerProblem } from '../problem.ts';
import { kindsFolder, stageEngine } from '../program.ts';
import { makeProgress } from '../progress.ts';
import { plainParameters } from '../recorded-parameters.ts';
import { wrapped } from '../wrapped.ts';

export interface RerunOptions extends CommonOptions {
  readonly cores: number;
  readonly by?: string;
  readonly signal: AbortSignal;
}

interface Subject {
  /** The entry that is named in the comparison. */
  readonly of: Entry;
  readonly run: RunEntry | null;
  /** In the order of computation. */
  readonly stages: readonly StageEntry[];
}

export async function rerunCommand(
  words: readonly string[],
  options: RerunOptions,
  io: Io,
): Promise<ExitStatus> {
  const book = openBook(options.book, {
    by: await writer(io, options.by),
    announce: (text) => io.err(`${text}\n`),
  });
  try {
    const subject = findStages(book, words, io);
    const outcomes = await executeAgain(subject, book, options, io);
    const draft = compare(subject, outcomes, book);
    const { entry } = book.append(draft);
    const document = { verdict: draft.verdict, run: subject.run?.run ?? null, outputs: draft.outputs };
    if (options.json) io.out(`${JSON.stringify({ ...document, entry: entry.number }, null, 2)}\n`);
    else if (!options.quiet) io.out(rerunText(subject, draft, entry.number, outcomes));
    return draft.verdict === 'different' ? 1 : 0;
  } finally {
    book.close();
  }
}

function findStages(book: Book, words: readonly string[], io: Io): Subject {
  const asked = findSubject(book, words, io.cwd);
  const of = book.entry(nearestEntry(asked));
  if (of.type === 'run') {
    const stages = of.stages.flatMap(({ entry, state }) =>
      entry === null || state === 'failed' ? [] : [stageEntry(book, entry)],
    );
    return { of, run: of, stages };
  }
  if (of.type !== 'stage' && of.type !== 'plate') throw nothingToRerun(`entry ${of.number}`, `a ${of.type}`);
  const stage = of.type === 'stage' ? of : stageEntry(book, of.drawn);
  const stages = asked.type === 'entry' && of.type === 'stage' ? [stage] : withUpstream(book, stage);
  return { of, run: findRunOfStage(book, stage.number) ?? null, stages };
}

/** The entry that made what is asked for. */
function nearestEntry(asked: Asked): number {
  if (asked.type === 'number') return asked.number.entry;
  if (asked.type === 'plate') return asked.drawn;
  if (asked.type !== 'file') return asked.entry;
  const made = asked.roles.find((role) => role.role !== 'input');
  if (made === undefined) throw nothingToRerun(asked.asked, 'a file that came from outside');
  return made.entry;
}

function nothingToRerun(place: string, found: string): RunnerProblem {
  const message =
    `${place}: expected something that a stage, a plate or a run made, got ${found}. ` +
    advice['nothing-to-rerun'];
  return new RunnerProblem('nothing-to-rerun', message, {}, 2);
}

/** A stage and all that it depends on, upstream first, in the order of their entries. */
function withUpstream(book: Book, stage: StageEntry): StageEntry[] {
  const found = new Map<number, StageEntry>();
  const waiting = [stage];
  for (let next = waiting.pop(); next !== undefined; next = waiting.pop()) {
    if (found.has(next.number)) continue;
    found.set(next.number, next);
    for (const input of Object.values(next.inputs).flat()) {
      if ('entry' in input.origin) waiting.push(stageEntry(book, input.origin.entry));
    }
  }
  return [...found.values()].sort((a, b) => a.number - b.number);
}

function stageEntry(book: Book, number: number): StageEntry {
  const entry = book.entry(number);
  if (entry.type === 'stage') return entry;
  throw nothingToRerun(`entry ${number}`, `a ${entry.type}`);
}

async function executeAgain(subject: Subject, book: Book, options: RerunOptions, io: Io): Promise<Outcome[]> {
  const folder = resolve(io.cwd, dirname(subject.run?.recipe.path ?? '.'));
  const jobs = subject.stages.map((stage) => jobOf(stage, subject.stages, folder, book));
  const progress = await makeProgress(io, jobs, options.quiet || options.json);
  return execute(jobs, {
    book,
    cores: options.cores,
    carry: false,
    enter: false,
    strict: true,
    engine: stageEngine(io.env),
    kindsFolder,
    signal: options.signal,
    reporter: progress,
  }).finally(() => progress.close());
}

/** The job of a recorded stage: from the rerun's own results where they are made again, else from the store, and for
 *  files that are not in it from where the recipe of the run named them. */
function jobOf(stage: StageEntry, all: readonly StageEntry[], folder: string, book: Book): Job {
  const kind = findKind(stage);
  const input = (recorded: RecordedInput): JobInput => {
    const { digest, bytes, origin } = recorded;
    const stored: JobInput = { from: 'store', file: { digest, bytes }, origin };
    if ('file' in origin) {
      if (book.store.has(recorded)) return stored;
      const path = resolve(folder, origin.file);
      return { from: 'file', given: origin.file, path, keep: false, expected: digest };
    }
    const upstream = all.find((each) => each.number === origin.entry);
    return upstream === undefined ? stored : { from: 'stage', stage: upstream.name, output: origin.output };
  };
  return {
    name: stage.name,
    kind,
    inputs: Object.fromEntries(Object.entries(stage.inputs).map(([name, list]) => [name, list.map(input)])),
    parameters: plainParameters(kind.parameters, stage.parameters),
    recorded: stage.parameters,
  };
}

function findKind(stage: StageEntry): StageKind {
  const kind = stageKinds.find((each) => each.kind === stage.kind);
  if (kind !== undefined) return kind;
  const message = `entry ${stage.number}: expected a kind of this program, got ${stage.kind}. Use the program that made it.`;
  throw new RunnerProblem('unknown-kind', message, {}, 1);
}

function compare(subject: Subject, outcomes: readonly Outcome[], book: Book): RerunDraft {
  const published = publishedBy(subject);
  const outputs: ComparedOutput[] = [];
  const differences: string[] = [];
  subject.stages.forEach((stage, i) => {
    const outcome = outcomes[i];
    if (outcome === undefined) return;
    outputs.push(...compareStage(stage, outcome, published, book));
    if (outcome.codeDigest !== null && outcome.codeDigest !== stage.code.digest) {
      differences.push(
        `${stage.name}: the code or the runtime is not the recorded one (entry ${stage.number})`,
      );
    }
    if (outcome.error !== null) differences.push(`${stage.name}: ${outcome.error.message}`);
  });
  const verdict = overallVerdict(outputs, published);
  return { type: 'rerun', of: subject.of.number, verdict, outputs, differences };
}

/** The published numbers that the stages executed again hold. */
function publishedBy(subject: Subject): PublishedNumber[] {
  const numbers = new Set(subject.stages.map((stage) => stage.number));
  return (subject.run?.numbers ?? []).filter((number) => numbers.has(number.entry));
}

function rerunText(subject: Subject, draft: RerunDraft, entry: number, outcomes: readonly Outcome[]): string {
  const name = (output: ComparedOutput) => `${output.stage}.${output.output}`;
  const width = Math.max(...draft.outputs.map((output) => name(output).length));
  const lines = draft.outputs.map((output) => {
    const digests =
      output.is === output.was
        ? output.was.slice(0, 12)
        : `${output.was.slice(0, 12)} → ${output.is?.slice(0, 12) ?? 'none'}`;
    return `  ${name(output).padEnd(width)}   ${output.verdict.padEnd(16)}   ${digests}`;
  });
  const seconds = outcomes.reduce((sum, outcome) => sum + outcome.seconds, 0).toFixed(1);
  const what =
    subject.of.type === 'run' ? `run ${subject.of.run}` : `${subject.of.type} entry ${subject.of.number}`;
  const differences = draft.differences.map((text) => wrapped(text, 100, 2, 2));
  return [
    '',
    ...lines,
    '',
    ...(differences.length > 0 ? [...differences, ''] : []),
    `${verdictSentence(draft.verdict)} (${what}, ${outcomes.length} stages, ${seconds} s; entry ${entry})`,
    '',
  ].join('\n');
}

function verdictSentence(verdict: Verdict): string {
  if (verdict === 'identical') return 'identical: every output has the recorded bytes';
  if (verdict === 'within tolerance')
    return 'within tolerance: every published number is inside its tolerance';
  return 'different';
}
