/** Statistics: identities and edge cases. */

import fc from 'fast-check';
import { expect, test } from 'vitest';
import { chiSquareQuantile } from '../../../stages/numerics/chi-square.ts';
import {
  angleDifference,
  circularMean,
  median,
  medianDeviation,
  normalQuantile,
  quantile,
  standardDeviation,
} from '../../../stages/numerics/statistics.ts';

test('keeps quantiles between their neighbours and in order', () => {
  const values = fc.array(fc.double({ min: -1e6, max: 1e6, noNaN: true }), { minLength: 1, maxLength: 30 });
  fc.assert(
    fc.property(values, fc.double({ min: 0, max: 1, noNaN: true }), (list, q) => {
      const value = quantile(list, q);
      return value >= Math.min(...list) && value <= Math.max(...list) && quantile(list, q / 2) <= value;
    }),
  );
});

test('turns the circular mean with the angles', () => {
  const found = circularMean([10, 30, 50].map((angle) => angle + 325));
  expect(found.degrees).toBeCloseTo(355, 10);
  expect(circularMean([0, 180]).length).toBeLessThan(1e-15);
});

test('wraps differences of angles', () => {
  expect(angleDifference(350, 10)).toBe(-20);
  expect(angleDifference(10, 350)).toBe(20);
  expect(angleDifference(190, 10)).toBe(180);
  expect(angleDifference(10, 190)).toBe(180);
});

test('scales the median deviation to the standard deviation of Gaussian values', () => {
  const values = Array.from({ length: 999 }, (_, k) => 3 + 2 * normalQuantile((k + 0.5) / 999));
  expect(median(values)).toBeCloseTo(3, 10);
  expect(Math.abs(medianDeviation(values) - 2)).toBeLessThan(0.01);
  expect(Math.abs(standardDeviation(values) - 2)).toBeLessThan(0.01);
});

test('makes the chi-square of one degree the square of a normal deviate', () => {
  for (const p of [0.1, 0.6827, 0.95]) {
    expect(chiSquareQuantile(p, 1)).toBeCloseTo(normalQuantile((1 + p) / 2) ** 2, 10);
  }
});

test('refuses quantiles of nothing and probabilities outside [0, 1]', () => {
  expect(() => quantile([], 0.5)).toThrow('quantile: 0.5 of 0 values; needs values and a number in [0, 1]');
  expect(() => quantile([1], Number.NaN)).toThrow(
    'quantile: NaN of 1 values; needs values and a number in [0, 1]',
  );
});
