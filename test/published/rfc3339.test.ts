/** Times against RFC 3339. */

import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { formatTime, isTime, parseTime, timeBound } from '../../ledger/time.ts';

describe('times that a person types', () => {
  // Source: RFC 3339, section 5.8; the conversions to UTC by another language's library.
  test.each([
    ['1985-04-12T23:20:50.52Z', '1985-04-12T23:20:50.520Z'],
    ['1996-12-19T16:39:57-08:00', '1996-12-20T00:39:57.000Z'],
    ['1937-01-01T12:00:27.87+00:20', '1937-01-01T11:40:27.870Z'],
  ])('reads %s as %s', (text, utc) => {
    expect(formatTime(new Date(parseTime(text)))).toBe(utc);
  });

  // Source: seconds since 1970 by another language's library.
  test.each([
    ['1985-04-12T23:20:50.52Z', 482196050.52],
    ['1970-01-01T00:00:00Z', 0],
    ['2000-01-01T12:00:00Z', 946728000],
    ['2017-12-08T00:00:00Z', 1512691200],
  ])('reads %s as %d s after 1970', (text, seconds) => {
    expect(parseTime(text)).toBe(seconds * 1000);
  });

  // Source: RFC 3339, section 5.8: the leap second at the end of 1990, in UTC and eight hours behind. It counts as the
  // second after it, the first of 1991.
  test.each(['1990-12-31T23:59:60Z', '1990-12-31T15:59:60-08:00'])('reads the leap second %s', (text) => {
    expect(formatTime(new Date(parseTime(text)))).toBe('1991-01-01T00:00:00.000Z');
  });

  // Source: RFC 3339, section 5.6 and 5.7: what the grammar or the calendar does not admit.
  test.each([
    '1985-04-12 23:20Z',
    '1985-04-12T24:00:00Z',
    '2023-02-29T00:00:00Z',
    '1985-04-12T23:20:50.Z',
    '1985-04-12T23:20:50',
    '1985-4-12T23:20:50Z',
    '1985-04-12T23:20:50+0000',
    '1990-12-30T23:59:60Z',
    '2023-13-01T00:00:00Z',
    '2023-01-01T00:00:00+24:00',
    'yesterday',
    '',
  ])('refuses %j', (text) => {
    expect(() => parseTime(text)).toThrow(`${JSON.stringify(text)}: expected`);
  });

  test('keeps a date a date, and brings a time to UTC', () => {
    expect(timeBound('2026-03-01')).toBe('2026-03-01');
    expect(timeBound('2026-03-01T01:00:00+02:00')).toBe('2026-02-28T23:00:00.000Z');
    expect(() => timeBound('2026-02-30')).toThrow('expected a time of the calendar (RFC 3339).');
  });
});

describe('the form that entries have', () => {
  test.each(['1985-04-12T23:20:50.520Z', '2000-02-29T00:00:00.000Z', '0000-01-01T00:00:00.000Z'])(
    'admits %s',
    (text) => expect(isTime(text)).toBe(true),
  );

  test.each([
    '1985-04-12T23:20:50.52Z',
    '1996-12-19T16:39:57-08:00',
    '1937-01-01T12:00:27.87+00:20',
    '1990-12-31T23:59:60Z',
    '1990-12-31T15:59:60-08:00',
    '1985-04-12 23:20Z',
    '1985-04-12T24:00:00Z',
    '2023-02-29T00:00:00Z',
    '1985-04-12T23:20:50.Z',
    '1985-04-12T23:20:50',
    '1985-4-12T23:20:50Z',
    '1985-04-12T23:20:50+0000',
    '1985-04-12t23:20:50.520z',
    '1985-04-12T23:20:50.5200Z',
    '2023-02-29T00:00:00.000Z',
    '2023-01-01T24:00:00.000Z',
    '2016-12-31T23:59:60.000Z',
  ])('refuses %j', (text) => expect(isTime(text)).toBe(false));

  test('is written for every time of four-digit years, and sorts as the times do', () => {
    const dates = fc.date({
      min: new Date('0000-01-01T00:00:00Z'),
      max: new Date('9999-12-31T23:59:59.999Z'),
      noInvalidDate: true,
    });
    fc.assert(
      fc.property(dates, dates, (a, b) => {
        expect(isTime(formatTime(a))).toBe(true);
        expect(parseTime(formatTime(a))).toBe(a.getTime());
        expect(formatTime(a) < formatTime(b)).toBe(a.getTime() < b.getTime());
      }),
    );
  });

  test('is not written for other years', () => {
    expect(() => formatTime(new Date(Date.UTC(10_000, 0)))).toThrow(
      'expected a time between the years 0000 and 9999',
    );
    expect(() => formatTime(new Date(Number.NaN))).toThrow('"no time": expected a time between');
  });
});
