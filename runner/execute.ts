/** Executes jobs in the order of their dependencies, side by side within a number of cores, and enters each in the
 *  book. A job whose key stands in the book is carried forward; a job whose upstream failed is not reached. */

import { readFileSync, rmSync } from 'node:fs';
import { join } from 'node:path';
import type { Book } from '../ledger/book.ts';
import { canonicalJson } from '../ledger/canonical.ts';
import { sha256 } from '../ledger/digest.ts';
import type { RecordedCode, StageEntry, StageRecord, StoredFile } from '../ledger/entry.ts';
import type { Format } from '../stages/kind.ts';
import { codeOfKind } from './code-digest.ts';
import { isGood, type Job, madeOutputs, type Outcome, upstreamOf } from './job.ts';
import { confirmUnchanged, mapLists, type ResolvedInput, resolveInputs } from './job-inputs.ts';
import { keepCode } from './recorded-code/keep.ts';
import { makeScratch, removeScratch, runStage, StageFailure, type StageResult } from './stage-process.ts';
import { writeWhole } from './write-whole.ts';

export interface ExecutionReporter {
  started(job: Job): void;
  progress(job: Job, fraction: number): void;
  ended(outcome: Outcome): void;
}

export interface ExecutionOptions {
  readonly book: Book;
  readonly cores: number;
  /** Whether an entry with the same key stands in for the computation. */
  readonly carry: boolean;
  /** Whether computed stages and failures become entries; a rerun only compares. */
  readonly enter: boolean;
  /** Read input files again even where size, times and inode are the remembered ones. */
  readonly strict: boolean;
  readonly engine: string;
  readonly kindsFolder: string;
  readonly signal: AbortSignal;
  readonly reporter: ExecutionReporter;
}

/** Executes all jobs and returns how each ended, in the order of `jobs`. Never throws for a stage that fails.
 *  @throws RunnerProblem, LedgerProblem when an input file cannot be read or the book cannot be written */
export async function execute(jobs: readonly Job[], options: ExecutionOptions): Promise<Outcome[]> {
  const outcomes = new Map<string, Outcome>();
  const running = new Map<string, Promise<Outcome>>();
  const inTurn = longestWayFirst(jobs);
  const settle = (outcome: Outcome) => {
    outcomes.set(outcome.name, outcome);
    options.reporter.ended(outcome);
  };
  try {
    while (outcomes.size < jobs.length) {
      for (const job of inTurn) {
        if (outcomes.has(job.name) || running.has(job.name)) continue;
        const upstream = upstreamOf(job).map((name) => outcomes.get(name));
        if (options.signal.aborted || upstream.some((o) => o && (!isGood(o) || o.stop !== null))) {
          settle(notReached(job));
        } else if (upstream.every((o) => o !== undefined) && running.size < options.cores) {
          running.set(job.name, perform(job, outcomes, options));
        }
      }
      if (running.size === 0) continue;
      const outcome = await Promise.race(running.values());
      running.delete(outcome.name);
      settle(outcome);
    }
  } finally {
    await Promise.allSettled(running.values());
  }
  return jobs.map((job) => outcomes.get(job.name) as Outcome);
}

/** The jobs that most others wait for, one after another, come first; of equal ones the first of the recipe. */
function longestWayFirst(jobs: readonly Job[]): Job[] {
  const ways = new Map<string, number>();
  const wayOf = (job: Job): number => {
    const known = ways.get(job.name);
    if (known !== undefined) return known;
    const waiting = jobs.filter((other) => upstreamOf(other).includes(job.name));
    const way = 1 + Math.max(0, ...waiting.map(wayOf));
    ways.set(job.name, way);
    return way;
  };
  return [...jobs].sort((a, b) => wayOf(b) - wayOf(a));
}

function notReached(job: Job): Outcome {
  return { ...unended(job), state: 'not reached', entry: null };
}

function unended(job: Job) {
  return {
    name: job.name,
    kind: job.kind.kind,
    outputs: {},
    seconds: 0,
    findings: [],
    warnings: [],
    stop: null,
    mark: null,
    error: null,
    codeDigest: null,
  };
}

/** Resolves inputs, looks the key up, runs the stage where nothing stands, enters the result. */
async function perform(
  job: Job,
  outcomes: ReadonlyMap<string, Outcome>,
  options: ExecutionOptions,
): Promise<Outcome> {
  const inputs = resolveInputs(job, outcomes, options);
  const { kindsFolder, book } = options;
  const code = job.program?.code ?? codeOfKind(kindsFolder, job.kind.kind, job.kind.version);
  const known = makeRecord(job, inputs, code);
  const standing = options.carry ? book.findStage(known.key) : undefined;
  if (standing !== undefined) return carriedForward(job, standing);
  const record = options.enter
    ? { ...known, code: keepCode(book.store, kindsFolder, job.kind.kind, code) }
    : known;
  options.reporter.started(job);
  const scratch = makeScratch();
  try {
    const call = {
      kind: job.kind,
      kindsFolder,
      program: job.program ?? null,
      parameters: job.parameters,
      inputs: mapLists(inputs, (input) => input.path),
      outputs: madeOutputs(job.kind, job.inputs, job.parameters),
      engine: job.program?.engine ?? options.engine,
      signal: options.signal,
      onProgress: (fraction: number) => options.reporter.progress(job, fraction),
    };
    const result = await runStage(call, scratch);
    confirmUnchanged(inputs, options);
    return enterStage(job, record, result, options);
  } catch (error) {
    if (!(error instanceof StageFailure)) throw error;
    return enterFailure(job, record, error, options);
  } finally {
    removeScratch(scratch);
  }
}

/** The parts of an entry that are known before the stage runs; the key is the digest of kind, code, inputs and
 *  parameters (design, section 4). */
function makeRecord(
  job: Job,
  inputs: Readonly<Record<string, readonly ResolvedInput[]>>,
  code: RecordedCode,
): StageRecord {
  const recordedInputs = mapLists(inputs, ({ digest, bytes, origin }) => ({ digest, bytes, origin }));
  const key = sha256(
    canonicalJson({
      kind: job.kind.kind,
      code: code.digest,
      inputs: mapLists(inputs, (input) => input.digest),
      parameters: job.recorded,
    }),
  );
  const seed = typeof job.parameters.seed === 'number' ? job.parameters.seed : null;
  return {
    name: job.name,
    kind: job.kind.kind,
    key,
    code,
    inputs: recordedInputs,
    parameters: job.recorded,
    seed,
    seconds: 0,
    peakMemory: 0,
    log: null,
    platform: '',
  };
}

function carriedForward(job: Job, entry: StageEntry): Outcome {
  return {
    ...unended(job),
    state: 'carried forward',
    entry: entry.number,
    outputs: entry.outputs as Outcome['outputs'],
    findings: entry.findings,
    warnings: entry.warnings,
    stop: entry.stop,
    mark: entry.mark,
    codeDigest: entry.code.digest,
  };
}

/** Moves the outputs into the store, then appends the entry that names them. */
function enterStage(job: Job, record: StageRecord, result: StageResult, options: ExecutionOptions): Outcome {
  const { report, seconds, peakMemory, platform } = result;
  const outputs: Record<string, StoredFile & { format: Format }> = {};
  for (const [name, path] of Object.entries(result.outputs)) {
    const format = job.kind.outputs[name]?.format ?? 'file';
    outputs[name] = { ...options.book.store.keepFile(path), format };
  }
  const findings = report.findings ?? [];
  const said = {
    findings,
    warnings: report.warnings ?? [],
    stop: report.stop ?? null,
    mark: report.mark ?? null,
  };
  const ended = { ...unended(job), state: 'computed' as const, outputs, seconds, ...said };
  if (!options.enter) return { ...ended, entry: null, codeDigest: record.code.digest };
  const log = options.book.store.keepFile(result.logFile);
  const facts = { seconds, peakMemory, log, platform };
  const { entry } = options.book.append({ ...record, ...facts, type: 'stage', outputs, ...said });
  layLog(options.book, result.logFile, entry.number, job.name);
  return { ...ended, entry: entry.number, codeDigest: record.code.digest };
}

function enterFailure(
  job: Job,
  record: StageRecord,
  failure: StageFailure,
  options: ExecutionOptions,
): Outcome {
  const { code, message, seconds, peakMemory, platform } = failure;
  const error = { code, message };
  const ended = { ...unended(job), state: 'failed' as const, seconds, error, codeDigest: record.code.digest };
  if (!options.enter) return { ...ended, entry: null };
  const log = failure.logFile === null ? null : options.book.store.keepFile(failure.logFile);
  const facts = { seconds, peakMemory, log, platform };
  const { entry } = options.book.append({ ...record, ...facts, type: 'failure', error });
  if (failure.logFile !== null) layLog(options.book, failure.logFile, entry.number, job.name);
  return { ...ended, entry: entry.number };
}

/** The log lies in the store, where its digest guards it, and under a name that a person finds. Its entry is written by
 *  now: a copy for which there is no room is left out, and no reason to stop. */
function layLog(book: Book, file: string, entry: number, stage: string): void {
  const to = join(book.directory, 'logs', `${entry}-${stage}.jsonl`);
  try {
    writeWhole(to, readFileSync(file));
  } catch {
    rmSync(to, { force: true });
  }
}
