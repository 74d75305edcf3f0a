/** Opening, entering, reading: what book.ts promises. */

import { existsSync, mkdirSync, readdirSync, readFileSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { audit } from '../../ledger/audit.ts';
import { type Book, openBook } from '../../ledger/book.ts';
import { contents } from '../../ledger/contents.ts';
import type { Draft } from '../../ledger/entry.ts';
import {
  entryInput,
  fixedClock,
  keyFile,
  makeBook,
  plateDraft,
  published,
  runDraft,
  stageDraft,
  temporary,
} from './make-book.ts';

let directory: string;
let remove: () => void;
let book: Book;

beforeEach(() => {
  ({ directory, remove } = temporary());
  book = makeBook(join(directory, 'book'));
});

afterEach(() => {
  book.close();
  remove();
});

describe('the format', () => {
  test('is what the header of book.ts shows', () => {
    const source = readFileSync(new URL('../../ledger/book.ts', import.meta.url), 'utf8');
    const [, line, seal] =
      /^ \* {6}(\{.*\})\n(?: \*.*\n)*? \* {2}and its seal.*\n \*\n((?: \* {6}.*\n)+)/m.exec(source) ?? [];
    const shown = makeBook(join(directory, 'shown'), { now: () => new Date('2026-01-02T03:04:05.678Z') });
    shown.append({
      type: 'run',
      recipe: { ...shown.store.keepBytes('recipe: empty\n'), name: 'empty', path: 'empty.yaml' },
      overrides: [],
      stages: [],
      plates: [],
      numbers: [],
      finished: true,
    });
    shown.close();
    expect(readFileSync(join(directory, 'shown/ledger.jsonl'), 'utf8')).toBe(`${line}\n`);
    // The digests in the example come from coreutils' sha256sum: the root is that of a zero byte and the line.
    const text = seal?.replaceAll(/^ \* {6}/gm, '');
    expect(readFileSync(join(directory, 'shown/seals/latest'), 'utf8').split('\n\n')[0]).toBe(
      text?.trimEnd(),
    );
  });

  test('has nothing but the files that the header of book.ts names', () => {
    book.append(stageDraft(book));
    book.close();
    expect(readdirSync(book.directory).sort()).toEqual([
      'index.sqlite',
      'ledger.jsonl',
      'logs',
      'seals',
      'store',
      'tree',
      'turns.sqlite',
    ]);
    expect(readdirSync(join(book.directory, 'seals')).sort()).toEqual(['keys', 'latest']);
    expect(readdirSync(join(book.directory, 'store/new'))).toEqual([]);
  });
});

describe('opening', () => {
  const open = (name: string, create = false) =>
    openBook(join(directory, name), { create, by: { name: 'A. Keeper' }, key: keyFile(directory) });

  test('asks for a book', () => {
    mkdirSync(join(directory, 'empty'));
    for (const name of ['nowhere', 'empty']) {
      expect(() => open(name)).toThrow(
        `${join(directory, name)}: there is no book here. Run a recipe to start one, or name the book's directory with --book.`,
      );
      expect(existsSync(join(directory, name, 'turns.sqlite'))).toBe(false);
    }
  });

  test('starts a book where asked, also in an empty directory and below missing ones', () => {
    mkdirSync(join(directory, 'empty'));
    for (const name of ['empty', 'new/deeper']) {
      const started = open(name, true);
      expect(started.count()).toBe(0);
      expect(started.name).toBe(name === 'empty' ? 'empty' : 'deeper');
      expect(started.lastRun()).toBeUndefined();
      expect([...started.entries()]).toEqual([]);
      started.close();
      open(name).close();
    }
  });

  test('finishes a book whose start was interrupted', () => {
    mkdirSync(join(directory, 'half/store/new'), { recursive: true });
    writeFileSync(join(directory, 'half/ledger.jsonl'), '');
    expect(() => open('half')).toThrow('there is no book here');
    open('half', true).close();
    open('half').close();
  });

  test('refuses a directory that is something else', () => {
    mkdirSync(join(directory, 'other'));
    for (const name of ['a.fits', 'b.fits', 'c.fits', 'd.fits'])
      writeFileSync(join(directory, 'other', name), '');
    expect(() => open('other', true)).toThrow(
      `${join(directory, 'other')}: expected a book, an empty directory or none, got a directory with a.fits, b.fits, c.fits, …. ` +
        'Name another directory with --book.',
    );
    expect(readdirSync(join(directory, 'other'))).toHaveLength(4);
    writeFileSync(join(directory, 'file'), 'text');
    for (const create of [true, false]) {
      expect(() => open('file', create)).toThrow('expected a directory, got a file.');
    }
  });

  test('keeps the name of a book', () => {
    expect(book.name).toBe('lantern');
    book.append(stageDraft(book));
    const again = openBook(book.directory, { name: 'other', create: true });
    expect(again.name).toBe('lantern');
    again.close();
  });

  test.each(['', 'a\nb', 'x'.repeat(101)])('refuses the name %j', (name) => {
    expect(() => openBook(join(directory, 'named'), { create: true, name, key: keyFile(directory) })).toThrow(
      "The book's name: expected 1 to 100 characters without control characters",
    );
  });

  test('tells of a ledger that is gone', () => {
    rmSync(join(book.directory, 'ledger.jsonl'));
    expect(() => openBook(book.directory, { create: true })).toThrow(
      'the ledger is missing, its seal is there.',
    );
  });
});

describe('entering', () => {
  test('fills in book, number, digest before, time and person', () => {
    const first = book.append(stageDraft(book));
    const second = book.append(stageDraft(book, { name: 'again' }));
    expect(first.entry).toMatchObject({
      book: 'lantern',
      number: 1,
      before: 'e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855',
      by: { name: 'A. Keeper' },
    });
    expect(second.entry.number).toBe(2);
    expect(second.entry.before).toBe(first.digest);
    expect(second.entry.time > first.entry.time).toBe(true);
    expect(book.entry(2)).toEqual(second.entry);
    expect(book.digestOf(2)).toBe(second.digest);
    expect([...book.entries()]).toEqual([first.entry, second.entry]);
    expect([...book.entries(2)]).toEqual([second.entry]);
    expect(book.count()).toBe(2);
  });

  test('numbers runs', () => {
    const { entry } = book.append(stageDraft(book));
    for (const run of [1, 2, 3]) {
      expect(book.append(runDraft(book, [entry.number])).entry).toMatchObject({
        type: 'run',
        run,
        number: run + 1,
      });
      expect(book.lastRun()?.run).toBe(run);
    }
    expect(book.findRun(2)?.number).toBe(3);
    expect(book.findRun(4)).toBeUndefined();
  });

  test('does not let a draft write the fields that the book fills in', () => {
    const draft = { ...stageDraft(book), number: 99, before: 'x', book: 'other' } as Draft;
    expect(book.append(draft).entry).toMatchObject({ number: 1, book: 'lantern' });
  });

  test('needs a person', () => {
    const reader = openBook(book.directory);
    expect(() => reader.append(stageDraft(book))).toThrow('The book was opened without a person');
    reader.close();
  });

  const lost = { digest: 'ab'.repeat(32), bytes: 3 };
  test.each<[string, (stage: ReturnType<typeof stageDraft>) => Draft, string]>([
    [
      'an output that is not in the store',
      (stage) => ({ ...stage, outputs: { image: { ...lost, format: 'fits-image' } } }),
      `A stage cannot be entered: the store has no output image of 3 bytes with digest ${lost.digest}. Nothing was written.`,
    ],
    [
      'a log that is not in the store',
      (stage) => ({ ...stage, log: lost }),
      'the store has no log of 3 bytes',
    ],
    [
      'an output of the wrong size',
      (stage) => ({
        ...stage,
        outputs: { image: { ...lost, ...stage.outputs.image, bytes: 8, format: 'fits-image' } },
      }),
      'the store has no output image of 8 bytes',
    ],
    [
      'a size that is none',
      (stage) => ({ ...stage, inputs: { data: [{ ...lost, bytes: Number.NaN, origin: { file: 'x' } }] } }),
      'A stage cannot be entered: expected digests, sizes and numbers in a stage. Nothing was written.',
    ],
    [
      'an entry that does not exist',
      (stage) => ({
        ...stage,
        inputs: {
          data: [
            {
              ...stage.outputs.image,
              ...{ digest: stage.outputs.image?.digest ?? '', bytes: 9 },
              origin: { entry: 2, output: 'image' },
            },
          ],
        },
      }),
      'input data names entry 2, which does not stand before it',
    ],
    [
      'an output that an entry does not have',
      (stage) => ({
        ...stage,
        inputs: {
          data: [
            { digest: stage.outputs.image?.digest ?? '', bytes: 9, origin: { entry: 1, output: 'ring' } },
          ],
        },
      }),
      'input data names output ring of entry 1, which has none of that name',
    ],
    [
      'an output with another digest',
      (stage) => ({
        ...stage,
        inputs: { data: [{ ...(stage.log ?? lost), origin: { entry: 1, output: 'image' } }] },
      }),
      'but output image of entry 1 has',
    ],
    [
      'a run of entries that do not exist',
      (stage) => ({
        type: 'run',
        recipe: { ...(stage.log ?? lost), name: 'r', path: 'r.yaml' },
        overrides: [],
        stages: [{ stage: 'fit', kind: 'fit', state: 'computed', entry: 5 }],
        plates: [],
        numbers: [published('diameter', 42, 1, 1, 'image')],
        finished: true,
      }),
      'A run cannot be entered: stage fit names entry 5, which does not stand before it.',
    ],
    [
      'a rerun of nothing',
      () => ({ type: 'rerun', of: 0, verdict: 'identical', outputs: [], differences: [] }),
      'names entry 0',
    ],
    [
      'a number that is none',
      (stage) => ({ ...stage, seconds: Number.NaN }),
      'stage.seconds: expected a finite number, got NaN.',
    ],
  ])('refuses %s', (_, change, message) => {
    const stage = stageDraft(book);
    book.append(stage);
    const before = readFileSync(join(book.directory, 'ledger.jsonl'), 'utf8');
    expect(() => book.append(change(stage))).toThrow(message);
    expect(readFileSync(join(book.directory, 'ledger.jsonl'), 'utf8')).toBe(before);
    expect(book.count()).toBe(1);
    expect(book.append(stage).entry.number).toBe(2);
  });

  test('refuses a plate whose number is another entry’s', () => {
    book.append(stageDraft(book, { outputs: { image: ['svg', '<svg/>'] } }));
    const plate = plateDraft(book, 1, 'image');
    expect(() => book.append({ ...plate, plate: '1-000000' })).toThrow(
      '1-000000 is no plate number of entry 1',
    );
    expect(() => book.append({ ...plate, figure: 'ab'.repeat(32) })).toThrow(
      'but output image of entry 1 has',
    );
    expect(book.append(plate).entry.number).toBe(2);
  });
});

describe('asking', () => {
  test('refuses numbers that no entry has', () => {
    expect(() => book.entry(1)).toThrow('The book has no entry yet. Look at its contents.');
    book.append(stageDraft(book));
    for (const number of [0, 2, 1.5, Number.NaN, -1]) {
      expect(() => book.entry(number)).toThrow(`The book has entries 1 to 1, and no entry ${number}.`);
    }
  });

  test('finds the newest stage of a key whose outputs stand', () => {
    const key = '77'.repeat(32);
    const first = book.append(stageDraft(book, { key, outputs: { image: ['fits-image', 'one'] } })).entry;
    const second = book.append(stageDraft(book, { key, outputs: { image: ['fits-image', 'two'] } })).entry;
    expect(book.findStage(key)).toEqual(second);
    expect(book.findStage('78'.repeat(32))).toBeUndefined();
    // A file that is cut short or gone does not stand.
    const path = book.store.path(
      (second as typeof first & { outputs: { image: { digest: string } } }).outputs.image.digest,
    );
    rmSync(path);
    expect(book.findStage(key)).toEqual(first);
    book.store.keepBytes('two');
    expect(book.findStage(key)).toEqual(second);
  });

  test('sees what another process enters', () => {
    const reader = openBook(book.directory);
    expect(reader.count()).toBe(0);
    book.append(stageDraft(book));
    expect(reader.count()).toBe(1);
    const other = makeBook(book.directory, { by: { name: 'B. Keeper' }, now: fixedClock() });
    other.append(stageDraft(other, { inputs: { data: [entryInput(book, 1, 'image')] } }));
    expect(reader.entry(2).by.name).toBe('B. Keeper');
    expect(book.append(stageDraft(book)).entry.number).toBe(3);
    for (const opened of [reader, other]) opened.close();
  });
});

describe('a clock that was set back', () => {
  test('is announced once, and neither order nor soundness suffers', () => {
    const said: string[] = [];
    const { time: before } = book.append(stageDraft(book)).entry;
    book.close();
    const now = () => new Date(Date.UTC(2020, 0, 1));
    const options = { by: { name: 'A. Keeper' }, key: keyFile(directory), now };
    const late = openBook(book.directory, { ...options, announce: (text) => said.push(text) });
    for (let i = 0; i < 3; i += 1) late.append(stageDraft(late));
    expect(said).toEqual([
      `The clock says 2020-01-01T00:00:00.000Z, which is before entry 1 of ${before}: entry 2 is dated by it all the ` +
        'same, and the numbers give the order. Set the clock.',
    ]);
    expect([...late.entries()].map(({ number }) => number)).toEqual([1, 2, 3, 4]);
    expect(contents(late).document.entries.map(({ number }) => number)).toEqual([1, 2, 3, 4]);
    expect(contents(late, { until: '2020-01-01' }).document.entries.map(({ number }) => number)).toEqual([
      2, 3, 4,
    ]);
    expect(audit(late)).toMatchObject({ verdict: 'sound', entries: 4, problems: [] });
    late.close();
  });
});

describe('the index', () => {
  const index = () => join(book.directory, 'index.sqlite');

  test.each<[string, () => void]>([
    ['missing', () => rmSync(index())],
    ['no database', () => writeFileSync(index(), 'this is no database, and longer than a header is')],
    ['cut short', () => writeFileSync(index(), readFileSync(index()).subarray(0, 5000))],
    ['empty', () => writeFileSync(index(), '')],
  ])('is made again when it is %s', (_, spoil) => {
    for (let i = 0; i < 5; i += 1) book.append(stageDraft(book));
    book.append(runDraft(book, [1]));
    book.close();
    spoil();
    const said: string[] = [];
    const announce = (text: string) => said.push(text);
    const again = openBook(book.directory, { by: { name: 'A. Keeper' }, key: keyFile(directory), announce });
    expect(again.count()).toBe(6);
    expect(said).toEqual([
      expect.stringMatching(
        /^The index of the book .*it is made again from the ledger's 6 entries\. Nothing is lost\.$/,
      ),
    ]);
    expect(again.lastRun()?.number).toBe(6);
    expect(again.append(stageDraft(again)).entry.number).toBe(7);
    again.close();
    expect(statSync(index()).size).toBeGreaterThan(4096);
  });

  test('is made again when it is of another book, behind or ahead', () => {
    const other = makeBook(join(directory, 'other'), { name: 'other' });
    for (let i = 0; i < 3; i += 1) other.append(stageDraft(other, { name: 'other' }));
    other.close();
    book.append(stageDraft(book));
    book.close();
    const behind = readFileSync(index());
    const writer = openBook(book.directory, { by: { name: 'A. Keeper' }, key: keyFile(directory) });
    writer.append(stageDraft(writer, { name: 'second' }));
    writer.close();
    const foreign = readFileSync(join(other.directory, 'index.sqlite'));
    for (const content of [behind, foreign]) {
      writeFileSync(index(), content);
      const said: string[] = [];
      const again = openBook(book.directory, { announce: (text) => said.push(text) });
      expect(again.count()).toBe(2);
      expect(said.join()).toMatch(
        content === foreign ? /^The index of the book does not fit its ledger/ : /^$/,
      );
      expect(again.entry(2)).toMatchObject({ name: 'second' });
      again.close();
    }
  });

  test('is held in memory where it cannot be written', () => {
    for (let i = 0; i < 3; i += 1) book.append(stageDraft(book));
    book.close();
    rmSync(index());
    mkdirSync(index());
    const again = openBook(book.directory, { by: { name: 'A. Keeper' }, key: keyFile(directory) });
    expect(again.findStage('ab12'.repeat(16))?.number).toBe(3);
    expect(again.append(stageDraft(again)).entry.number).toBe(4);
    expect(again.entry(4).number).toBe(4);
    again.close();
  });

  test('that lies is found out when the entry is read', () => {
    for (let i = 0; i < 3; i += 1) book.append(stageDraft(book));
    book.ask((answers) => answers.all("UPDATE entries SET digest = 'x' WHERE number = 2"));
    expect(book.entry(2).number).toBe(2);
    expect([...book.entries()]).toHaveLength(3);
  });
});
