/** Runs one stage in a process of its own, under the runtime's permission model and with an empty environment. */

import { mkdirSync, mkdtempSync, readFileSync, realpathSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { createInterface } from 'node:readline';
import type { execa } from 'execa';
import type { StageKind, StageReport } from '../stages/kind.ts';
import type { RestoredProgram } from './job.ts';
import { modulesFolder, packageRoot, sourceExtension, sourceRoot } from './program.ts';
import type { Assignment, ProcessReport } from './stage-assignment.ts';
import { strippedSources } from './stripped-sources.ts';

export interface StageCall {
  readonly kind: StageKind;
  /** The folder that holds KIND/KIND.ts. */
  readonly kindsFolder: string;
  /** A restored program that holds the kind instead. */
  readonly program: RestoredProgram | null;
  readonly parameters: Readonly<Record<string, unknown>>;
  /** Absolute paths by input name. */
  readonly inputs: Readonly<Record<string, readonly string[]>>;
  /** Names of the outputs to be made. */
  readonly outputs: readonly string[];
  /** The Node executable. */
  readonly engine: string;
  readonly signal: AbortSignal;
  readonly onProgress: (fraction: number) => void;
}

export interface StageResult {
  readonly report: StageReport;
  /** Files made, by output name, in the scratch directory. */
  readonly outputs: Readonly<Record<string, string>>;
  readonly logFile: string;
  readonly seconds: number;
  readonly peakMemory: number;
  readonly platform: string;
}

/** A stage that ran and stopped, with what its entry says of it. */
export class StageFailure extends Error {
  override readonly name = 'StageFailure';
  readonly code: string;
  readonly logFile: string | null;
  readonly seconds: number;
  readonly peakMemory: number;
  readonly platform: string;

  constructor(
    code: string,
    message: string,
    facts: { logFile: string | null; seconds: number; peakMemory: number; platform: string },
  ) {
    super(message);
    this.code = code;
    this.logFile = facts.logFile;
    this.seconds = facts.seconds;
    this.peakMemory = facts.peakMemory;
    this.platform = facts.platform;
  }
}

/** A new scratch directory, outside the book, by its real path (permissions are granted on real paths). */
export function makeScratch(): string {
  return realpathSync(mkdtempSync(join(tmpdir(), 'platebook-')));
}

export function removeScratch(scratch: string): void {
  rmSync(scratch, { recursive: true, force: true });
}

/** Runs the stage; its files lie below `scratch` until the caller has taken them.
 *  @throws StageFailure when the stage stopped with an error, was stopped, or died */
export async function runStage(call: StageCall, scratch: string): Promise<StageResult> {
  const assignment = writeAssignment(call, scratch);
  const started = performance.now();
  const { execa } = await import('execa');
  const child = startChild(execa, call, assignment.path, scratch);
  const lines = createInterface({ input: child.stdout });
  lines.on('line', (line) => {
    const fraction = Number(line);
    if (fraction >= 0 && fraction <= 1) call.onProgress(fraction);
  });
  const ended = await child;
  const seconds = Math.round(performance.now() - started) / 1000;
  const report = readReport(assignment.content.reportFile);
  const logFile = existingLog(assignment.content.logFile);
  if (report?.done === true) {
    return { ...report, outputs: assignment.content.outputs, logFile: assignment.content.logFile, seconds };
  }
  const facts = {
    logFile,
    seconds,
    peakMemory: report?.peakMemory ?? 0,
    platform: report?.platform ?? `${process.platform}-${process.arch}`,
  };
  if (call.signal.aborted) throw new StageFailure('interrupted', 'The run was interrupted.', facts);
  if (report !== null) {
    appendDetail(logFile, report.error.detail);
    throw new StageFailure(report.error.code, report.error.message, facts);
  }
  const how = ended.signal ? `by ${ended.signal}` : `with status ${ended.exitCode}`;
  const said = String(ended.stderr ?? '').trim();
  throw new StageFailure(
    'died',
    `The stage's process ended ${how}${lastLines(said)}. If it ran out of memory, ask for less at a time.`,
    facts,
  );
}

const childFile = join(sourceRoot, 'runner', `stage-child${sourceExtension}`);
const startFile = join(packageRoot, 'bin', 'stage.js');

/** Assignment, sources, outputs, log and report each have a fixed place below the scratch directory. */
function writeAssignment(call: StageCall, scratch: string): { path: string; content: Assignment } {
  mkdirSync(join(scratch, 'outputs'));
  const content: Assignment = {
    kindFile:
      call.program?.kindFile ?? join(call.kindsFolder, call.kind.kind, `${call.kind.kind}${sourceExtension}`),
    kind: call.kind.kind,
    parameters: call.parameters,
    inputs: call.inputs,
    outputs: Object.fromEntries(call.outputs.map((name) => [name, join(scratch, 'outputs', name)])),
    reportFile: join(scratch, 'report.json'),
    logFile: join(scratch, 'log.jsonl'),
  };
  const path = join(scratch, 'assignment.json');
  writeFileSync(path, JSON.stringify(content));
  // A recorded kind has its types taken out by the runtime of its own release.
  const entries = call.program === null ? [childFile, content.kindFile] : [childFile];
  writeFileSync(join(scratch, 'sources.json'), JSON.stringify(strippedSources(entries)));
  return { path, content };
}

function startChild(start: typeof execa, call: StageCall, assignment: string, scratch: string) {
  const readable = [
    join(sourceRoot, 'runner'),
    join(sourceRoot, 'stages'),
    ...(call.program?.readable ?? [call.kindsFolder]),
    modulesFolder(),
    join(packageRoot, 'package.json'),
    startFile,
    scratch,
    ...Object.values(call.inputs).flat(),
  ];
  // A folder of packages may be a link: modules are looked up through it and read where it leads.
  const permissions = [...new Set(readable.flatMap((path) => [path, realpathSync(path)]))].map(
    (path) => `--allow-fs-read=${path}`,
  );
  const words = [
    '--permission',
    ...permissions,
    `--allow-fs-write=${scratch}`,
    '--disable-warning=SecurityWarning',
    startFile,
    childFile,
    assignment,
  ];
  return start(call.engine, words, {
    cwd: dirname(assignment),
    env: { TZ: 'UTC', LC_ALL: 'C' },
    extendEnv: false,
    stdin: 'ignore',
    stdout: 'pipe',
    stderr: 'pipe',
    buffer: { stdout: false, stderr: true },
    reject: false,
    cleanup: true,
    detached: false,
    cancelSignal: call.signal,
    forceKillAfterDelay: 1000,
  });
}

function readReport(file: string): ProcessReport | null {
  try {
    return JSON.parse(readFileSync(file, 'utf8'));
  } catch {
    return null;
  }
}

function existingLog(file: string): string | null {
  try {
    readFileSync(file);
    return file;
  } catch {
    return null;
  }
}

/** The stack of an error goes into the log, never to the terminal. */
function appendDetail(logFile: string | null, detail: string): void {
  if (logFile === null || detail === '') return;
  writeFileSync(logFile, `${JSON.stringify({ level: 50, msg: 'stopped', detail })}\n`, { flag: 'a' });
}

function lastLines(said: string): string {
  if (said === '') return '';
  return `, saying "${said.split('\n').slice(0, 3).join(' ').slice(0, 300)}"`;
}
