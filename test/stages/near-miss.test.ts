import { expect, test } from 'vitest';
import { didYouMean, nearMiss } from '../../stages/near-miss.ts';

const words = ['components', 'field', 'terms', 'fit'];

test.each([
  ['componets', 'components'],
  ['ocmponents', 'components'],
  ['FIELD', 'field'],
  ['fti', 'fit'],
  ['term', 'terms'],
])('takes `%s` for `%s`', (word, meant) => expect(nearMiss(word, words)).toBe(meant));

test.each(['', 'x', 'nothing-like-it'])('finds nothing near to `%s`', (word) => {
  expect(nearMiss(word, words)).toBeUndefined();
  expect(didYouMean(word, words)).toBe('');
});

test('takes the first of two that are equally near', () => expect(nearMiss('ab', ['ac', 'ad'])).toBe('ac'));
