/** The process of one stage: `node --permission … stage-child.ts ASSIGNMENT`. It can read its declared inputs and the
 *  program, write its scratch directory, and nothing else: files by the runtime's permission model, the network by
 *  what stands at the top of this file, the environment by starting with an empty one.
 *
 *  Progress goes to standard output, one number a line; everything else into the files that the assignment names. */

import { readFileSync, writeFileSync } from 'node:fs';
import { registerHooks } from 'node:module';
import { pathToFileURL } from 'node:url';
import { pino } from 'pino';
import type { StageKind, StageReport, StageTask } from '../stages/kind.ts';
import { InputProblem, InternalError } from '../stages/problem.ts';
import { fileSink, fileSource } from './byte-files.ts';
import { type Assignment, type ProcessReport, stoppedStatus } from './stage-assignment.ts';

const networkModules =
  /^(node:)?(net|http|https|http2|dgram|dns|tls|quic|inspector|cluster|_http_\w+|_tls_\w+)(\/|$)/;

function refuseNetwork(): void {
  const refuse = (what: string): never => {
    throw new InputProblem({
      code: 'network',
      place: what,
      expected: 'a stage that reads only its declared inputs',
      found: 'an attempt to reach the network',
      advice: 'Fetch the data first and declare the file as an input.',
    });
  };
  registerHooks({
    resolve(specifier, context, next) {
      return networkModules.test(specifier) ? refuse(specifier) : next(specifier, context);
    },
  });
  const builtin = process.getBuiltinModule;
  process.getBuiltinModule = ((name: string) =>
    networkModules.test(name) ? refuse(name) : builtin.call(process, name)) as typeof builtin;
  for (const name of ['fetch', 'WebSocket', 'EventSource', 'XMLHttpRequest']) {
    Object.defineProperty(globalThis, name, { get: () => refuse(name), configurable: false });
  }
}

async function perform(assignment: Assignment): Promise<StageReport> {
  const log = pino({ base: null }, pino.destination({ dest: assignment.logFile, sync: true }));
  const kind = await loadKind(assignment);
  log.info({ kind: kind.kind, version: kind.version }, 'started');
  const sinks = Object.entries(assignment.outputs).map(([name, path]) => ({ name, sink: fileSink(path) }));
  const task: StageTask = {
    inputs: Object.fromEntries(
      Object.entries(assignment.inputs).map(([name, paths]) => [
        name,
        paths.map((path, i) => fileSource(path, paths.length === 1 ? name : `${name}[${i}]`)),
      ]),
    ),
    parameters: assignment.parameters,
    outputs: Object.fromEntries(sinks.map(({ name, sink }) => [name, sink])),
    note: (message, fields) => log.info(fields ?? {}, message),
    progress: (fraction) => process.stdout.write(`${fraction}\n`),
  };
  const { compute } = await kind.load();
  const report = await compute(task);
  for (const { name, sink } of sinks) {
    if (sink.close() === 0) throw new InternalError(kind.kind, `output ${name} was not written`);
  }
  for (const warning of report.warnings ?? []) log.warn(warning);
  log.info('done');
  return report;
}

async function loadKind(assignment: Assignment): Promise<StageKind> {
  const module: Record<string, StageKind> = await import(pathToFileURL(assignment.kindFile).href);
  const found = Object.values(module).find((value) => value?.kind === assignment.kind);
  if (found === undefined) throw new InternalError('loadKind', `${assignment.kind} is not in its own folder`);
  return found;
}

function describeError(error: unknown): { code: string; message: string; detail: string } {
  const detail = error instanceof Error ? (error.stack ?? '') : '';
  if (isInputProblem(error)) return { code: error.code, message: error.message, detail };
  const denied = error as { code?: string; permission?: string; resource?: string };
  if (denied?.code === 'ERR_ACCESS_DENIED') {
    const message =
      `undeclared access: expected a stage that touches only its declared inputs and outputs, got ` +
      `${denied.permission ?? 'an access'}${denied.resource ? ` of ${denied.resource}` : ''}. ` +
      `Declare the file as an input of the stage.`;
    return { code: 'undeclared-access', message, detail };
  }
  const text = error instanceof Error ? error.message : String(error);
  return { code: 'internal', message: `The stage stopped with an error of its own: ${text}`, detail };
}

/** By its name too: the problem of a restored program is made by a class of that program. */
function isInputProblem(error: unknown): error is InputProblem {
  if (error instanceof InputProblem) return true;
  const like = error as Partial<InputProblem> | null;
  return error instanceof Error && error.name === 'InputProblem' && typeof like?.code === 'string';
}

function writeReport(file: string, report: ProcessReport): void {
  writeFileSync(file, JSON.stringify(report));
}

function processFacts() {
  return {
    peakMemory: process.resourceUsage().maxRSS * 1024,
    platform: `${process.platform}-${process.arch}`,
  };
}

refuseNetwork();
const assignment: Assignment = JSON.parse(readFileSync(process.argv[2] ?? '', 'utf8'));
try {
  const report = await perform(assignment);
  writeReport(assignment.reportFile, { done: true, report, ...processFacts() });
} catch (error) {
  writeReport(assignment.reportFile, { done: false, error: describeError(error), ...processFacts() });
  process.exitCode = stoppedStatus;
}
