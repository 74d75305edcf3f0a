/** `diff`: document and text. The differences themselves: test/ledger/questions.test.ts. */

import { afterAll, beforeAll, expect, test } from 'vitest';
import { diffCommand } from '../../../runner/commands/diff.ts';
import { type Filled, filledBook, keepingIo, longLines, optionsFor } from './book-io.ts';

let filled: Filled;

beforeAll(() => {
  filled = filledBook();
});

afterAll(() => filled.remove());

function textOf(...words: string[]): string {
  const io = keepingIo(filled.directory);
  expect(diffCommand(words, optionsFor(filled.book), io)).toBe(0);
  return io.printed();
}

test.each([[['1', '2']], [['run 1', 'run 2']], [['run', '1', 'run', '2']], [['last-1', 'last']]])(
  'takes two runs as %j',
  (words) => {
    const io = keepingIo(filled.directory);
    expect(diffCommand(words, optionsFor(filled.book, true), io)).toBe(0);
    const document = JSON.parse(io.printed());
    expect(document.runs).toEqual([1, 2]);
    expect(Object.keys(document)).toEqual([
      'runs',
      'recipe',
      'stages',
      'parameters',
      'inputs',
      'code',
      'environment',
      'outputs',
      'numbers',
      'withdrawals',
    ]);
    expect(document.withdrawals).toEqual([]);
    expect(document.parameters).toEqual([{ stage: 'basis', parameter: 'components', values: [20, 30] }]);
    expect(document.outputs[0]).toMatchObject({ stage: 'observation', output: 'data', same: true });
    expect(document.numbers[0]).toMatchObject({ name: 'ring-diameter', values: [42.1, 42.9] });
  },
);

// The whole screen: what is said of the book of lantern-book.ts, written by hand from it.
test('prints each part, and the numbers as a table', () => {
  expect(textOf('1', '2')).toBe(
    `From run 1 to run 2

  recipe       lantern-ring, the same bytes
  stages       nothing differs
  parameters   1 differs
               basis.components  20  →  30
  inputs       no file from outside differs, 5 from earlier stages
               because an earlier stage's output does: fit.basis, features.basis, features.samples,
               pictures.image, pictures.ring
  code         differs in 1 stage
               fit: version 1 → 2, stages/fit/compute.ts
  environment  nothing differs
  outputs      6 of 11 have the same bytes; these differ:
               basis.basis, fit.image, fit.samples, features.ring, pictures.image
  numbers      2 of 2 moved

                             run 1              run 2  unit  shift  sigmas
  ring-diameter  42.10 +0.80 −0.80  42.90 +0.80 −0.80  uas    +0.8   +0.71
  ring-width                10.525             10.725  uas    +0.2

  sigmas: the shift over the quadrature sum of both half-widths of the 68 % intervals
`,
  );
});

test('says in one line each that nothing differs', () => {
  const text = textOf('2', '2');
  for (const part of ['stages', 'parameters', 'inputs', 'code', 'environment']) {
    expect(text).toMatch(new RegExp(`^ {2}${part} +nothing differs$`, 'm'));
  }
  expect(text).toContain('  outputs      all 11 have the same bytes\n  numbers      all 2 are the same\n');
  expect(longLines(text)).toEqual([]);
});

test.each([[[]], [['1']], [['1', '2', '3']]])('asks for two runs: %j', (words) => {
  expect(() => textOf(...words)).toThrow(
    `diff: expected two runs, such as 1 2 or last-1 last, got ${words.length}.`,
  );
});
