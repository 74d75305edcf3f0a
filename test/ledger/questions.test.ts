/** Subjects, lineages, differences and contents of a small book; what it holds: lantern-book.ts. */

import { copyFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { deflateSync, gzipSync } from 'node:zlib';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import type { Book } from '../../ledger/book.ts';
import { contents } from '../../ledger/contents.ts';
import { diffRuns } from '../../ledger/diff.ts';
import type { PlateEntry, StageEntry } from '../../ledger/entry.ts';
import { LedgerProblem } from '../../ledger/problem.ts';
import { findRunNamed, findSubject } from '../../ledger/subject.ts';
import { lineageOf, trace } from '../../ledger/trace.ts';
import { fillBook } from './lantern-book.ts';
import { fileInput, makeBook, published, runDraft, stageDraft, temporary } from './make-book.ts';

let book: Book;
let directory: string;
let remove: () => void;

beforeAll(() => {
  ({ directory, remove } = temporary());
  book = makeBook(join(directory, 'book'));
  fillBook(book);
});

afterAll(() => {
  book.close();
  remove();
});

const find = (...words: string[]) => findSubject(book, words, directory);
const plate = (number: number) => book.entry(number) as PlateEntry;
const stage = (number: number) => book.entry(number) as StageEntry;

function problemOf(work: () => unknown): LedgerProblem {
  try {
    work();
  } catch (error) {
    if (error instanceof LedgerProblem) return error;
  }
  throw new Error('no LedgerProblem was thrown');
}

describe('a subject', () => {
  test('is an entry by its number or its digest', () => {
    const entry = { type: 'entry', entry: 5, entries: [5] };
    expect(find('5')).toEqual({ asked: '5', ...entry });
    expect(find(book.digestOf(5))).toMatchObject(entry);
    expect(find(book.digestOf(5).slice(0, 8))).toMatchObject(entry);
  });

  test.each([['run 2'], ['run', '2'], ['RUN', '2'], ['run', 'last'], ['run2']])(
    'is a run: %s %s',
    (...words) => {
      expect(find(...words.filter((word) => word !== undefined))).toMatchObject({
        type: 'run',
        run: 2,
        entry: 16,
        entries: [16],
      });
    },
  );

  test('is a plate by its number, as a person may type it', () => {
    const { plate: number } = plate(9);
    for (const typed of [number, number.toLowerCase(), number.replaceAll('0', 'o').replaceAll('1', 'l')]) {
      // The entry's number keeps its digits.
      const [, symbols] = typed.split('-');
      expect(find(`7b-${symbols}`)).toMatchObject({
        type: 'plate',
        plate: number,
        drawn: 7,
        output: 'image',
        entries: [9],
      });
    }
  });

  test('is a figure that was not published, by the number it would have', () => {
    const [, symbols] = plate(15).plate.split('-');
    expect(find(`14a-${symbols}`)).toMatchObject({
      type: 'plate',
      drawn: 14,
      output: 'coverage',
      entries: [14],
    });
  });

  test('is a published number, in the last run or in another', () => {
    expect(find('ring-diameter')).toMatchObject({
      type: 'number',
      run: 2,
      number: { value: 42.9, entry: 13 },
      entries: [13],
    });
    expect(find('ring-diameter', 'in', 'run', '1')).toMatchObject({
      run: 1,
      number: { value: 42.1 },
      entries: [6],
    });
    expect(find('ring-width in run last-1')).toMatchObject({ run: 1, number: { name: 'ring-width' } });
  });

  test('is an output by its digest or the beginning of it, from the entry that made it', () => {
    const { digest } = stage(5).outputs.image as { digest: string };
    const file = { type: 'file', digest, bytes: 12, entries: [5] };
    expect(find(digest)).toMatchObject(file);
    expect(find(digest.slice(0, 6))).toMatchObject(file);
    expect(find(digest.slice(0, 20).toUpperCase())).toMatchObject(file);
    expect(find(digest)).toMatchObject({
      roles: [
        { entry: 5, role: 'output', name: 'image' },
        { entry: 7, role: 'input', name: 'image' },
      ],
    });
  });

  test('is an input from outside, which no entry made', () => {
    expect(find('da7a'.repeat(16))).toMatchObject({
      type: 'file',
      entries: [],
      roles: [{ entry: 1, role: 'input', name: 'image' }],
    });
  });

  test('is a file by its digest', () => {
    copyFileSync(
      book.store.path((stage(5).outputs.image as { digest: string }).digest),
      join(directory, 'some.fits'),
    );
    expect(find('some.fits')).toMatchObject({ type: 'file', entries: [5] });
    copyFileSync(book.store.path(plate(9).stamped.png.digest), join(directory, 'ring.png'));
    expect(find('ring.png')).toMatchObject({
      type: 'file',
      entries: [9],
      roles: [{ role: 'stamped', name: 'png' }],
    });
  });

  describe('is a figure saved again, by the plate number in it:', () => {
    // W3C, Portable Network Graphics, third edition, sections 5.2 and 11.3.3; check sums are not looked at.
    const png = (type: string, data: Buffer) => {
      const length = Buffer.alloc(4);
      length.writeUInt32BE(data.length);
      const chunk = Buffer.concat([length, Buffer.from(type), data, Buffer.alloc(4)]);
      return Buffer.concat([Buffer.from('89504e470d0a1a0a', 'hex'), chunk]);
    };
    const text = () => Buffer.from(`see ${plate(9).plate}.`);
    test.each<[string, () => Buffer]>([
      ['PNG, tEXt', () => png('tEXt', Buffer.concat([Buffer.from('Title\0'), text()]))],
      ['PNG, zTXt', () => png('zTXt', Buffer.concat([Buffer.from('Title\0\0'), deflateSync(text())]))],
      ['PNG, iTXt', () => png('iTXt', Buffer.concat([Buffer.from('Title\0\0\0en\0Titel\0'), text()]))],
      [
        'PNG, iTXt packed',
        () => png('iTXt', Buffer.concat([Buffer.from('Title\0\x01\0en\0Titel\0'), deflateSync(text())])),
      ],
      ['SVG', () => Buffer.from(`<svg><metadata>${plate(9).plate}</metadata><path/></svg>`)],
      ['packed SVG', () => gzipSync(`<svg><metadata>${plate(9).plate}</metadata></svg>`)],
      ['any bytes', () => Buffer.concat([Buffer.alloc(100_000, 0xff), text(), Buffer.alloc(9)])],
      ['a stranger before it', () => Buffer.from(`9-ABCDEF 7a-000000 ${plate(9).plate}`)],
    ])('%s', (_, content) => {
      writeFileSync(join(directory, 'saved-again'), content());
      expect(find('saved-again')).toMatchObject({ type: 'plate', plate: plate(9).plate, entries: [9] });
    });

    test.each<[string, Buffer]>([
      ['cut short', png('zTXt', Buffer.from('Title\0\0xx')).subarray(0, 30)],
      ['of lengths that lie', Buffer.concat([png('tEXt', Buffer.from('a\0b')), Buffer.alloc(12, 0xff)])],
      ['empty', Buffer.alloc(0)],
    ])('nothing in a file %s', (_, content) => {
      writeFileSync(join(directory, 'nothing.png'), content);
      const problem = problemOf(() => find('nothing.png'));
      expect(problem.code).toBe('not-found');
      expect(problem.message).toMatch(
        /^nothing\.png: nothing in the book has its digest [0-9a-f]{64}, and no plate number stands in it\. If a plate/,
      );
    });

    test('another book’s plate', () => {
      writeFileSync(join(directory, 'foreign.svg'), '<svg>99-ABCDEF</svg>');
      expect(() => find('foreign.svg')).toThrow('and the book has no plate 99-ABCDEF, which stands in it.');
    });
  });

  test.each<[string[], LedgerProblem['code'], string]>([
    [['17'], 'not-found', 'The book has entries 1 to 16, and no entry 17. Look at its contents.'],
    [['0'], 'not-found', 'The book has entries 1 to 16, and no entry 0.'],
    [['run', '9'], 'not-found', 'The book has runs 1 to 2, and no run 9. Look at its contents.'],
    [
      ['ring-diametre'],
      'not-found',
      'ring-diametre is no entry, plate number, run, published number or digest, and there is no such file. Did you mean ring-diameter?',
    ],
    [
      ['ring-radius in run 1'],
      'not-found',
      'Run 1 has no published number ring-radius. It published ring-diameter, ring-width.',
    ],
    [
      ['some.fit'],
      'not-found',
      'There is no file some.fit, and it is no entry, plate number, run, published number or digest either. Did you mean some.fits?',
    ],
    [['zzz'], 'not-found', 'The last run published ring-diameter, ring-width.'],
    [
      ['99-ABCDEF'],
      'not-found',
      'The book has no plate 99-ABCDEF. Its entries end at 16: it may be a plate of another book.',
    ],
    [['7c-ABCDEF'], 'not-found', 'The book has no plate 7c-ABCDEF. Entry 7 drew 7a-'],
    [['5-ABCDEF'], 'not-found', 'Entry 5 drew no figure; its six symbols would be'],
    [
      ['ab'.repeat(32)],
      'not-found',
      `Nothing in the book has the digest ${'ab'.repeat(32)}. It may be of another book.`,
    ],
    [[''], 'bad-call', 'Expected what to look up'],
  ])('is not found: %j', (words, code, message) => {
    const problem = problemOf(() => find(...words));
    expect(problem.message).toContain(message);
    expect([problem.code, problem.exitStatus]).toEqual([code, 2]);
  });

  test('is ambiguous when the beginning of a digest is', () => {
    const made = temporary();
    const other = makeBook(join(made.directory, 'book'));
    other.append(
      stageDraft(other, {
        inputs: {
          data: [fileInput('a', 'abcdef'.padEnd(64, '1')), fileInput('b', 'abcdef'.padEnd(64, '2'))],
        },
      }),
    );
    const problem = problemOf(() => findSubject(other, ['abcdef']));
    expect(problem.code).toBe('ambiguous');
    expect(problem.message).toBe(
      'The beginning abcdef can be any of abcdef1111111111, abcdef2222222222. Give more of it.',
    );
    expect(findSubject(other, ['abcdef1'])).toMatchObject({ digest: 'abcdef'.padEnd(64, '1') });
    other.close();
    made.remove();
  });

  test('does not take an empty book for one with runs', () => {
    const made = temporary();
    const empty = makeBook(join(made.directory, 'book'));
    expect(() => findSubject(empty, ['1'])).toThrow('The book has no entry yet.');
    expect(() => findSubject(empty, ['run 1'])).toThrow('The book has no run yet. Run a recipe first.');
    expect(() => findSubject(empty, ['diameter'])).toThrow('Look at the contents of the book.');
    empty.close();
    made.remove();
  });
});

describe('a lineage', () => {
  const numbers = (...words: string[]) => trace(book, find(...words)).lineage.map(({ number }) => number);

  test('goes nearest first, each entry once, and none before what depends on it', () => {
    // By hand from lantern-book.ts: plate, pictures, features, fit, then basis and visibilities, which fit reads.
    expect(numbers('9')).toEqual([9, 7, 6, 5, 4, 2, 3, 1]);
    expect(numbers('ring-diameter')).toEqual([13, 12, 11, 2, 3, 1]);
    expect(numbers('1')).toEqual([1]);
    expect(numbers('run', '2')).toEqual([16, 15, 14, 13, 12, 11, 2, 3, 1]);
    expect(numbers('da7a'.repeat(16))).toEqual([]);
  });

  test('holds the ledger’s entries with their digests', () => {
    const { lineage } = trace(book, find('5'));
    for (const { digest, ...entry } of lineage) {
      expect(entry).toEqual(book.entry(entry.number));
      expect(digest).toBe(book.digestOf(entry.number));
    }
  });

  test('of several entries is one', () => {
    expect(lineageOf(book, [5, 12]).map(({ number }) => number)).toEqual([12, 5, 11, 4, 2, 3, 1]);
    expect(lineageOf(book, [])).toEqual([]);
  });
});

describe('a difference', () => {
  const diff = (a: string, b: string) => diffRuns(book, findRunNamed(book, a), findRunNamed(book, b));

  test('has what changed from the first run to the second', () => {
    const document = diff('1', 'last');
    expect(document.runs).toEqual([1, 2]);
    expect(document.recipe.same).toBe(true);
    expect(document.stages).toEqual([]);
    expect(document.parameters).toEqual([{ stage: 'basis', parameter: 'components', values: [20, 30] }]);
    expect(document.code).toEqual([
      {
        stage: 'fit',
        kind: 'fit',
        digests: ['c0de'.repeat(16), 'beef'.repeat(16)],
        versions: [1, 2],
        files: ['stages/fit/compute.ts'],
        packages: [],
      },
    ]);
    expect(document.environment).toEqual([]);
    expect(document.inputs.map(({ stage, input, derived }) => [stage, input, derived])).toEqual([
      ['fit', 'basis', true],
      ['features', 'basis', true],
      ['features', 'samples', true],
      ['pictures', 'image', true],
      ['pictures', 'ring', true],
    ]);
    const changed = document.outputs
      .filter(({ same }) => !same)
      .map(({ stage, output }) => `${stage}.${output}`);
    expect(changed).toEqual(['basis.basis', 'fit.image', 'fit.samples', 'features.ring', 'pictures.image']);
    expect(document.outputs).toHaveLength(11);
  });

  test('has the shift of each number, in sigmas where there are intervals', () => {
    const [diameter, width] = diff('1', '2').numbers;
    expect(diameter).toMatchObject({ name: 'ring-diameter', values: [42.1, 42.9], units: ['uas', 'uas'] });
    expect(diameter?.shift).toBeCloseTo(0.8, 12);
    // By hand: 0.8 / sqrt(0.8^2 + 0.8^2) = 1/sqrt(2).
    expect(diameter?.sigmas).toBeCloseTo(Math.SQRT1_2, 12);
    expect(width).toMatchObject({ name: 'ring-width', sigmas: null, intervals: [null, null] });
    expect(width?.shift).toBeCloseTo(0.2, 12);
  });

  test('of a run from itself is none', () => {
    const document = diff('2', '2');
    expect([
      document.parameters,
      document.inputs,
      document.code,
      document.environment,
      document.stages,
    ]).toEqual([[], [], [], [], []]);
    expect(document.outputs.every(({ same }) => same)).toBe(true);
    expect(document.numbers.map(({ shift }) => shift)).toEqual([0, 0]);
  });

  test('of parameters goes down to the field, and takes a quantity for one value', () => {
    const made = temporary();
    const other = makeBook(join(made.directory, 'book'));
    const run = (
      parameters: Parameters<typeof stageDraft>[1],
      numbers: Parameters<typeof published>[1][] = [],
    ) => {
      const { number } = other.append(stageDraft(other, parameters)).entry;
      return other.append(
        runDraft(other, [number], {
          numbers: numbers.map((value, i) => published(`n${i}`, value, null, number, 'image')),
        }),
      );
    };
    run(
      {
        parameters: {
          group: { inner: { value: 1, unit: 'uas' }, same: true },
          list: [1, 2],
          stations: [
            { name: 'A', sefd: 1 },
            { name: 'B', sefd: 2 },
          ],
          gone: 'x',
        },
        seed: 1,
        platform: 'linux-x64',
        inputs: { data: [fileInput('a.uvfits', '1'.repeat(64))] },
      },
      [1],
    );
    run(
      {
        parameters: {
          group: { inner: { value: 1, unit: 'mas' }, same: true },
          list: [1, 2, 3],
          stations: [
            { name: 'A', sefd: 1 },
            { name: 'B', sefd: 3 },
          ],
          come: null,
        },
        seed: 2,
        platform: 'linux-arm64',
        inputs: { data: [fileInput('b.uvfits', '2'.repeat(64))] },
      },
      [1, 5],
    );
    const document = diffRuns(other, findRunNamed(other, 'last-1'), findRunNamed(other, 'run 2'));
    expect(document.parameters.map(({ parameter, values }) => [parameter, ...values])).toEqual([
      ['gone', 'x', null],
      ['group.inner', { value: 1, unit: 'uas' }, { value: 1, unit: 'mas' }],
      ['list', [1, 2], [1, 2, 3]],
      ['stations.1.sefd', 2, 3],
      ['come', null, null],
      ['seed', 1, 2],
    ]);
    expect(document.environment).toEqual([
      { name: 'platform', values: ['linux-x64', 'linux-arm64'], stages: ['fit'] },
    ]);
    expect(document.inputs).toMatchObject([
      { input: 'data', derived: false, origins: [[{ file: 'a.uvfits' }], [{ file: 'b.uvfits' }]] },
    ]);
    expect(document.numbers[1]).toMatchObject({ name: 'n1', values: [null, 5], shift: null, sigmas: null });
    other.close();
    made.remove();
  });

  test.each([
    ['0', 'The book has runs 1 to 2, and no run 0.'],
    ['last-2', 'The book has runs 1 to 2, and no run last-2.'],
    ['first', '"first": expected a run such as 12, last or last-1.'],
  ])('asks for runs: %s', (text, message) => {
    expect(() => diff(text, '1')).toThrow(message);
  });
});

describe('contents', () => {
  const numbers = (filter: Parameters<typeof contents>[1]) =>
    contents(book, filter).document.entries.map(({ number }) => number);

  test('are the latest page, oldest first, with digests', () => {
    expect(numbers({})).toEqual(Array.from({ length: 16 }, (_, i) => i + 1));
    const { document, matching } = contents(book, { last: 3 });
    expect(document.entries.map(({ number }) => number)).toEqual([14, 15, 16]);
    expect(matching).toBe(16);
    expect(document.entries[0]?.digest).toBe(book.digestOf(14));
  });

  test.each<[string, Parameters<typeof contents>[1], number[]]>([
    ['a type', { type: 'run' }, [10, 16]],
    ['a stage', { stage: 'fit' }, [5, 12]],
    ['a kind', { kind: 'figure' }, [7, 14]],
    ['a recipe', { recipe: 'lantern-ring', type: 'plate' }, [8, 9, 15]],
    ['a recipe that no run has', { recipe: 'other' }, []],
    ['a time', { since: '2026-01-02T03:04:21Z' }, [15, 16]],
    ['a time with an offset', { until: '2026-01-02T05:04:08+02:00' }, [1]],
    ['a day', { until: '2026-01-02', last: 1 }, [16]],
    ['a later day', { since: '2026-01-03' }, []],
    ['a file', { digest: 'da7ada7a' }, [1]],
    ['several', { kind: 'fit', last: 1 }, [12]],
    ['a recipe, a kind and a day', { recipe: 'lantern-ring', kind: 'fit', since: '2026-01-02' }, [5, 12]],
    ['a parameter of any stage', { parameter: 'components=30' }, [11]],
    ['a parameter of one stage', { parameter: 'basis.components=20' }, [4]],
    ['a parameter of another stage', { parameter: 'fit.components=20' }, []],
    ['a quantity', { parameter: 'taper=15 uas' }, [4, 11]],
    ['a field of a group', { parameter: 'observation.band.frequency=227 GHz' }, [1]],
    ['a place in a list', { parameter: 'stations.1.name=TWO' }, [1]],
    ['a seed', { parameter: 'library.seed=11' }, [3]],
    ['a part of a value', { parameter: 'components=3' }, []],
    ['a parameter and a stage', { parameter: 'terms.0=amplitudes', stage: 'fit', last: 1 }, [12]],
  ])('are filtered by %s', (_, filter, expected) => {
    expect(numbers(filter)).toEqual(expected);
  });

  test('find entries by a digest that they have or name', () => {
    expect(numbers({ digest: book.digestOf(3) })).toEqual([3]);
    expect(numbers({ digest: (stage(5).outputs.image as { digest: string }).digest })).toEqual([5, 7]);
  });

  test.each<[Parameters<typeof contents>[1], string]>([
    [{ last: 0 }, '--last: expected a whole number from 1, got 0.'],
    [{ last: Number.NaN }, '--last: expected a whole number from 1, got NaN.'],
    [{ digest: 'xyz' }, '--digest: expected 6 to 64 hexadecimal digits, got xyz.'],
    [
      { parameter: 'components' },
      '--parameter: expected a parameter and its value, such as components=30, got components.',
    ],
    [{ since: 'yesterday' }, '"yesterday": expected a time such as 2026-03-01T12:00:00Z (RFC 3339).'],
  ])('refuse %o', (filter, message) => {
    expect(() => contents(book, filter)).toThrow(message);
  });
});
