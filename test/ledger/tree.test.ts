/** The ledger's tree as the book keeps it: every proof checks, whatever becomes of the file with its hashes. */

import { existsSync, mkdirSync, readFileSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { audit } from '../../ledger/audit.ts';
import { type Book, openBook } from '../../ledger/book.ts';
import { checkConsistency, checkInclusion, leafHash, nodeHash } from '../../ledger/merkle.ts';
import { checkProof, prove, proveConsistency } from '../../ledger/proof.ts';
import { parseSeal, type Seal } from '../../ledger/seal.ts';
import { hashCount } from '../../ledger/tree.ts';
import { keyFile, makeBook, runDraft, temporary } from './make-book.ts';

const ENTRIES = 100;
let directory: string;
let remove: () => void;
let book: Book;
/** The seal after each entry. */
const seals: Seal[] = [];

const latest = () => parseSeal(readFileSync(join(book.directory, 'seals/latest'))) as Seal;
const file = () => join(book.directory, 'tree');
const lines = () => readFileSync(join(book.directory, 'ledger.jsonl'), 'utf8').trimEnd().split('\n');
const hash = (text: string) => Buffer.from(text, 'base64');

beforeAll(() => {
  ({ directory, remove } = temporary());
  book = makeBook(join(directory, 'book'));
  for (let number = 1; number <= ENTRIES; number += 1) {
    book.append(
      number % 4 === 1
        ? runDraft(book, [])
        : { type: 'rerun', of: 1, verdict: 'identical', outputs: [], differences: [] },
    );
    seals.push(latest());
  }
});

afterAll(() => {
  book.close();
  remove();
});

/** RFC 9162 section 2.1.1, by its definition. */
function definition(leaves: readonly Buffer[]): Buffer {
  if (leaves.length === 1) return leafHash(leaves[0] as Buffer);
  let k = 1;
  while (k * 2 < leaves.length) k *= 2;
  // nodeHash is tested against published values.
  return nodeHash(definition(leaves.slice(0, k)), definition(leaves.slice(k)));
}

test('every seal has the root of the entries under it, by the definition', () => {
  const leaves = lines().map((line) => Buffer.from(line));
  for (const [i, { root, entries }] of seals.entries()) {
    expect(entries).toBe(i + 1);
    expect(root).toBe(definition(leaves.slice(0, i + 1)).toString('base64'));
  }
});

test('every entry is proved to be under the seal', () => {
  const all = lines();
  for (let number = 1; number <= ENTRIES; number += 1) {
    const proof = prove(book, number);
    expect(proof.entry).toBe(all[number - 1]);
    expect([proof.index, proof.size]).toEqual([number - 1, ENTRIES]);
    const path = proof.inclusion.map(hash);
    expect(
      checkInclusion(leafHash(Buffer.from(proof.entry)), number - 1, ENTRIES, path, hash(latest().root)),
    ).toBe(true);
    expect(checkProof(proof)).toMatchObject({ book: 'lantern', number });
  }
});

test('every seal is proved to be a beginning of the latest', () => {
  for (const seal of seals) {
    const { consistency } = proveConsistency(book, seal);
    const path = consistency.map(hash);
    expect(checkConsistency(seal.entries, ENTRIES, hash(seal.root), hash(latest().root), path)).toBe(true);
  }
  const other = { ...(seals[6] as Seal), root: seals[7]?.root ?? '' };
  expect(() => proveConsistency(book, other)).toThrow(
    'The seal of 7 entries has another root than the ledger.',
  );
  expect(() => proveConsistency(book, { ...other, book: 'other' })).toThrow('is no earlier one of this book');
});

describe('the file of hashes', () => {
  test('has two hashes for an entry at most', () => {
    // A whole binary tree over n leaves has 2n - 1 nodes; a forest one less for each further tree.
    expect(hashCount(8)).toBe(15);
    expect(hashCount(7)).toBe(11);
    expect(statSync(file()).size).toBe(32 * hashCount(ENTRIES));
  });

  const spoil: [string, (bytes: Buffer) => Buffer | null][] = [
    ['missing', () => null],
    ['empty', () => Buffer.alloc(0)],
    ['cut short', (bytes) => bytes.subarray(0, -40)],
    ['zeros', (bytes) => Buffer.alloc(bytes.length)],
    ['of another tree', (bytes) => Buffer.from(bytes.map((byte) => byte ^ 0x55))],
  ];
  test.each(spoil)('that is %s is made again', (_, change) => {
    const bytes = readFileSync(file());
    const changed = change(bytes);
    if (changed === null) rmSync(file());
    else writeFileSync(file(), changed);
    expect(checkProof(prove(book, 42)).number).toBe(42);
    expect(readFileSync(file())).toEqual(bytes);
  });

  test('may lie in any of its hashes, and no proof is wrong for it', () => {
    const bytes = readFileSync(file());
    for (let at = 0; at < bytes.length; at += 32) {
      const flipped = Buffer.from(bytes);
      flipped[at + 7] = (flipped[at + 7] as number) ^ 4;
      writeFileSync(file(), flipped);
      expect(checkProof(prove(book, 1 + (at % ENTRIES))).book).toBe('lantern');
    }
    writeFileSync(file(), bytes);
  });

  test('is not needed for entering either', () => {
    const made = temporary();
    const small = makeBook(join(made.directory, 'book'));
    const enter = (opened: Book) => opened.append(runDraft(opened, []));
    const path = join(small.directory, 'tree');
    for (let i = 0; i < 5; i += 1) enter(small);
    for (const content of [null, 'text', Buffer.alloc(32 * 100)]) {
      if (content === null) rmSync(path);
      else writeFileSync(path, content);
      const another = openBook(small.directory, { by: { name: 'A. Keeper' }, key: keyFile(made.directory) });
      enter(another);
      another.close();
      // The first writer has the tree in memory, of an earlier size.
      enter(small);
      expect(audit(small)).toMatchObject({ verdict: 'sound', problems: [] });
      expect(checkProof(prove(small, 3)).number).toBe(3);
    }
    // Where it cannot be written, entering goes on.
    rmSync(path);
    mkdirSync(path);
    enter(small);
    expect(audit(small).verdict).toBe('sound');
    expect(checkProof(prove(small, 2)).number).toBe(2);
    expect(existsSync(join(small.directory, 'tree.new'))).toBe(false);
    small.close();
    made.remove();
  });
});
