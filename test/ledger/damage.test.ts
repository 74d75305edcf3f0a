/** Flipped bytes and cuts of a ledger are found wherever they are, and the entry is named. */

import { closeSync, ftruncateSync, openSync, readFileSync, rmSync, writeFileSync, writeSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { audit } from '../../ledger/audit.ts';
import { auditLedger } from '../../ledger/audit-ledger.ts';
import { type Book, openBook } from '../../ledger/book.ts';
import { canonicalJson } from '../../ledger/canonical.ts';
import { keyFile, makeBook, runDraft, stageDraft, temporary } from './make-book.ts';

const ENTRIES = 40;
/** Bytes from one that is damaged to the next: all of them in `npm run long`, here a third, of which each bit has its turn. */
const STEP = process.env.PLATEBOOK_EVERY_BYTE === undefined ? 3 : 1;
let remove: () => void;
let directory: string;
let book: Book;
/** Ledger and seals at every size. */
const states: { ledger: Buffer; seal: Buffer; kept: Buffer }[] = [];

beforeAll(() => {
  const made = temporary();
  remove = made.remove;
  directory = join(made.directory, 'book');
  book = makeBook(directory);
  for (let number = 1; number <= ENTRIES; number += 1) {
    // Short lines of two sorts.
    book.append(
      number % 4 === 1
        ? runDraft(book, [])
        : { type: 'rerun', of: 1, verdict: 'identical', outputs: [], differences: [] },
    );
    states.push({
      ledger: readFileSync(join(directory, 'ledger.jsonl')),
      seal: readFileSync(join(directory, 'seals/latest')),
      kept: number === 1 ? Buffer.alloc(0) : readFileSync(join(directory, 'seals/kept')),
    });
  }
});

afterAll(() => {
  book.close();
  remove();
});

function restore(size: number): { ledger: Buffer; seal: Buffer; kept: Buffer } {
  const state = states[size - 1];
  if (state === undefined) throw new Error('no such size');
  writeFileSync(join(directory, 'ledger.jsonl'), state.ledger);
  writeFileSync(join(directory, 'seals/latest'), state.seal);
  writeFileSync(join(directory, 'seals/kept'), state.kept);
  return state;
}

/** The entry whose line, with its line feed, holds a byte. */
function entryAt(ledger: Buffer, at: number): number {
  return ledger.subarray(0, at).filter((byte) => byte === 0x0a).length + 1;
}

/** Flips one bit of each of the given bytes in turn, and hands over what the audit of the ledger says. */
function flipEach(
  file: string,
  bytes: Buffer,
  places: Iterable<number>,
  check: (at: number, entries: number[]) => void,
) {
  const descriptor = openSync(join(directory, file), 'r+');
  try {
    for (const at of places) {
      const was = bytes[at] as number;
      writeSync(descriptor, Buffer.of(was ^ (1 << (at % 8))), 0, 1, at);
      check(
        at,
        auditLedger(directory).problems.map(({ entry }) => entry),
      );
      writeSync(descriptor, Buffer.of(was), 0, 1, at);
    }
  } finally {
    closeSync(descriptor);
  }
}

function* every(length: number, step = 1, from = 0): Generator<number> {
  for (let at = from; at < length; at += step) yield at;
}

/** Every STEP-th byte, and every line feed. */
function* everyStep(ledger: Buffer): Generator<number> {
  for (let at = 0; at < ledger.length; at += 1) if (at % STEP === 0 || ledger[at] === 0x0a) yield at;
}

describe('a flipped bit', () => {
  test('in a ledger of six entries is blamed on the entry, and on no other', () => {
    const { ledger } = restore(6);
    expect(auditLedger(directory).problems).toEqual([]);
    flipEach('ledger.jsonl', ledger, everyStep(ledger), (at, entries) => {
      // A line feed that is gone joins two lines: the second is missing too.
      if (ledger[at] === 0x0a) expect(entries, `byte ${at}`).toContain(entryAt(ledger, at));
      else expect(entries, `byte ${at}`).toEqual([entryAt(ledger, at)]);
    });
    expect(auditLedger(directory).problems).toEqual([]);
  });

  test('is found at every size, sampled', () => {
    for (let size = 1; size <= ENTRIES; size += 1) {
      const { ledger } = restore(size);
      const step = Math.ceil(ledger.length / 8);
      flipEach('ledger.jsonl', ledger, every(ledger.length, step, size % step), (at, entries) => {
        expect(entries, `byte ${at} of ${size} entries`).toContain(entryAt(ledger, at));
      });
      // The very last bytes, for which there is only the seal.
      flipEach('ledger.jsonl', ledger, every(ledger.length, 1, ledger.length - 3), (at, entries) => {
        expect(entries, `byte ${at} of ${size} entries`).toContain(size);
      });
    }
  });

  test('in the seal is found', () => {
    for (const size of [1, 9, 10, ENTRIES]) {
      const { seal } = restore(size);
      flipEach('seals/latest', seal, every(seal.length, STEP, size % STEP), (at, entries) => {
        expect(entries, `byte ${at} of the seal of ${size} entries`).not.toEqual([]);
      });
    }
  });

  test('keeps everybody from entering, and is noticed when the entry is read', () => {
    for (const at of [10, 700, -40]) {
      const { ledger } = restore(ENTRIES);
      const place = at < 0 ? ledger.length + at : at;
      const flipped = Buffer.from(ledger);
      flipped[place] = (flipped[place] as number) ^ 1;
      writeFileSync(join(directory, 'ledger.jsonl'), flipped);
      const said: string[] = [];
      const opened = openBook(directory, {
        by: { name: 'A. Keeper' },
        key: keyFile(dirname(directory)),
        announce: (text) => said.push(text),
      });
      expect(() => opened.entry(entryAt(ledger, place))).toThrow('ledger.jsonl');
      if (at < 0) {
        expect(said.join()).toContain('is damaged');
        expect(() => opened.append(runDraft(opened, []))).toThrow(
          'Audit the book, and take the ledger from a copy',
        );
      }
      opened.close();
      expect(readFileSync(join(directory, 'ledger.jsonl'))).toEqual(flipped);
    }
  });
});

describe('a cut', () => {
  test('of a ledger of six entries is found', () => {
    const { ledger } = restore(6);
    const descriptor = openSync(join(directory, 'ledger.jsonl'), 'r+');
    for (let length = ledger.length - 1; length >= 0; length -= STEP) {
      ftruncateSync(descriptor, length);
      const entries = auditLedger(directory).problems.map(({ entry }) => entry);
      expect(entries, `cut to ${length} bytes`).toContain(entryAt(ledger, length));
    }
    closeSync(descriptor);
  });

  test('is not put right when the book is opened', () => {
    const { ledger } = restore(6);
    writeFileSync(join(directory, 'ledger.jsonl'), ledger.subarray(0, -10));
    const said: string[] = [];
    openBook(directory, {
      by: { name: 'A. Keeper' },
      key: keyFile(dirname(directory)),
      announce: (text) => said.push(text),
    }).close();
    expect(said).toEqual([expect.stringContaining('the seal says 6 entries')]);
    expect(readFileSync(join(directory, 'ledger.jsonl'))).toEqual(ledger.subarray(0, -10));
  });
});

describe('a rewritten ledger', () => {
  const lines = (ledger: Buffer) => ledger.toString().trimEnd().split('\n');
  const problemsOf = (content: readonly string[]) => {
    writeFileSync(join(directory, 'ledger.jsonl'), content.map((line) => `${line}\n`).join(''));
    return auditLedger(directory).problems;
  };

  test('in which a line is missing, doubled or exchanged is found', () => {
    const six = lines(restore(6).ledger);
    const [one, two, three, four, five, six_] = six as [string, string, string, string, string, string];
    expect(problemsOf([one, two, four, five, six_])[0]?.entry).toBe(3);
    expect(problemsOf([one, two, three, three, four, five, six_]).map(({ entry }) => entry)).toContain(4);
    expect(problemsOf([one, three, two, four, five, six_]).length).toBeGreaterThan(0);
    expect(problemsOf([one, two, three, '', four, five, six_]).map(({ entry }) => entry)).toContain(4);
  });

  test('in which an entry was changed and written canonically is found by the entry after it', () => {
    const six = lines(restore(6).ledger);
    const changed = canonicalJson({ ...JSON.parse(six[2] as string), verdict: 'different' });
    expect(problemsOf(six.map((line, i) => (i === 2 ? changed : line)))).toEqual([
      {
        entry: 3,
        what: expect.stringMatching(/^its line was changed: the digest is [0-9a-f]{64}, entry 4 says/),
      },
    ]);
    const last = canonicalJson({ ...JSON.parse(six[5] as string), verdict: 'within tolerance' });
    expect(problemsOf([...six.slice(0, 5), last])).toEqual([
      { entry: 6, what: expect.stringContaining('the seal says') },
    ]);
  });

  test('without a seal is damaged', () => {
    restore(6);
    rmSync(join(directory, 'seals/latest'));
    expect(auditLedger(directory).problems).toEqual([
      { entry: 6, what: 'seals/latest is missing', beside: true },
    ]);
    restore(6);
  });
});

describe('the store', () => {
  test('has every flipped bit found and blamed on the entry that made the file', () => {
    const made = temporary();
    const small = makeBook(join(made.directory, 'book'));
    const first = small.append(
      stageDraft(small, { outputs: { image: ['fits-image', 'pixels of the first'] } }),
    ).entry;
    const second = small.append(
      stageDraft(small, { name: 'second', outputs: { image: ['fits-image', 'more pixels'] } }),
    ).entry;
    expect(audit(small)).toMatchObject({ verdict: 'sound', entries: 2, files: 4, problems: [], remarks: [] });
    for (const entry of [first, second] as (typeof first & {
      outputs: Record<string, { digest: string }>;
      log: { digest: string };
    })[]) {
      for (const { digest } of [entry.log, ...Object.values(entry.outputs)]) {
        const path = small.store.path(digest);
        const bytes = readFileSync(path);
        for (let at = 0; at < bytes.length; at += 1) {
          const flipped = Buffer.from(bytes);
          flipped[at] = (flipped[at] as number) ^ (1 << (at % 8));
          rmSync(path);
          writeFileSync(path, flipped);
          const { verdict, problems } = audit(small);
          expect([verdict, problems.map((problem) => problem.entry)]).toEqual(['damaged', [entry.number]]);
        }
        rmSync(path);
        expect(audit(small).problems[0]?.what).toContain('the store has no');
        writeFileSync(path, bytes);
      }
    }
    small.close();
    made.remove();
  });
});
