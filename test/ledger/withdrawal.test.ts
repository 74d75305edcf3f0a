/** What is withdrawn, what that reaches, and who signed what. The book: lantern-book.ts. */

import { cpSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, test } from 'vitest';
import { audit } from '../../ledger/audit.ts';
import type { Book } from '../../ledger/book.ts';
import { contents } from '../../ledger/contents.ts';
import { countersignaturesOf, isSigned, signEntry, signSealToo } from '../../ledger/countersignature.ts';
import { diffRuns } from '../../ledger/diff.ts';
import type { CountersignatureDraft, PlateEntry, StageEntry } from '../../ledger/entry.ts';
import { findPlate } from '../../ledger/find.ts';
import { reach } from '../../ledger/reach.ts';
import { formatSeal, readSeal, type Seal } from '../../ledger/seal.ts';
import { readSigningKey } from '../../ledger/signing-key.ts';
import { findRunNamed, findSubject } from '../../ledger/subject.ts';
import { trace } from '../../ledger/trace.ts';
import { withdrawalsUpstream, withdrawnUpstream } from '../../ledger/withdrawal.ts';
import { fillBook } from './lantern-book.ts';
import { keyFile, makeBook, runDraft, stageDraft, temporary } from './make-book.ts';

let directory: string;
let remove: () => void;
let filled: string;
let copies = 0;
let book: Book;

beforeAll(() => {
  ({ directory, remove } = temporary());
  const made = makeBook(join(directory, 'filled'));
  fillBook(made);
  made.close();
  filled = made.directory;
});

beforeEach(() => {
  copies += 1;
  const copy = join(directory, `book-${copies}`);
  cpSync(filled, copy, { recursive: true });
  book = makeBook(copy);
});

afterEach(() => book.close());

afterAll(() => remove());

const withdraw = (withdraws: number, reason = 'the gain table was wrong') =>
  book.append({ type: 'withdrawal', withdraws, reason }).entry.number;
const find = (...words: string[]) => findSubject(book, words, directory);
const keyOf = (number: number) => (book.entry(number) as StageEntry).key;

describe('a withdrawal', () => {
  test('stands upstream of what depends on the entry, and of nothing else', () => {
    expect(withdrawalsUpstream(book, 9)).toEqual([]);
    const number = withdraw(4);
    // By hand from lantern-book.ts: basis 4 went into fit 5 and features 6, these into pictures 7; run 1 holds them.
    const dependent = Array.from({ length: 16 }, (_, i) => i + 1).filter(
      (n) => withdrawalsUpstream(book, n).length > 0,
    );
    expect(dependent).toEqual([4, 5, 6, 7, 8, 9, 10]);
    expect(withdrawnUpstream(book, 9)).toMatchObject([
      {
        number,
        type: 'withdrawal',
        withdraws: 4,
        reason: 'the gain table was wrong',
        by: { name: 'A. Keeper' },
      },
    ]);
  });

  test('keeps what depends on it from being carried forward', () => {
    expect(book.findStage(keyOf(5))?.number).toBe(5);
    withdraw(2);
    for (const number of [2, 5, 6, 7, 12])
      expect(book.findStage(keyOf(number)), `entry ${number}`).toBeUndefined();
    for (const number of [1, 3, 4, 11]) expect(book.findStage(keyOf(number))?.number).toBe(number);
    // Computed again, it stands.
    const again = book.append(
      stageDraft(book, { key: keyOf(2), outputs: { visibilities: ['visibilities', 'new\n'] } }),
    );
    expect(book.findStage(keyOf(2))?.number).toBe(again.entry.number);
  });

  test('of a plate makes the figure a new one', () => {
    const { plate, name, mark } = book.entry(9) as PlateEntry;
    expect(findPlate(book, { plate, name, mark })?.number).toBe(9);
    withdraw(9);
    expect(findPlate(book, { plate, name, mark })).toBeUndefined();
    expect(book.findStage(keyOf(7))?.number).toBe(7);
  });

  test('of a run reaches the plates that no run which stands has published', () => {
    // By hand from lantern-book.ts: entry 10 is the run that published plates 8 and 9. Another publishes 9 again.
    const { name, plate } = book.entry(9) as PlateEntry;
    const again = book.append(runDraft(book, [7], { plates: [{ name, plate, entry: 9 }] })).entry.number;
    const first = withdraw(10);
    const of = () => [8, 9].map((number) => withdrawalsUpstream(book, number));
    expect(of()).toEqual([[first], []]);
    const second = withdraw(again);
    expect(of()).toEqual([[first], [first, second]]);
    withdraw(first, 'it was the other run');
    expect(of()).toEqual([[], []]);
    expect(withdrawalsUpstream(book, 7)).toEqual([]);
  });

  test('counts no more once it is withdrawn itself, and again once that is', () => {
    const first = withdraw(2);
    const second = withdraw(first, 'it was the other gain table');
    expect(withdrawalsUpstream(book, 9)).toEqual([]);
    expect(book.findStage(keyOf(5))?.number).toBe(5);
    withdraw(second, 'no, it was not');
    expect(withdrawalsUpstream(book, 9)).toEqual([first]);
  });

  test('is told nearest first', () => {
    const [one, three, five] = [withdraw(1), withdraw(3), withdraw(5)];
    expect(withdrawalsUpstream(book, 7)).toEqual([five, three, one]);
  });

  test.each([
    [99, 'what is withdrawn names entry 99, which does not stand before it'],
    [0, 'names entry 0'],
  ])('of entry %i is refused', (number, message) => {
    expect(() => withdraw(number)).toThrow(message);
  });

  test.each(['', ' \n ', 'bell \u0007', 'x'.repeat(4001)])(
    'without a proper reason is refused: %j',
    (reason) => {
      expect(() => withdraw(5, reason)).toThrow('expected a reason of 1 to 4000 characters, got');
      expect(book.count()).toBe(16);
    },
  );

  test('shows in trace, contents and diff', () => {
    const number = withdraw(4);
    expect(trace(book, find('9')).withdrawals).toMatchObject([{ number, withdraws: 4 }]);
    expect(trace(book, find('ring-diameter in run 1')).withdrawals).toMatchObject([{ number }]);
    expect(trace(book, find('ring-diameter')).withdrawals).toEqual([]);
    expect(contents(book, { type: 'plate' }).document.withdrawn).toEqual([
      { entry: 8, by: [number], itself: false },
      { entry: 9, by: [number], itself: false },
    ]);
    expect(contents(book, { kind: 'basis-build' }).document.withdrawn).toEqual([
      { entry: 4, by: [number], itself: true },
    ]);
    const document = diffRuns(book, findRunNamed(book, '1'), findRunNamed(book, '2'));
    expect(document.withdrawals).toEqual([
      { run: 1, entry: number, withdraws: 4, reason: 'the gain table was wrong' },
    ]);
    expect(document.numbers.map(({ withdrawn }) => withdrawn)).toEqual([
      [[number], []],
      [[number], []],
    ]);
  });

  test('of a run takes its numbers with it, not its stages', () => {
    const number = withdraw(16);
    expect(trace(book, find('ring-diameter')).withdrawals).toMatchObject([{ number }]);
    expect(trace(book, find('ring-diameter in run 1')).withdrawals).toEqual([]);
    expect(book.findStage(keyOf(12))?.number).toBe(12);
  });
});

describe('what is reached', () => {
  const reached = (...words: string[]) =>
    reach(book, find(...words)).reached.map(
      ({ type, entry, name, run }) => `${type} ${entry} ${name} ${run}`,
    );
  const numbers = (entry: number, run: number) => [
    `number ${entry} ring-diameter ${run}`,
    `number ${entry} ring-width ${run}`,
  ];
  const [run1, run2] = ['run 10 lantern-ring 1', 'run 16 lantern-ring 2'];
  const [coverage, image, second] = ['plate 8 coverage 1', 'plate 9 ring-image 1', 'plate 15 ring-image 2'];

  // All by hand from lantern-book.ts, by the number of links from the subject.
  test.each<[string, string[]]>([
    // visibilities: runs name it (1), pictures read it (1), so plates (2); fit (1), features (2), numbers (3).
    ['2', [run1, run2, coverage, image, second, ...numbers(6, 1), ...numbers(13, 2)]],
    // library: runs (1); basis (1), features (2), so numbers (3), fit (2), pictures (3), plates (4).
    ['3', [run1, run2, ...numbers(6, 1), ...numbers(13, 2), coverage, image, second]],
    ['11', [run2, ...numbers(13, 2), second]],
    ['7', [coverage, image, run1]],
    ['6', [...numbers(6, 1), run1, coverage, image]],
    ['9', [run1]],
    ['10', numbers(6, 1)],
    ['run 2', numbers(13, 2)],
    ['da7a'.repeat(16), [run1, run2, coverage, image, second, ...numbers(6, 1), ...numbers(13, 2)]],
  ])('by %s', (words, expected) => {
    const found = reached(words);
    expect([...found].sort()).toEqual([...expected].sort());
    if (words !== 'da7a'.repeat(16)) expect(found).toEqual(expected);
  });

  test('by a file is what read that output, not what read another one of the same entry', () => {
    const { outputs } = book.entry(1) as StageEntry;
    expect(reached(outputs.truth?.digest ?? '')).toEqual([]);
    expect(reached(outputs.data?.digest ?? '')).toContain(image);
    const { outputs: drawn } = book.entry(7) as StageEntry;
    expect(reached(drawn.image?.digest ?? '')).toEqual([image, run1]);
    const { outputs: measured } = book.entry(6) as StageEntry;
    expect(reached(measured.ring?.digest ?? '')).toEqual(expect.arrayContaining([...numbers(6, 1), image]));
  });

  test('names plates by their number', () => {
    const [plate] = reach(book, find('9'))
      .reached.concat(reach(book, find('7')).reached)
      .filter(({ type }) => type === 'plate');
    expect(plate).toMatchObject({ plate: (book.entry(8) as PlateEntry).plate });
  });

  test('is nothing for what nothing depends on', () => {
    const { number } = book.append(stageDraft(book, { name: 'alone' })).entry;
    withdraw(number);
    expect(reached(String(number))).toEqual([]);
  });
});

describe('a countersignature', () => {
  // RFC 8032 section 7.1, TEST 2.
  const seed = '4ccd089b28ff96da9db6c346ec114e0f5b8a319f35aba624da8cf6ed4fb8a6fb';
  const by = { name: 'B. Reader' };
  const key = () => readSigningKey(keyFile(directory, seed));
  const seal = () => readSeal(book.directory) as Seal;

  test('under an entry shows in its trace, with name and key', () => {
    const { number } = book.append(signEntry(book, 5, by, key())).entry;
    const [signed] = trace(book, find('9')).countersignatures;
    // RFC 8032's public key, in the form of the standard: 0x01 and 32 bytes.
    const open = Buffer.from('013d4017c3e843895a92b70aa74d1b7ebc9c982ccf2ec4968cc0cd55f12af4660c', 'hex');
    expect(signed).toMatchObject({ number, signs: 5, what: book.digestOf(5) });
    expect(signed?.key).toMatch(/^B\.%20Reader\+[0-9a-f]{8}\+/);
    expect(signed?.key.endsWith(`+${open.toString('base64')}`)).toBe(true);
    expect(isSigned(signed as never, 'lantern')).toBe(true);
    expect(isSigned(signed as never, 'other')).toBe(false);
    expect(countersignaturesOf(book, [4, 6])).toEqual([]);
    expect(audit(book)).toMatchObject({ verdict: 'sound' });
  });

  test('under a seal signs the seal’s own text, so that it can stand under the note', () => {
    const earlier = seal();
    book.append(stageDraft(book));
    const draft = signSealToo(earlier, formatSeal(earlier), by, key());
    expect(book.append(draft).entry).toMatchObject({
      signs: 16,
      what: earlier.note?.split('\n\n')[0]?.concat('\n'),
    });
    expect(audit(book)).toMatchObject({ verdict: 'sound', problems: [] });
  });

  test.each<[string, (draft: CountersignatureDraft) => Partial<CountersignatureDraft>, string]>([
    ['another entry', () => ({ signs: 6 }), 'entry 6 has the digest'],
    ['an entry that is not there', () => ({ signs: 99 }), 'names entry 99'],
    ['another digest', () => ({ what: 'ab'.repeat(32) }), 'entry 5 has the digest'],
    [
      'another key',
      ({ key }) => ({ key: key.replace('B.%20Reader', 'C.%20Reader') }),
      'the signature is not one',
    ],
    [
      'another signature',
      () => ({ signature: Buffer.alloc(64).toString('base64') }),
      'the signature is not one',
    ],
    ['no base64', ({ signature }) => ({ signature: `${signature} ` }), 'the signature is not one'],
    ['no text of a seal', () => ({ what: 'lantern\n16\n' }), 'is neither a digest nor the text of a seal'],
  ])('with %s is refused', (_, change, message) => {
    const draft = signEntry(book, 5, by, key());
    expect(() => book.append({ ...draft, ...change(draft) })).toThrow(message);
    expect(book.count()).toBe(16);
  });

  test('under a seal that is none of this book is refused', () => {
    const wrong: [Partial<Seal>, string][] = [
      [{ book: 'other' }, 'the seal is of the book "other", not "lantern"'],
      [
        { root: seal().root.replace(/^./, (first) => (first === 'A' ? 'B' : 'A')) },
        'the seal of 16 entries says the root',
      ],
      [{ entries: 15 }, 'the seal of 15 entries says the root'],
      [{ entries: 17 }, 'what is signed names entry 17'],
    ];
    for (const [change, message] of wrong) {
      const other = { ...seal(), ...change };
      expect(() => book.append(signSealToo(other, formatSeal(other), by, key()))).toThrow(message);
    }
  });

  test('that was forged in the ledger is found by an audit', () => {
    book.append(signEntry(book, 5, by, key()));
    book.append(stageDraft(book));
    const copy = join(directory, 'forged');
    cpSync(book.directory, copy, { recursive: true });
    rmSync(join(copy, 'index.sqlite'));
    const path = join(copy, 'ledger.jsonl');
    writeFileSync(path, readFileSync(path, 'utf8').replace('"signs":5', '"signs":6'));
    expect(audit({ directory: copy }).problems.map(({ entry }) => entry)).toEqual([17]);
  });
});

describe('an audit', () => {
  test('names the plates and numbers that a damage reaches, and only those', () => {
    book.close();
    const path = book.store.path((book.entry(13) as StageEntry).outputs.ring?.digest ?? '');
    rmSync(path);
    const { problems, reached } = audit(book);
    const names = (list: typeof reached) => list.map(({ type, name, run }) => `${type} ${name} ${run}`);
    // Features 13 made it, pictures 14 read it.
    expect(problems.map(({ entry }) => entry)).toEqual([13, 14]);
    for (const { reaches } of problems)
      expect(names(reaches)).toEqual(['plate ring-image 2', 'number ring-diameter 2', 'number ring-width 2']);
    expect(names(reached)).toEqual(['plate ring-image 2', 'number ring-diameter 2', 'number ring-width 2']);
  });

  test('follows a changed entry forward, though its line is no entry any more', () => {
    const path = join(book.directory, 'ledger.jsonl');
    writeFileSync(path, readFileSync(path, 'utf8').replace('"components":30', '"components":3x'));
    const { problems } = audit(book);
    expect(problems).toHaveLength(1);
    expect(problems[0]?.entry).toBe(11);
    expect(problems[0]?.reaches.map(({ type, entry, run }) => [type, entry, run])).toEqual([
      ['plate', 15, 2],
      ['number', 13, 2],
      ['number', 13, 2],
    ]);
  });

  test('says that a damaged seal or index reaches nothing', () => {
    writeFileSync(join(book.directory, 'seals/latest'), 'text');
    expect(audit(book)).toMatchObject({
      verdict: 'damaged',
      reached: [],
      problems: [{ entry: 16, reaches: [] }],
    });
  });

  test('that is quick does not read what is stored, and misses nothing but that', () => {
    const path = book.store.path((book.entry(13) as StageEntry).outputs.ring?.digest ?? '');
    const bytes = readFileSync(path);
    rmSync(path);
    writeFileSync(path, Buffer.alloc(bytes.length));
    expect(audit(book).verdict).toBe('damaged');
    expect(audit(book, { quick: true })).toMatchObject({ verdict: 'sound', quick: true, entries: 16 });
    rmSync(path);
    writeFileSync(path, bytes.subarray(1));
    expect(audit(book, { quick: true }).problems.map(({ entry }) => entry)).toEqual([13, 14]);
  });
});
