/** `audit`: document, text and exit status. What is found: test/ledger/audit.test.ts and damage.test.ts. */

import { appendFileSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterEach, beforeEach, expect, test } from 'vitest';
import { auditCommand } from '../../../runner/commands/audit.ts';
import { type Filled, filledBook, keepingIo, longLines, optionsFor } from './book-io.ts';

let filled: Filled;

beforeEach(() => {
  filled = filledBook();
});

afterEach(() => filled.remove());

const ledger = () => join(filled.book, 'ledger.jsonl');

test('finds a book sound', () => {
  const io = keepingIo(filled.directory);
  expect(auditCommand(optionsFor(filled.book, true), io)).toBe(0);
  expect(JSON.parse(io.printed())).toMatchObject({ verdict: 'sound', entries: 16, problems: [] });
  const shown = keepingIo(filled.directory);
  auditCommand(optionsFor(filled.book), shown);
  expect(shown.printed()).toMatch(
    /^Book lantern: sound\n\n {2}read: 16 entries, \d+ files in the store, \d+ bytes\n {2}Every entry and every stored byte is what the ledger says\.\n$/,
  );
});

test('names the damaged entry, and ends with status 1', () => {
  const bytes = readFileSync(ledger());
  const at = bytes.indexOf('"components":30');
  bytes[at + 13] = '4'.charCodeAt(0);
  writeFileSync(ledger(), bytes);
  const io = keepingIo(filled.directory);
  expect(auditCommand(optionsFor(filled.book, true), io)).toBe(1);
  const document = JSON.parse(io.printed());
  expect(document).toMatchObject({ verdict: 'damaged', problems: [{ entry: 11 }] });
  expect(document.problems).toHaveLength(1);
  const shown = keepingIo(filled.directory);
  expect(auditCommand(optionsFor(filled.book), shown)).toBe(1);
  expect(shown.printed()).toContain('Book lantern: damaged\n');
  expect(shown.printed()).toContain('1 problem:\n\n  entry 11  its line was changed: the digest is\n');
  // Entry 11 is the basis of run 2: its plate and its numbers, and none of run 1.
  const said = shown.printed().replace(/\s+/g, ' ');
  expect(said).toMatch(
    /reaches plate 14b-\w{6} \(ring-image\) and numbers ring-diameter of run 2, ring-width of run 2/,
  );
  expect(said).not.toContain('of run 1');
  expect(longLines(shown.printed())).toEqual([]);
});

test('that is quick says what it did not read', () => {
  const io = keepingIo(filled.directory);
  expect(auditCommand({ ...optionsFor(filled.book), quick: true }, io)).toBe(0);
  expect(io.printed()).toMatch(/sizes of \d+ files in the store/);
  expect(io.printed()).toContain('Its bytes were not read.');
});

test('says what a crash left, and judges the book after it', () => {
  appendFileSync(ledger(), '{"half');
  const io = keepingIo(filled.directory);
  expect(auditCommand(optionsFor(filled.book, true), io)).toBe(0);
  expect(io.said()).toContain('A write to ledger.jsonl was cut off: 6 bytes after entry 16');
  expect(JSON.parse(io.printed()).verdict).toBe('sound');
});

test('says nothing about damage twice', () => {
  writeFileSync(ledger(), readFileSync(ledger()).subarray(0, -100));
  const io = keepingIo(filled.directory);
  expect(auditCommand(optionsFor(filled.book), io)).toBe(1);
  expect(io.said()).toBe('');
  expect(io.printed()).toContain('entry 16');
});

test('judges a book whose ledger is gone, and refuses a directory without a book', () => {
  rmSync(ledger());
  expect(auditCommand(optionsFor(filled.book, true), keepingIo(filled.directory))).toBe(1);
  expect(() => auditCommand(optionsFor(join(filled.directory, 'none')), keepingIo(filled.directory))).toThrow(
    'there is no book here',
  );
});
