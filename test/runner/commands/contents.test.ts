/** `contents`: document and text. The filters themselves: test/ledger/questions.test.ts. */

import { afterAll, beforeAll, expect, test } from 'vitest';
import { contentsCommand } from '../../../runner/commands/contents.ts';
import { type Filled, filledBook, keepingIo, longLines, optionsFor } from './book-io.ts';

let filled: Filled;

beforeAll(() => {
  filled = filledBook();
});

afterAll(() => filled.remove());

test('prints one JSON document with the entries', () => {
  const io = keepingIo(filled.directory);
  expect(contentsCommand({ ...optionsFor(filled.book, true), type: 'run' }, io)).toBe(0);
  const document = JSON.parse(io.printed());
  expect(Object.keys(document)).toEqual(['entries', 'withdrawn']);
  expect(document.withdrawn).toEqual([]);
  expect(document.entries.map(({ number, run }: { number: number; run: number }) => [number, run])).toEqual([
    [10, 1],
    [16, 2],
  ]);
});

test('prints a table, and says when there is more', () => {
  const io = keepingIo(filled.directory);
  contentsCommand({ ...optionsFor(filled.book), last: 3 }, io);
  const text = io.printed();
  expect(text).toMatch(/^Book lantern: the latest 3 of 16 entries; --last N shows more\n\n/);
  expect(text).toMatch(/^ {5}14 {2}2026-01-02 03:04:20 {2}stage {2}pictures {4}figure {8}[0-9a-f]{12}…$/m);
  expect(text).toMatch(/^ {5}16 {2}2026-01-02 03:04:22 {2}run {4}run 2 {7}lantern-ring {2}[0-9a-f]{12}…$/m);
  expect(text.split('\n')).toHaveLength(7);
  expect(longLines(text)).toEqual([]);
});

test('says when nothing matches', () => {
  const io = keepingIo(filled.directory);
  contentsCommand({ ...optionsFor(filled.book), stage: 'other' }, io);
  expect(io.printed()).toBe('Book lantern: no entries that match.\n');
});
