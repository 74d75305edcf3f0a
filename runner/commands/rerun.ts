/** `rerun WHAT`: executes again what an entry, a plate or a run records, or what a bag holds, and compares byte for byte.
 *  In a book the comparison becomes an entry of its own; a bag is executed into a temporary book that goes afterwards.
 *
 *  The installed code computes, and what differs from the record is said. `--as-recorded` computes with the recorded code
 *  from the store. Code that comes out of a bag runs only with `--trust-code`, after saying whose it is. */

import { dirname, resolve } from 'node:path';
import { type Book, openBook } from '../../ledger/book.ts';
import type { PublishedNumber, RecordedInput, RerunDraft, StageEntry } from '../../ledger/entry.ts';
import { findRunOfStage } from '../../ledger/find.ts';
import { findSubject } from '../../ledger/subject.ts';
import type { StageKind } from '../../stages/kind.ts';
import { stageKinds } from '../../stages/kinds.ts';
import { isBag, withBagBook } from '../bag/bag-book.ts';
import { withdrawalsIn } from '../bag/gather.ts';
import type { Bag } from '../bag/open-bag.ts';
import { codeOfKind } from '../code-digest.ts';
import type { CommonOptions, ExitStatus, Io } from '../command.ts';
import { type ComparedOutput, compareStage, overallVerdict } from '../compare-outputs.ts';
import { keyFile, writer } from '../configuration.ts';
import { execute } from '../execute.ts';
import type { Job, JobInput, Outcome, RestoredProgram } from '../job.ts';
import { RunnerProblem } from '../problem.ts';
import { kindsFolder, stageEngine } from '../program.ts';
import { makeProgress } from '../progress.ts';
import { untrustedCode, writersOf } from '../recorded-code/problem.ts';
import { plainRecorded, recordedKind } from '../recorded-code/recorded-kind.ts';
import { restorePrograms } from '../recorded-code/restore.ts';
import { filledParameters } from '../recorded-parameters.ts';
import {
  nearestEntry,
  nothingToRerun,
  type RerunSubject,
  stageEntry,
  stagesOfRun,
  withUpstream,
} from './rerun-subject.ts';
import { rerunText } from './rerun-text.ts';

export interface RerunOptions extends CommonOptions {
  readonly cores: number;
  readonly by?: string;
  /** Compute with the recorded code and runtime where the installed ones differ. */
  readonly asRecorded?: boolean;
  /** Run code that comes out of a bag. */
  readonly trustCode?: boolean;
  readonly signal: AbortSignal;
}

export async function rerunCommand(
  words: readonly string[],
  options: RerunOptions,
  io: Io,
): Promise<ExitStatus> {
  const [directory] = words;
  if (words.length === 1 && directory !== undefined && isBag(resolve(io.cwd, directory))) {
    return rerunBag(directory, options, io);
  }
  if (options.trustCode === true) {
    const message = `--trust-code: expected a bag, got ${words.join(' ')}. The code in a book is its keeper’s: use --as-recorded.`;
    throw new RunnerProblem('bad-call', message, {}, 2);
  }
  return rerunInBook(words, options, io);
}

async function rerunInBook(words: readonly string[], options: RerunOptions, io: Io): Promise<ExitStatus> {
  const book = openBook(options.book, {
    by: await writer(io, options.by),
    key: keyFile(io),
    announce: (text) => io.err(`${text}\n`),
  });
  try {
    const subject = findInBook(book, words, io);
    const recorded = options.asRecorded === true ? differing(subject.stages) : [];
    const read = (digest: string) => book.store.read(digest);
    const outcomes = await executeAgain({ subject, book, recorded, read }, options, io);
    const draft = compare(subject, outcomes, book);
    const { entry } = book.append(draft);
    say({ subject, draft, outcomes, where: `entry ${entry.number}`, entry: entry.number }, options, io);
    return draft.verdict === 'different' ? 1 : 0;
  } finally {
    book.close();
  }
}

function findInBook(book: Book, words: readonly string[], io: Io): RerunSubject {
  const asked = findSubject(book, words, io.cwd);
  const of = book.entry(nearestEntry(asked));
  const entryOf = (number: number) => book.entry(number);
  if (of.type === 'run') return { of, run: of, stages: stagesOfRun(of, entryOf) };
  if (of.type !== 'stage' && of.type !== 'plate') throw nothingToRerun(`entry ${of.number}`, `a ${of.type}`);
  const stage = of.type === 'stage' ? of : stageEntry(of.drawn, entryOf);
  const alone = asked.type === 'entry' && of.type === 'stage';
  const stages = alone ? [stage] : withUpstream(stage, entryOf);
  return { of, run: findRunOfStage(book, stage.number) ?? null, stages };
}

/** Executes what a bag holds. The bag is checked whole before anything of it is used. */
async function rerunBag(directory: string, options: RerunOptions, io: Io): Promise<ExitStatus> {
  return withBagBook(resolve(io.cwd, directory), async ({ bag, book, subject, read }) => {
    const others = differing(subject.stages);
    if (!options.quiet && !options.json) io.err(`${sealText(bag)}\n`);
    for (const { withdraws, reason } of withdrawalsIn(bag.entries.values())) {
      io.err(`Withdrawn: entry ${withdraws}. ${reason}\n`);
    }
    if (options.asRecorded === true && options.trustCode !== true && others.length > 0)
      throw untrustedCode(others);
    const recorded = options.trustCode === true ? others : [];
    if (recorded.length > 0) io.err(`${trustText(recorded)}\n`);
    const outcomes = await executeAgain({ subject, book, recorded, read }, options, io);
    const draft = compare(subject, outcomes, book);
    const hints = others.length > recorded.length ? [hintText(others)] : [];
    const said = { ...draft, differences: [...draft.differences, ...hints] };
    const where = `from the bag ${directory}, ${bag.size.files} files, of the book ${bag.book}`;
    say({ subject, draft: said, outcomes, where, entry: null }, options, io);
    return draft.verdict === 'different' ? 1 : 0;
  });
}

/** What the proofs show. Whose key it is, only the reader can know. */
function sealText({ proofs, entries, book }: Bag): string {
  const [proof] = proofs.values();
  if (proof === undefined)
    return `The bag is whole; it has no proof that its entries stand in the book ${book}.`;
  return `The bag is whole; its ${entries.size} entries are under a seal of ${proof.time} with the key ${proof.key}`;
}

function trustText(stages: readonly StageEntry[]): string {
  const names = stages.map(({ name }) => name).join(', ');
  return (
    `The installed code is not the recorded one, so code out of the bag computes ${names}. ` +
    `Its entries were written by ${writersOf(stages)}; it has no network and reads its inputs only.`
  );
}

function hintText(stages: readonly StageEntry[]): string {
  return `--trust-code computes with the code in the bag instead; its entries were written by ${writersOf(stages)}`;
}

/** Stages whose recorded code is not the installed one. */
function differing(stages: readonly StageEntry[]): StageEntry[] {
  return stages.filter((stage) => {
    const kind = stageKinds.find((each) => each.kind === stage.kind);
    return (
      kind === undefined || codeOfKind(kindsFolder, kind.kind, kind.version).digest !== stage.code.digest
    );
  });
}

interface Again {
  readonly subject: RerunSubject;
  readonly book: Book;
  /** Stages that recorded code computes. */
  readonly recorded: readonly StageEntry[];
  /** Bytes of recorded code. */
  readonly read: (digest: string) => Uint8Array;
}

async function executeAgain(
  { subject, book, recorded, read }: Again,
  options: RerunOptions,
  io: Io,
): Promise<Outcome[]> {
  const engine = stageEngine(io.env);
  const restoration = await restorePrograms({ stages: recorded, read, engine });
  try {
    const folder = resolve(io.cwd, dirname(subject.run?.recipe.path ?? '.'));
    const jobs = subject.stages.map((stage) =>
      jobOf(stage, { all: subject.stages, folder, book, program: restoration.programs.get(stage.number) }),
    );
    const progress = await makeProgress(io, jobs, options.quiet || options.json);
    return await execute(jobs, {
      book,
      cores: options.cores,
      carry: false,
      enter: false,
      strict: true,
      engine,
      kindsFolder,
      signal: options.signal,
      reporter: progress,
    }).finally(() => progress.close());
  } finally {
    restoration.remove();
  }
}

interface JobPlace {
  readonly all: readonly StageEntry[];
  readonly folder: string;
  readonly book: Book;
  readonly program: RestoredProgram | undefined;
}

/** The job of a recorded stage: from the rerun's own results where they are made again, else from the store, and for
 *  files that are not in it from where the recipe of the run named them. */
function jobOf(stage: StageEntry, { all, folder, book, program }: JobPlace): Job {
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
  const inputs = Object.fromEntries(
    Object.entries(stage.inputs).map(([name, list]) => [name, list.map(input)]),
  );
  const named = { name: stage.name, inputs, recorded: stage.parameters };
  if (program !== undefined) {
    const parameters = plainRecorded(stage.parameters) as Job['parameters'];
    return { ...named, kind: recordedKind(stage), parameters, program };
  }
  const kind = findKind(stage);
  return { ...named, kind, parameters: filledParameters(kind.parameters, stage.parameters).parameters };
}

/** Parameters that the kind has had only since. */
function addedSince(stage: StageEntry): readonly string[] {
  const kind = stageKinds.find((each) => each.kind === stage.kind);
  return kind === undefined ? [] : filledParameters(kind.parameters, stage.parameters).added;
}

function findKind(stage: StageEntry): StageKind {
  const kind = stageKinds.find((each) => each.kind === stage.kind);
  if (kind !== undefined) return kind;
  const message = `entry ${stage.number}: expected a kind of this program, got ${stage.kind}. Use the program that made it.`;
  throw new RunnerProblem('unknown-kind', message, {}, 1);
}

function compare(subject: RerunSubject, outcomes: readonly Outcome[], book: Book): RerunDraft {
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
    const added = addedSince(stage);
    if (added.length > 0 && outcome.codeDigest !== stage.code.digest) {
      differences.push(
        `${stage.name}: the kind has had ${added.join(', ')} only since (entry ${stage.number}); the ${added.length === 1 ? 'default holds' : 'defaults hold'}`,
      );
    }
    if (outcome.error !== null) differences.push(`${stage.name}: ${outcome.error.message}`);
  });
  const verdict = overallVerdict(outputs, published);
  return { type: 'rerun', of: subject.of.number, verdict, outputs, differences };
}

/** The published numbers that the stages executed again hold. */
function publishedBy(subject: RerunSubject): PublishedNumber[] {
  const numbers = new Set(subject.stages.map((stage) => stage.number));
  return (subject.run?.numbers ?? []).filter((number) => numbers.has(number.entry));
}

interface Result {
  readonly subject: RerunSubject;
  readonly draft: RerunDraft;
  readonly outcomes: readonly Outcome[];
  readonly where: string;
  /** The comparison's own entry; null when there is none. */
  readonly entry: number | null;
}

function say({ subject, draft, outcomes, where, entry }: Result, options: RerunOptions, io: Io): void {
  const { verdict, outputs, differences } = draft;
  const document = { verdict, run: subject.run?.run ?? null, outputs, differences, entry };
  if (options.json) io.out(`${JSON.stringify(document, null, 2)}\n`);
  else if (!options.quiet) io.out(rerunText(subject, draft, where, outcomes));
}
