/** Eight processes append to one book while two read it without pause; and one that dies while it holds its turn. */

import { type ChildProcess, spawn } from 'node:child_process';
import { mkdtempSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { expect, test } from 'vitest';
import { audit } from '../../ledger/audit.ts';
import { openBook } from '../../ledger/book.ts';
import { keyFile, makeBook, stageDraft } from '../ledger/make-book.ts';

const here = dirname(fileURLToPath(import.meta.url));
const WRITERS = 8;
const ENTRIES = 500;
const READERS = 2;

interface Ended {
  readonly status: number | null;
  readonly out: string;
  readonly err: string;
}

function start(program: string, words: readonly string[]): { child: ChildProcess; ended: Promise<Ended> } {
  const child = spawn(process.execPath, [join(here, program), ...words], {
    stdio: ['ignore', 'pipe', 'pipe'],
  });
  let [out, err] = ['', ''];
  child.stdout?.on('data', (data) => {
    out += data;
  });
  child.stderr?.on('data', (data) => {
    err += data;
  });
  const ended = new Promise<Ended>((resolve) =>
    child.once('close', (status) => resolve({ status, out, err })),
  );
  return { child, ended };
}

function newBook(): { directory: string; folder: string } {
  const folder = mkdtempSync(join(tmpdir(), 'platebook-many-'));
  const directory = join(folder, 'book');
  makeBook(directory).close();
  return { directory, folder };
}

test('enters 4,000 whole entries in one order, and no reader ever fails', async () => {
  const { directory } = newBook();
  const began = performance.now();
  const readers = Array.from({ length: READERS }, () => start('read-on.ts', [directory]));
  const writers = Array.from({ length: WRITERS }, (_, i) =>
    start('../ledger/append-many.ts', [directory, String(ENTRIES), `writer ${i}`]),
  );
  for (const { ended } of writers) {
    const { status, out, err } = await ended;
    expect(err).toBe('');
    expect(status).toBe(0);
    expect(out.match(/^entered$/gm)).toHaveLength(ENTRIES);
  }
  const seconds = (performance.now() - began) / 1000;
  for (const { child, ended } of readers) {
    child.kill('SIGTERM');
    const { status, out, err } = await ended;
    expect(err).toBe('');
    expect(status).toBe(0);
    const [rounds, fewest, most] = out.trim().split('\n').at(-1)?.split(' ').map(Number) ?? [];
    console.log(`a reader asked ${rounds} times, the book grew from ${fewest} to ${most} entries`);
    expect(rounds).toBeGreaterThan(10);
    expect(most).toBeGreaterThan(fewest as number);
  }
  console.log(`${WRITERS} writers of ${ENTRIES} entries each: ${seconds.toFixed(1)} s`);

  const book = openBook(directory);
  expect(book.count()).toBe(WRITERS * ENTRIES);
  const names = [...book.entries()].map((entry) => (entry.type === 'stage' ? entry.name : entry.type));
  for (let i = 0; i < WRITERS; i += 1) {
    const own = names.filter((name) => name.startsWith(`writer ${i}-`));
    expect(own).toEqual(Array.from({ length: ENTRIES }, (_, k) => `writer ${i}-${k}`));
  }
  expect(audit(book)).toMatchObject({ verdict: 'sound', entries: WRITERS * ENTRIES, problems: [] });
  book.close();
});

test('waits for nobody who died while it was his turn', async () => {
  const { directory, folder } = newBook();
  let killed = 0;
  for (let round = 0; round < 12; round += 1) {
    const { child, ended } = start('../ledger/append-many.ts', [directory, '100000', `killed ${round}`]);
    await new Promise<void>((resolve) =>
      child.stdout?.on('data', (data) => /entered/.test(String(data)) && resolve()),
    );
    // At another point of an append each time: an append takes some milliseconds.
    await new Promise((resolve) => setTimeout(resolve, 3 + 1.7 * round));
    child.kill('SIGKILL');
    const { status } = await ended;
    if (status === null) killed += 1;
    const began = performance.now();
    const book = openBook(directory, { by: { name: 'A. Keeper' }, key: keyFile(folder) });
    book.append(stageDraft(book));
    expect(performance.now() - began).toBeLessThan(5_000);
    expect(audit(book)).toMatchObject({ verdict: 'sound', problems: [] });
    book.close();
  }
  expect(killed).toBe(12);
});
