/** Findings as text, with the limits by which they were judged. */

import { expect, test } from 'vitest';
import { againstLimits, findingTexts } from '../../runner/finding-text.ts';

const finding = {
  check: 'closureScatter',
  value: 0.95512,
  marginal: 1.5,
  limit: 2.5,
  detail: 'Of 40 triangles.',
};

test('says value, marginal value and limit, the value to three digits', () => {
  expect(againstLimits(finding)).toBe('0.955 (marginal 1.5, limit 2.5)');
  expect(againstLimits({ value: -12.3456, marginal: 20, limit: 30 })).toBe('−12.3 (marginal 20, limit 30)');
  // Tiny values keep their power of ten.
  expect(againstLimits({ value: 5.2341e-8, marginal: 0.001, limit: 0.005 })).toBe(
    '5.23e−8 (marginal 0.001, limit 0.005)',
  );
  expect(againstLimits({ value: Number.NaN, marginal: 1, limit: 2 })).toBe('NaN (marginal 1, limit 2)');
});

test('tells everything of what is not within its limits, and in one line all that is', () => {
  const texts = findingTexts([
    { ...finding, finding: 'within limits' },
    {
      ...finding,
      check: 'gainOffset',
      value: 0.37,
      marginal: 0.2,
      limit: 0.6,
      finding: 'marginal',
      detail: 'WICK-A.',
    },
    { ...finding, check: 'clock', value: 0.1, marginal: 0.3, limit: 0.95, finding: 'within limits' },
  ]);
  expect(texts).toEqual([
    'marginal: gainOffset 0.37 (marginal 0.2, limit 0.6): WICK-A.',
    '2 checks within limits, value (limit): closureScatter 0.955 (2.5), clock 0.1 (0.95)',
  ]);
  expect(findingTexts([])).toEqual([]);
});
