/** Binary tables: every form as astropy reads it, round trips, and what is refused. */

import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { sourceOf } from '../../../../stages/bytes.ts';
import { listHdus, openFits, requireTable, tablesEndingIn } from '../../../../stages/formats/fits/hdu.ts';
import { appendEmptyPrimary, appendTableHdu, readTable } from '../../../../stages/formats/fits/table.ts';
import {
  expectedValues,
  fixture,
  fixtureBytes,
  handmade,
  numbersOf,
  problemOf,
  written,
} from './fixtures.ts';

const source = fixture('table.fits');
const hdus = openFits(source);
const open = (extname: string) => readTable(source, requireTable(source, hdus, extname));

describe('reading', () => {
  const expected = expectedValues.table;
  const table = open('FORMS');

  // Source of all values: astropy, test/data/fits/expected.json.
  test.each(['BYTE', 'SHORT', 'INT', 'LONG', 'SINGLE', 'DOUBLE', 'UNSIGNED', 'UNSIGNED4', 'UNSIGNED8'])(
    'gives the numbers of %s',
    (name) => {
      expect([...table.column(name).numbers()]).toEqual(numbersOf(expected[name]));
    },
  );

  test('gives logicals, bits, texts, complex numbers and scaled numbers', () => {
    expect([...table.column('LOGICAL').flags()]).toEqual(expected.LOGICAL);
    expect([...table.column('BITS').flags()]).toEqual(expected.BITS);
    expect(table.column('name').texts()).toEqual(expected.NAME);
    for (const name of ['CSINGLE', 'CDOUBLE']) {
      const { re, im } = table.column(name).complex();
      expect([...re]).toEqual(expected[name].re);
      // Numpy multiplies 0 by -0.1 to -0; equal all the same.
      expect([...im].map((x) => x + 0)).toEqual(expected[name].im.map((x: number) => x + 0));
    }
    expect([...open('SCALED').column('SCALED').numbers()]).toEqual(expected.SCALED);
  });

  test('gives lists of any length', () => {
    for (const name of ['LIST', 'LONGLIST']) {
      const lists = open('LISTS').column(name).lists();
      expect(lists.map((list) => [...list])).toEqual(expected[name]);
    }
  });

  test('gives shape and unit of columns, empty ones too', () => {
    expect(table.rows).toBe(3);
    expect([table.column('INT').unit, table.column('INT').repeat]).toEqual(['m', 2]);
    expect(table.column('EMPTY').numbers()).toEqual(new Float64Array(0));
    expect([table.has('double'), table.has('absent')]).toEqual([true, false]);
  });

  test('finds tables by the ending of EXTNAME', () => {
    const other = written((sink) => {
      appendEmptyPrimary(sink);
      for (const extname of ['INVENTED AN', 'AN', 'PLAN', 'INVENTED FQ'])
        appendTableHdu(sink, { extname, rows: 0, columns: [] });
    });
    expect(tablesEndingIn(listHdus(other), 'AN').map(({ extname }) => extname)).toEqual([
      'INVENTED AN',
      'AN',
    ]);
  });
});

describe('round trip', () => {
  const texts = fc.string({ unit: fc.constantFrom('a', 'B', '1', '-', ' ', "'"), maxLength: 6 });
  const row = fc.record({
    long: fc.tuple(fc.integer(), fc.integer()),
    short: fc.integer({ min: -32768, max: 32767 }),
    big: fc.maxSafeInteger(),
    byte: fc.integer({ min: 0, max: 255 }),
    double: fc.double(),
    single: fc.float(),
    flag: fc.tuple(fc.boolean(), fc.boolean(), fc.boolean()),
    text: texts.map((text) => text.trimEnd()),
    re: fc.double(),
    im: fc.double(),
  });

  test('keeps every value of every form', () => {
    fc.assert(
      fc.property(fc.array(row, { maxLength: 20 }), (rows) => {
        const from = written((sink) => {
          appendEmptyPrimary(sink);
          appendTableHdu(sink, {
            extname: 'ROWS',
            rows: rows.length,
            columns: [
              { name: 'LONG', form: '2J', values: rows.flatMap(({ long }) => long) },
              { name: 'SHORT', form: '1I', values: rows.map(({ short }) => short) },
              { name: 'BIG', form: '1K', values: rows.map(({ big }) => big) },
              { name: 'BYTE', form: '1B', values: rows.map(({ byte }) => byte) },
              { name: 'DOUBLE', form: '1D', unit: 'Jy', values: rows.map(({ double }) => double) },
              { name: 'SINGLE', form: 'E', values: rows.map(({ single }) => single) },
              { name: 'FLAG', form: '3L', values: rows.flatMap(({ flag }) => flag.map(Number)) },
              { name: 'TEXT', form: '6A', values: rows.map(({ text }) => text) },
              { name: 'COMPLEX', form: '1M', values: rows.flatMap(({ re, im }) => [re, im]) },
            ],
          });
        });
        const table = readTable(from, requireTable(from, openFits(from), 'ROWS'));
        const numbers = (name: string) => [...table.column(name).numbers()].map((x) => x + 0);
        expect(numbers('LONG')).toEqual(rows.flatMap(({ long }) => long).map((x) => x + 0));
        expect(numbers('SHORT')).toEqual(rows.map(({ short }) => short + 0));
        expect(numbers('BIG')).toEqual(rows.map(({ big }) => big + 0));
        expect(numbers('BYTE')).toEqual(rows.map(({ byte }) => byte));
        expect([...table.column('DOUBLE').numbers()]).toEqual(rows.map(({ double }) => double));
        expect([...table.column('SINGLE').numbers()]).toEqual(rows.map(({ single }) => single));
        expect([...table.column('FLAG').flags()]).toEqual(rows.flatMap(({ flag }) => flag.map(Number)));
        expect(table.column('TEXT').texts()).toEqual(rows.map(({ text }) => text));
        expect([...table.column('COMPLEX').complex().im]).toEqual(rows.map(({ im }) => im));
      }),
    );
  });

  test('refuses texts that do not fit', () => {
    const write = (text: string) =>
      written((sink) =>
        appendTableHdu(sink, { extname: 'T', rows: 1, columns: [{ name: 'N', form: '4A', values: [text] }] }),
      );
    expect(problemOf(() => write('fünf')).message).toBe(
      'table T, column N, row 1: not-ascii: expected at most 4 printable ASCII characters, as a FITS table holds ' +
        'them, got "fünf". Give the thing a shorter or plainer name.',
    );
    expect(problemOf(() => write('seven')).found).toBe('"seven"');
  });
});

describe('errors', () => {
  const bintable = (cards: string[], data: Uint8Array) => {
    const primary = handmade(['SIMPLE  = T', 'BITPIX  = 8', 'NAXIS   = 0']);
    const table = ["XTENSION= 'BINTABLE'", 'BITPIX  = 8', 'NAXIS   = 2', ...cards];
    const from = sourceOf(new Uint8Array(Buffer.concat([primary, handmade(table, data)])));
    return () => readTable(from, listHdus(from)[1] as ReturnType<typeof listHdus>[number]);
  };
  const oneRow = ['NAXIS1  = 8', 'NAXIS2  = 1', 'PCOUNT  = 0', 'GCOUNT  = 1', 'TFIELDS = 1'];

  test('name the column that is missing and those that there are', () => {
    const { message } = problemOf(() => open('SCALED').column('MJD'));
    expect(message).toBe(
      'table.fits, HDU 3 (SCALED): missing-column: expected a column MJD, got columns SCALED. ' +
        'Give a file whose table has the columns that its kind prescribes.',
    );
  });

  test('name form and row', () => {
    expect(problemOf(() => open('FORMS').column('NAME').numbers()).message).toBe(
      'table.fits, HDU 2 (FORMS), column NAME: bad-column: expected a column of numbers (B I J K E D), got TFORM 8A. ' +
        'Give a file whose table has the columns that its kind prescribes.',
    );
    const bytes = fixtureBytes('table.fits');
    const at = Buffer.from(bytes).indexOf('station');
    bytes[at] = 7;
    const damaged = sourceOf(bytes);
    const table = readTable(damaged, requireTable(damaged, listHdus(damaged), 'FORMS'));
    expect(problemOf(() => table.column('NAME').texts()).message).toBe(
      'input, HDU 2 (FORMS), column NAME, row 2, character 1: not-ascii: expected printable ASCII, got byte 0x07. ' +
        'Correct the name with the program that wrote the file.',
    );
  });

  test('refuse columns that do not fill the row, unknown forms and absurd counts', () => {
    const data = new Uint8Array(8);
    expect(problemOf(bintable([...oneRow, "TFORM1  = '1J'"], data)).message).toBe(
      'input, HDU 2: bad-size: expected rows of NAXIS1 = 8 bytes, got columns (TFORM1 to TFORM1) that take 4 bytes. ' +
        'The header contradicts itself: make the file again.',
    );
    expect(problemOf(bintable([...oneRow, "TFORM1  = '8Z'"], data)).found).toBe('"8Z"');
    expect(problemOf(bintable([...oneRow, "TFORM1  = '99999999999999999999D'"], data)).code).toBe(
      'bad-value',
    );
    expect(problemOf(bintable([...oneRow, "TFORM1  = '1D'", 'TSCAL1  = 0'], data)).found).toBe('TSCAL1 = 0');
    const many = ['NAXIS1  = 0', 'NAXIS2  = 9000000000000000', 'PCOUNT  = 0', 'GCOUNT  = 1', 'TFIELDS = 0'];
    expect(problemOf(bintable(many, new Uint8Array(0))).found).toBe('9000000000000000 rows of 0 bytes');
  });

  // Source: FITS Standard 4.0, section 7.3.2: TNULL is the stored integer that means "undefined".
  test('do not come from TNULL of 64 bits, which no double holds', () => {
    const data = new DataView(new ArrayBuffer(16));
    data.setBigInt64(0, 9223372036854775807n);
    data.setBigInt64(8, -1n);
    const cards = [
      'NAXIS1  = 16',
      'NAXIS2  = 1',
      'PCOUNT  = 0',
      'GCOUNT  = 1',
      'TFIELDS = 1',
      "TFORM1  = '2K'",
    ];
    const read = (more: string[]) => [
      ...bintable([...cards, ...more], new Uint8Array(data.buffer))()
        .columnAt(0)
        .numbers(),
    ];
    expect(read(['TNULL1  = 9223372036854775807'])).toEqual([Number.NaN, -1]);
    expect(problemOf(() => read([])).found).toBe('9223372036854775807');
  });

  test('refuse a list that points outside the heap', () => {
    const cards = [
      'NAXIS1  = 8',
      'NAXIS2  = 1',
      'PCOUNT  = 4',
      'GCOUNT  = 1',
      'TFIELDS = 1',
      "TFORM1  = '1PE(9)'",
    ];
    const list = (count: number, offset: number) => {
      const data = new DataView(new ArrayBuffer(12));
      data.setInt32(0, count);
      data.setInt32(4, offset);
      data.setFloat32(8, 1.5);
      return bintable(cards, new Uint8Array(data.buffer))().columnAt(0).lists();
    };
    expect(list(1, 0)).toEqual([Float64Array.of(1.5)]);
    for (const [count, offset] of [
      [2, 0],
      [1, 1],
      [-1, 0],
      [1, -4],
      [2147483647, 0],
    ] as const) {
      const { code, found } = problemOf(() => list(count, offset));
      expect([code, found]).toEqual(['bad-size', `${count} elements from its byte ${offset} on`]);
    }
  });
});
