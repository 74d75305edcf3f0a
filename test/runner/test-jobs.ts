/** Jobs of the test kinds, a book in a temporary directory, and an execution of them. */

import { mkdtempSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { type Book, openBook } from '../../ledger/book.ts';
import type { Json } from '../../ledger/entry.ts';
import { type ExecutionOptions, execute } from '../../runner/execute.ts';
import type { Job, JobInput, Outcome } from '../../runner/job.ts';
import type { StageKind } from '../../stages/kind.ts';

export const testKinds = join(dirname(dirname(fileURLToPath(import.meta.url))), 'data', 'kinds');

export function temporaryFolder(): string {
  return mkdtempSync(join(tmpdir(), 'platebook-test-'));
}

export function temporaryBook(folder = temporaryFolder()): Book {
  return openBook(join(folder, 'book'), { by: { name: 'A. Tester' }, create: true });
}

export function makeJob(
  name: string,
  kind: StageKind,
  inputs: Record<string, readonly JobInput[]>,
  parameters: Record<string, Json>,
): Job {
  return { name, kind, inputs, parameters, recorded: parameters };
}

export function executeJobs(
  jobs: readonly Job[],
  book: Book,
  options: Partial<ExecutionOptions> = {},
): Promise<Outcome[]> {
  return execute(jobs, {
    book,
    cores: 2,
    carry: true,
    enter: true,
    strict: false,
    engine: process.execPath,
    kindsFolder: testKinds,
    signal: new AbortController().signal,
    reporter: { started() {}, progress() {}, ended() {} },
    ...options,
  });
}
