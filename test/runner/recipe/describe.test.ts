/** Ranges in words: numbers as they are shortest. */

import { expect, test } from 'vitest';
import { describeRange } from '../../../runner/recipe/describe.ts';

test.each([
  [0, 2147483647, '', ' from 0 to 2147483647'],
  [1e-3, 1e9, 'uas', ' from 0.001 to 1e9 uas'],
  [-1e-5, undefined, 'Jy', ' of at least -1e-5 Jy'],
  [undefined, 400, '', ' of at most 400'],
  [undefined, undefined, 's', ''],
])('from %s to %s %s', (from, to, unit, words) => {
  expect(describeRange(from, to, unit)).toBe(words);
});
