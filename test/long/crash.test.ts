/** Whatever the moment of a crash: the book opens, every entry in it is whole, and it audits sound. */

import { spawn } from 'node:child_process';
import { once } from 'node:events';
import { appendFileSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { audit } from '../../ledger/audit.ts';
import { type Book, openBook } from '../../ledger/book.ts';
import { keyFile, makeBook, runDraft, stageDraft, temporary } from '../ledger/make-book.ts';

const APPEND_MANY = fileURLToPath(new URL('../ledger/append-many.ts', import.meta.url));

let directory: string;
let remove: () => void;
let book: Book;

beforeEach(() => {
  const made = temporary();
  remove = made.remove;
  directory = join(made.directory, 'book');
  book = makeBook(directory);
});

afterEach(() => {
  book.close();
  remove();
});

/** Opens the book anew, and returns it with what it announced. */
function reopen(): { opened: Book; said: string[] } {
  const said: string[] = [];
  return {
    opened: openBook(directory, {
      by: { name: 'A. Keeper' },
      key: keyFile(dirname(directory)),
      announce: (text) => said.push(text),
    }),
    said,
  };
}

const read = (file: string) => readFileSync(join(directory, file));
const torn = () => readdirSync(directory).filter((name) => name.startsWith('torn-'));

describe('a crash between line and seal', () => {
  test('leaves an entry that is sealed when the book is opened', () => {
    book.append(stageDraft(book));
    const seal = read('seals/latest');
    book.append(stageDraft(book, { name: 'late' }));
    writeFileSync(join(directory, 'seals/latest'), seal);
    const { opened, said } = reopen();
    expect(said).toEqual([
      'Entry 2 was written whole when its writer was interrupted: it stands, and is now sealed.',
    ]);
    expect(opened.entry(2)).toMatchObject({ name: 'late' });
    expect(audit(opened)).toMatchObject({ verdict: 'sound', entries: 2, remarks: [] });
    opened.close();
    expect(torn()).toEqual([]);
  });

  test('does not matter to a reader that had the book open, nor to a writer', () => {
    book.append(stageDraft(book));
    const seal = read('seals/latest');
    const other = makeBook(directory);
    other.append(stageDraft(other, { name: 'late' }));
    other.close();
    writeFileSync(join(directory, 'seals/latest'), seal);
    expect(book.append(runDraft(book, [1])).entry.number).toBe(3);
    expect(audit(book).verdict).toBe('sound');
  });
});

describe('a crash while a line is written', () => {
  test.each([
    ['a part of a line', (line: Buffer) => line.subarray(0, 100)],
    ['all but the line feed', (line: Buffer) => line.subarray(0, -1)],
    ['zeros', (line: Buffer) => Buffer.alloc(line.length)],
    ['a line that is no entry', () => Buffer.from('{"a":1}\n')],
    ['a line of another chain', (line: Buffer) => line],
  ])('leaves %s, which is moved to a file of its own', (_, leave) => {
    book.append(stageDraft(book));
    book.append(stageDraft(book));
    const ledger = read('ledger.jsonl');
    const left = leave(ledger.subarray(ledger.indexOf('\n') + 1));
    appendFileSync(join(directory, 'ledger.jsonl'), left);
    const { opened, said } = reopen();
    const [name = ''] = torn();
    expect(said).toEqual([
      `A write to ledger.jsonl was cut off: ${left.length} bytes after entry 2 were no entry and lie in ${name} now. Entries 1 to 2 stand.`,
    ]);
    expect(read(name)).toEqual(left);
    expect(read('ledger.jsonl')).toEqual(ledger);
    expect(opened.append(stageDraft(opened)).entry.number).toBe(3);
    expect(audit(opened).verdict).toBe('sound');
    opened.close();
    expect(reopen().said).toEqual([]);
  });

  test('shows to no reader', () => {
    book.append(stageDraft(book));
    appendFileSync(join(directory, 'ledger.jsonl'), read('ledger.jsonl').subarray(0, 200));
    expect(book.count()).toBe(1);
    expect([...book.entries()]).toHaveLength(1);
  });

  test('is left alone while another process has its turn', () => {
    book.append(stageDraft(book));
    appendFileSync(join(directory, 'ledger.jsonl'), '{"half"');
    const said: string[] = [];
    let inside: string[] = [];
    const writer = openBook(directory, {
      by: { name: 'A. Keeper' },
      key: keyFile(dirname(directory)),
      // Within the turn, after what was left has been moved away: a second opening finds nothing to do.
      announce: (text) => {
        said.push(text);
        inside = reopen().said;
      },
    });
    expect(said).toHaveLength(1);
    expect(inside).toEqual([]);
    writer.close();
  });
});

describe('processes', () => {
  async function start(count: number, name: string) {
    const child = spawn(process.execPath, [APPEND_MANY, directory, String(count), name], {
      stdio: ['ignore', 'pipe', 'inherit'],
    });
    await once(child.stdout, 'data');
    return { child, ended: once(child, 'exit') };
  }

  test('take turns while one reads', async () => {
    const names = ['a', 'b', 'c', 'd'];
    const writers = await Promise.all(names.map((name) => start(50, name)));
    let reads = 0;
    let running = true;
    const all = Promise.all(writers.map(({ ended }) => ended)).then((codes) => {
      running = false;
      return codes;
    });
    let seen = 0;
    while (running) {
      const numbers = [...book.entries()].map(({ number }) => number);
      expect(numbers).toEqual(numbers.map((_, i) => i + 1));
      expect(numbers.length).toBeGreaterThanOrEqual(seen);
      seen = numbers.length;
      reads += 1;
      await new Promise((resolve) => setTimeout(resolve, 5));
    }
    expect((await all).map(([code]) => code)).toEqual([0, 0, 0, 0]);
    expect(reads).toBeGreaterThan(1);
    const entries = [...book.entries()];
    expect(entries).toHaveLength(200);
    for (const name of names) {
      const own = entries.flatMap((entry) => (entry.by.name === name && 'name' in entry ? [entry.name] : []));
      expect(own).toEqual(Array.from({ length: 50 }, (_, i) => `${name}-${i}`));
    }
    expect(audit(book)).toMatchObject({ verdict: 'sound', entries: 200, remarks: [] });
  });

  test('that are killed at any moment leave a sound book', async () => {
    let seed = 1;
    const random = () => {
      seed = (Math.imul(seed, 1_103_515_245) + 12_345) & 0x7fffffff;
      return seed / 0x7fffffff;
    };
    let entries = 0;
    // Eight times three.
    for (let round = 0; round < 8; round += 1) {
      const writers = await Promise.all(['a', 'b', 'c'].map((name) => start(1000, `${name}${round}`)));
      for (const { child, ended } of writers) {
        await once(child.stdout, 'data');
        await new Promise((resolve) => setTimeout(resolve, random() * 12));
        child.kill('SIGKILL');
        await ended;
      }
      const { opened } = reopen();
      const { verdict, problems, entries: now } = audit(opened);
      expect({ verdict, problems }).toEqual({ verdict: 'sound', problems: [] });
      expect(now).toBeGreaterThan(entries);
      entries = now;
      opened.close();
    }
    const { opened } = reopen();
    opened.append(stageDraft(opened));
    expect(audit(opened).verdict).toBe('sound');
    opened.close();
  });
});
