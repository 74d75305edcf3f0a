import { existsSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { setTimeout } from 'node:timers/promises';
import { describe, expect, it } from 'vitest';
import type { Job } from '../../runner/job.ts';
import { add } from '../data/kinds/add/add.ts';
import { callOut } from '../data/kinds/call-out/call-out.ts';
import { linger } from '../data/kinds/linger/linger.ts';
import { trespass } from '../data/kinds/trespass/trespass.ts';
import { executeJobs, makeJob, temporaryBook, temporaryFolder } from './test-jobs.ts';

function addJob(name: string, from: string[], term = 1): Job {
  const inputs = { data: from.map((stage) => ({ from: 'stage' as const, stage, output: 'sum' })) };
  return makeJob(name, add, inputs, { term, length: 0 });
}

describe('execute', () => {
  it('computes jobs after those they take from, and enters each', async () => {
    const book = temporaryBook();
    const jobs = [
      addJob('third', ['first', 'second'], 10),
      addJob('first', [], 1),
      addJob('second', ['first'], 2),
    ];
    const outcomes = await executeJobs(jobs, book);
    const third = outcomes[0];
    expect(outcomes.map((o) => o.state)).toEqual(['computed', 'computed', 'computed']);
    expect(book.store.read(third?.outputs.sum?.digest ?? '').toString()).toBe('14\n');
    const entry = book.entry(third?.entry ?? 0);
    expect(entry).toMatchObject({
      type: 'stage',
      name: 'third',
      kind: 'add',
      parameters: { term: 10, length: 0 },
    });
    book.close();
  });

  it('carries forward what stands, by key, and computes what changed and what follows from it', async () => {
    const book = temporaryBook();
    const chain = (term: number) => [addJob('a', [], 1), addJob('b', ['a'], term), addJob('c', ['b'], 0)];
    await executeJobs(chain(1), book);
    const again = await executeJobs(chain(1), book);
    expect(again.map((o) => o.state)).toEqual(['carried forward', 'carried forward', 'carried forward']);
    const changed = await executeJobs(chain(2), book);
    expect(changed.map((o) => o.state)).toEqual(['carried forward', 'computed', 'computed']);
    const afresh = await executeJobs(chain(2), book, { carry: false });
    expect(afresh.map((o) => o.state)).toEqual(['computed', 'computed', 'computed']);
    expect(afresh[2]?.outputs).toEqual(changed[2]?.outputs);
    book.close();
  });

  it('starts first what most wait for, one after another', async () => {
    const book = temporaryBook();
    const started: string[] = [];
    const jobs = [
      addJob('alone', [], 1),
      addJob('after', ['first'], 2),
      addJob('first', [], 3),
      addJob('last', ['after'], 4),
      addJob('beside', [], 5),
    ];
    const reporter = { started: ({ name }: Job) => void started.push(name), progress() {}, ended() {} };
    await executeJobs(jobs, book, { cores: 1, reporter });
    expect(started).toEqual(['first', 'after', 'alone', 'last', 'beside']);
    book.close();
  });

  it('gives another key to other bytes of an input file', async () => {
    const folder = temporaryFolder();
    const book = temporaryBook(folder);
    const path = join(folder, 'number.txt');
    const file = { from: 'file' as const, given: 'number.txt', path, keep: false, expected: null };
    const jobs = [makeJob('a', add, { data: [file] }, { term: 1, length: 0 })];
    writeFileSync(path, '5');
    const first = await executeJobs(jobs, book);
    writeFileSync(path, '6');
    const second = await executeJobs(jobs, book);
    expect([...first, ...second].map((o) => o.state)).toEqual(['computed', 'computed']);
    writeFileSync(path, '5');
    expect((await executeJobs(jobs, book))[0]?.entry).toBe(first[0]?.entry);
    const entry = book.entry(first[0]?.entry ?? 0);
    expect(entry?.type === 'stage' && entry.inputs.data?.[0]?.origin).toEqual({ file: 'number.txt' });
    book.close();
  });

  it('enters a failure and does not reach what depends on it', async () => {
    const book = temporaryBook();
    const failing = makeJob('failing', trespass, {}, { path: '/etc/hostname', how: 'read' });
    const dependent = makeJob(
      'dependent',
      add,
      { data: [{ from: 'stage', stage: 'failing', output: 'loot' }] },
      {},
    );
    const outcomes = await executeJobs([failing, dependent, addJob('other', [])], book);
    expect(outcomes.map((o) => o.state)).toEqual(['failed', 'not reached', 'computed']);
    expect(book.entry(outcomes[0]?.entry ?? 0)?.type).toBe('failure');
    book.close();
  });
});

describe('a stage in its process', () => {
  async function fail(how: string, path: string) {
    const book = temporaryBook();
    const [outcome] = await executeJobs([makeJob('x', trespass, {}, { path, how })], book);
    const entry = book.entry(outcome?.entry ?? 0);
    book.close();
    return entry?.type === 'failure' ? entry.error : entry;
  }

  it('is refused an undeclared file, and the entry says so', async () => {
    const path = join(temporaryFolder(), 'secret.txt');
    writeFileSync(path, 'secret');
    expect(await fail('read', path)).toEqual({
      code: 'undeclared-access',
      message:
        `undeclared access: expected a stage that touches only its declared inputs and outputs, got FileSystemRead of ${path}. ` +
        'Declare the file as an input of the stage.',
    });
  });

  it('is refused a file outside its scratch directory, another process and a worker', async () => {
    const path = join(temporaryFolder(), 'new.txt');
    expect(await fail('write', path)).toMatchObject({ code: 'undeclared-access' });
    expect(existsSync(path)).toBe(false);
    expect(await fail('start', '/etc/hostname')).toMatchObject({ code: 'undeclared-access' });
    expect(await fail('worker', '-')).toMatchObject({ code: 'undeclared-access' });
  });

  it('is refused the network in every way, and has an empty environment', async () => {
    const book = temporaryBook();
    for (const way of ['import', 'builtin', 'fetch']) {
      const [outcome] = await executeJobs([makeJob('x', callOut, {}, { way })], book);
      expect(outcome?.error?.code, way).toBe('network');
    }
    const [outcome] = await executeJobs([makeJob('x', callOut, {}, { way: 'none' })], book);
    const environment = JSON.parse(book.store.read(outcome?.outputs.environment?.digest ?? '').toString());
    expect(environment).toEqual({ TZ: 'UTC', LC_ALL: 'C' });
    book.close();
  });

  it('is ended when the run is interrupted, and leaves a failure', async () => {
    const book = temporaryBook();
    const interruption = new AbortController();
    const jobs = [makeJob('slow', linger, {}, { time: 60 }), makeJob('next', linger, {}, { time: 0 })];
    const running = executeJobs(jobs, book, { signal: interruption.signal, cores: 1 });
    await setTimeout(400);
    interruption.abort();
    const outcomes = await running;
    expect(outcomes.map((o) => [o.state, o.error?.code])).toEqual([
      ['failed', 'interrupted'],
      ['not reached', undefined],
    ]);
    book.close();
  });

  it('keeps what it said in the book', async () => {
    const book = temporaryBook();
    const [outcome] = await executeJobs([addJob('a', [], 2e6)], book);
    const entry = book.entry(outcome?.entry ?? 0);
    if (entry?.type !== 'stage' || entry.log === null) throw new Error('no log');
    const log = book.store.read(entry.log.digest).toString().trim().split('\n');
    expect(log.map((line) => JSON.parse(line).msg)).toEqual(['started', 'a large sum', 'done']);
    expect(entry.warnings).toEqual(['a large sum']);
    expect(entry.peakMemory).toBeGreaterThan(1e7);
    book.close();
  });
});
