/** Measuring whole processes: time on the wall from start to end, and the most memory. */

import { spawnSync } from 'node:child_process';
import { readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';

export interface Times {
  /** Seconds. */
  readonly least: number;
  readonly median: number;
}

/** Starts Node with some words, waits, and returns seconds and what it printed. @throws Error when it does not end well */
export function timeProcess(
  words: readonly string[],
  env: NodeJS.ProcessEnv = process.env,
): { seconds: number; printed: string } {
  const start = performance.now();
  const { status, stdout, stderr } = spawnSync(process.execPath, words, {
    env,
    encoding: 'utf8',
    maxBuffer: 1 << 28,
  });
  const seconds = (performance.now() - start) / 1000;
  if (status !== 0) throw new Error(`node ${words.join(' ')} ended with ${status}: ${stderr}`);
  return { seconds, printed: stdout };
}

/** Times a process and a bare start of Node in turn, so that both meet the same load. The first of each is not counted. */
export function compareToBareStart(
  words: readonly string[],
  repetitions: number,
): { own: Times; bare: Times } {
  const own: number[] = [];
  const bare: number[] = [];
  for (let i = 0; i <= repetitions; i += 1) {
    bare.push(timeProcess(['-e', '0']).seconds);
    own.push(timeProcess(words).seconds);
  }
  return { own: timesOf(own.slice(1)), bare: timesOf(bare.slice(1)) };
}

/** The most memory that a process has, in bytes. */
export function memoryOf(words: readonly string[]): number {
  const file = join(tmpdir(), `platebook-memory-${process.pid}`);
  const report = fileURLToPath(new URL('report-memory.ts', import.meta.url));
  const { PLATEBOOK_BENCH_MEMORY: _, ...env } = process.env;
  timeProcess(['--import', report, ...words], { ...env, PLATEBOOK_BENCH_MEMORY: file });
  const bytes = Number(readFileSync(file, 'utf8'));
  rmSync(file);
  return bytes;
}

/** Least and median of some seconds. */
export function timesOf(seconds: readonly number[]): Times {
  const sorted = seconds.toSorted((a, b) => a - b);
  return { least: sorted[0] ?? Number.NaN, median: sorted[sorted.length >> 1] ?? Number.NaN };
}
