/** Texts of dates and times. */

import fc from 'fast-check';
import { expect, test } from 'vitest';
import { calendarDate, formatDate, julianDate, parseUtc } from '../../../stages/numerics/time.ts';

test('reads a date with time, with and without Z, with a fraction', () => {
  expect(parseUtc('1970-01-02T06:00:00Z')).toBe(40588.25);
  expect(parseUtc('1970-01-02T06:00:00')).toBe(40588.25);
  expect(parseUtc('1970-01-01T00:00:00.5Z')).toBeCloseTo(40587 + 0.5 / 86400, 10);
});

test.each([
  '2023-02-29T00:00:00Z',
  '2031-13-01T00:00:00Z',
  '2031-00-01T00:00:00Z',
  '2031-04-31T00:00:00Z',
  '2031-04-07T24:00:00Z',
  '2031-04-07T21:60:00Z',
  '2031-04-07T21:00:60Z',
  '2031-04-07 21:00:00Z',
  '2031-4-7T21:00:00Z',
  '2031-04-07T21:00:00+01:00',
  '2031-04-07',
  '',
])('refuses %s', (text) => {
  expect(parseUtc(text)).toBeUndefined();
});

test('goes from Julian dates to the calendar and back', () => {
  fc.assert(
    fc.property(fc.integer({ min: 2299161, max: 3000000 }), (day) => {
      expect(julianDate(calendarDate(day + 0.5))).toBe(day + 0.5);
    }),
    { seed: 4 },
  );
});

test('writes the date that it read, leap days too', () => {
  for (const date of ['2000-02-29', '2031-04-07', '1999-12-31', '2100-03-01']) {
    expect(formatDate(parseUtc(`${date}T23:59:59Z`) ?? 0)).toBe(date);
  }
});
