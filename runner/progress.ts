/** What a person sees of a run while it goes on: one line per stage as it ends, and on a terminal a line for each stage
 *  that is running. Everything goes to standard error, so that standard output holds results only. */

import type { Io } from './command.ts';
import type { ExecutionReporter } from './execute.ts';
import { findingTexts } from './finding-text.ts';
import type { Job, Outcome } from './job.ts';
import { wrapped } from './wrapped.ts';

/** Milliseconds between two drawings of the running stages. */
const redrawEvery = 120;
const barCells = 20;
/** Columns of text where the terminal does not say, or has more. */
const mostColumns = 100;

export interface ProgressDisplay extends ExecutionReporter {
  /** Ends the drawing; what stands stays. */
  close(): void;
}

/** A display for these jobs. Quiet says nothing; without a terminal each stage has one line, when it ends. */
export async function makeProgress(io: Io, jobs: readonly Job[], quiet: boolean): Promise<ProgressDisplay> {
  const width = Math.max(...jobs.map((job) => job.name.length));
  if (quiet) return { started() {}, progress() {}, ended() {}, close() {} };
  if (!io.terminal) {
    const ended = (outcome: Outcome) => io.err(`${endedLine(outcome, width, mostColumns)}\n`);
    return { started() {}, progress() {}, ended, close() {} };
  }
  return terminalDisplay(io, width);
}

interface Running {
  readonly since: number;
  fraction: number | null;
}

async function terminalDisplay(io: Io, width: number): Promise<ProgressDisplay> {
  const { createLogUpdate } = await import('log-update');
  const running = new Map<string, Running>();
  const draw = createLogUpdate(io.errorStream);
  const columns = () => Math.min(mostColumns, io.errorStream.columns ?? mostColumns);
  const redraw = () =>
    draw([...running].map(([name, state]) => runningLine(name, state, width, columns())).join('\n'));
  const timer = setInterval(redraw, redrawEvery);
  return {
    started(job) {
      running.set(job.name, { since: performance.now(), fraction: null });
      redraw();
    },
    progress(job, fraction) {
      const state = running.get(job.name);
      if (state !== undefined) state.fraction = fraction;
    },
    ended(outcome) {
      running.delete(outcome.name);
      draw.clear();
      io.err(`${endedLine(outcome, width, columns())}\n`);
      redraw();
    },
    close() {
      clearInterval(timer);
      draw.clear();
    },
  };
}

/** With a bar where there is room for one. */
function runningLine(name: string, state: Running, width: number, columns: number): string {
  const seconds = `${((performance.now() - state.since) / 1000).toFixed(0)} s`.padStart(6);
  const cells = 2 + width + 2 + barCells + 5 + 2 + seconds.length < columns ? barCells : 0;
  const room = cells === 0 ? 7 : cells + 5;
  return `  ${name.padEnd(width)}  ${howFar(state.fraction, cells).padEnd(room)}  ${seconds}`;
}

function howFar(fraction: number | null, cells: number): string {
  if (fraction === null) return 'running';
  const full = Math.round(fraction * cells);
  const percent = `${Math.round(fraction * 100)}%`.padStart(4);
  return cells === 0 ? percent : `${'='.repeat(full)}${'.'.repeat(cells - full)} ${percent}`;
}

/** One line, and what the stage wants said below it. */
export function endedLine(outcome: Outcome, width: number, columns: number): string {
  const entry = outcome.entry === null ? '' : `entry ${outcome.entry}`;
  const time =
    outcome.state === 'computed' || outcome.state === 'failed' ? `${outcome.seconds.toFixed(1)} s` : '';
  const wide = `  ${outcome.name.padEnd(width)}  ${outcome.state.padEnd(15)}  ${entry.padEnd(10)} ${time.padStart(8)}`;
  const narrow = `  ${[outcome.name, outcome.state, entry, time].filter((part) => part !== '').join('  ')}`;
  const line = wide.length < columns ? wide : narrow;
  const below = [
    ...findingTexts(outcome.findings),
    ...outcome.warnings.map((warning) => `warning: ${warning}`),
    ...(outcome.stop === null ? [] : [`stopped the run: ${outcome.stop}`]),
    ...(outcome.error === null ? [] : [outcome.error.message]),
  ];
  return [line.trimEnd(), ...below.map((text) => wrapped(text, columns, 4, 2))].join('\n');
}
