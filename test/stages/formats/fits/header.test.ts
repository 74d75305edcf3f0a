/** Headers: values as an independent program reads them, round trips, and the texts of errors. */

import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { sourceOf } from '../../../../stages/bytes.ts';
import {
  formatHeader,
  headerTexts,
  headerValue,
  makeHeader,
  type NewCard,
  parseHeader,
  requireInteger,
  requireNumber,
} from '../../../../stages/formats/fits/header.ts';
import { expectedValues, fixture, handmade, problemOf } from './fixtures.ts';

const parse = (cards: readonly string[]) => parseHeader(sourceOf(handmade(cards)), 0).header;

describe('reading', () => {
  // Source: astropy, test/data/fits/expected.json.
  test('gives the values that astropy reads', () => {
    const { header } = parseHeader(fixture('header.fits'), 0);
    const { history, ...values } = expectedValues.header;
    for (const [keyword, value] of Object.entries(values)) {
      const found = headerValue(header, keyword.includes(' ') ? `HIERARCH ${keyword}` : keyword);
      expect(found, keyword).toEqual(value);
    }
    expect(headerValue(header, 'NOVALUE')).toBeNull();
    expect(headerTexts(header, 'HISTORY')).toEqual(history);
    expect(headerTexts(header, 'COMMENT')).toEqual(['invented data']);
  });

  // Source: FITS Standard 4.0, section 4.2: examples of each rule, written by hand.
  test.each([
    ["KEY     = 'it''s'              / quote", "it's"],
    ["KEY     = 'trailing   '", 'trailing'],
    ["KEY     = '  leading'", '  leading'],
    ["KEY     = 'a / b'              / c", 'a / b'],
    ["KEY     = ''", ''],
    ['KEY     =                    T', true],
    ['KEY     = F/ free', false],
    ['KEY     = -42', -42],
    ['KEY     = +1.5D-3', 0.0015],
    ['KEY     = .5E1 / five', 5],
    ['KEY     = 1.', 1],
    ['KEY     =', null],
    ['KEY     =                      / undefined', null],
  ])('%j', (card, value) => {
    expect(headerValue(parse([card]), 'KEY')).toBe(value);
  });

  test('joins strings over CONTINUE and keeps blanks before &', () => {
    const header = parse(["KEY     = 'one &'", "CONTINUE  'two&' / more", "CONTINUE  'three' / words"]);
    expect(headerValue(header, 'KEY')).toBe('one twothree');
  });

  test('takes a card without "= " for commentary', () => {
    expect(headerValue(parse(['KEY      5']), 'KEY')).toBe(' 5');
  });

  test('gives the first of two cards of one keyword', () => {
    expect(headerValue(parse(['KEY     = 1', 'KEY     = 2']), 'KEY')).toBe(1);
  });
});

describe('round trip', () => {
  const ascii = fc.string({
    unit: fc.integer({ min: 32, max: 126 }).map((code) => String.fromCharCode(code)),
  });
  const value = fc.oneof(
    ascii.map((text) => text.trimEnd()),
    fc
      .string({ unit: fc.constantFrom("'", 'a', ' ', '&'), maxLength: 200, size: 'max' })
      .map((text) => text.trimEnd()),
    fc.double({ noNaN: true, noDefaultInfinity: true }),
    fc.integer(),
    fc.boolean(),
    fc.constant(null),
  );

  test('keeps every value', () => {
    fc.assert(
      fc.property(fc.array(value, { maxLength: 60 }), (values) => {
        const cards = values.map((each, i): NewCard => [`KEY${i}`, each, 'comment']);
        const bytes = formatHeader(makeHeader(cards));
        expect(bytes.length % 2880).toBe(0);
        const { header, dataOffset } = parseHeader(sourceOf(bytes), 0);
        expect(dataOffset).toBe(bytes.length);
        values.forEach((each, i) => {
          expect(headerValue(header, `KEY${i}`)).toBe(each);
        });
      }),
    );
  });

  test('refuses what a header cannot hold', () => {
    expect(problemOf(() => formatHeader(makeHeader([['OBJECT', 'µ']]))).message).toBe(
      'FITS keyword OBJECT: not-ascii: expected printable ASCII characters, the only ones that a FITS header can hold, ' +
        'got "µ". Write the text without accents, Greek letters and control characters.',
    );
    expect(() => formatHeader(makeHeader([['OBJECT', Number.NaN]]))).toThrow('formatCard: OBJECT = NaN');
  });
});

describe('errors', () => {
  test('name the byte of the card, what was expected and what stood there', () => {
    const header = parse(['KEY     = 1', "NAXIS   = 'two'"]);
    expect(problemOf(() => requireInteger(header, 'NAXIS', 0, 999)).message).toBe(
      'input, header at byte 0, byte 80: bad-value: expected NAXIS to be an integer from 0 to 999, got two. ' +
        'Correct the header with the program that wrote the file.',
    );
    expect(problemOf(() => requireNumber(header, 'CRVAL1')).message).toBe(
      'input, header at byte 0: missing-keyword: expected CRVAL1 to be a number, got no such keyword. ' +
        'Correct the header with the program that wrote the file.',
    );
  });

  test.each(["'open", '1.5.2', 'NaN', '1E999', '0x10'])(
    'tell of the value %s when it is asked for',
    (text) => {
      const header = parse([`KEY     = ${text}`, 'GOOD    = 1']);
      expect(headerValue(header, 'GOOD')).toBe(1);
      const problem = problemOf(() => headerValue(header, 'KEY'));
      expect([problem.code, problem.found]).toEqual(['bad-value', text]);
    },
  );

  test('refuse a header without END, and one that contradicts itself', () => {
    const blank = sourceOf(new Uint8Array(2880).fill(0x20));
    expect(problemOf(() => parseHeader(blank, 0)).message).toBe(
      'input, header at byte 0: bad-header: expected a card END in the last of one or more blocks of 2880 bytes, ' +
        'got the end of the file at byte 2880. The file is cut short or is no FITS file: fetch it again.',
    );
    const problem = problemOf(() => parse(['NAXIS1  = 1', 'NAXIS1  = 2']));
    expect(problem.found).toBe('NAXIS1 = 1 and NAXIS1 = 2');
  });

  test('refuse bytes that are no header', () => {
    const problem = problemOf(() => parseHeader(sourceOf(new Uint8Array(5760).fill(0xc3)), 0));
    expect([problem.code, problem.place]).toEqual(['bad-header', 'input, byte 0']);
  });
});
