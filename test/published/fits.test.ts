/** FITS against values from outside. Sources: FITS Standard 4.0, Appendix J (the published example of the encoding);
 *  the other sums and the files are of an independent implementation (see test/data/README.md). */

import { createHash } from 'node:crypto';
import { describe, expect, test } from 'vitest';
import { memorySink } from '../../stages/bytes.ts';
import { encodeChecksum, onesComplementSum } from '../../stages/formats/fits/checksum.ts';
import { parseForm, widthOf } from '../../stages/formats/fits/columns.ts';
import { readGroups } from '../../stages/formats/fits/groups.ts';
import { openFits } from '../../stages/formats/fits/hdu.ts';
import { headerValue } from '../../stages/formats/fits/header.ts';
import { appendEmptyPrimary } from '../../stages/formats/fits/table.ts';
import { fixture, fixtureBytes } from '../stages/formats/fits/fixtures.ts';

describe('checksums', () => {
  test('encode the sum of Appendix J', () => {
    expect(encodeChecksum(868229149)).toBe('hcHjjc9ghcEghc9g');
  });

  // Source: own implementation of Appendix J in Python, agreeing with the published example.
  test.each([
    [0, 'orrrrooooooooooo'],
    [1, 'orrrqooooooooooo'],
    [2503531142, 'NLdAOJa2NJa9NJa9'],
    [4294967295, '0000000000000000'],
    [305419896, 'QleaTkbTQkbZQkbZ'],
  ])('encode %i', (sum, text) => {
    expect(encodeChecksum(sum)).toBe(text);
  });

  // Source: astropy, fitsverify and a Python implementation agree on the sums of this file.
  test('agree with the file of random groups', () => {
    const bytes = fixtureBytes('groups.fits');
    const [hdu] = openFits(fixture('groups.fits'));
    expect(hdu && headerValue(hdu.header, 'CHECKSUM')).toBe('FAARH63OFAAOF53O');
    expect(hdu && headerValue(hdu.header, 'DATASUM')).toBe('3717516106');
    expect(onesComplementSum(bytes.subarray(hdu?.dataOffset))).toBe(3717516106);
    expect(onesComplementSum(bytes)).toBe(4294967295);
  });

  // Source: the smallest legal primary HDU with its sums, made in Python and accepted by astropy and fitsverify.
  test('of an empty primary HDU that we write give the known file, byte for byte', () => {
    const sink = memorySink();
    appendEmptyPrimary(sink);
    expect(Buffer.from(sink.bytes())).toEqual(Buffer.from(fixtureBytes('minimal.fits')));
    expect(createHash('sha256').update(sink.bytes()).digest('hex')).toBe(
      '98e09083e470e8f1d0f2b485941fc25d74df17c5695e2052a51f3de73e20b120',
    );
  });
});

// Source: FITS Standard 4.0, section 7.3.1, table 18; widths checked with astropy, P and Q from memory.
test.each([
  ['L', 1],
  ['B', 1],
  ['I', 2],
  ['J', 4],
  ['K', 8],
  ['A', 1],
  ['E', 4],
  ['D', 8],
  ['C', 8],
  ['M', 16],
  ['PE(3)', 8],
  ['QD(3)', 16],
])('form %s takes %i bytes', (form, bytes) => {
  const parsed = parseForm(form);
  expect(parsed && widthOf(parsed)).toBe(bytes);
});

describe('random groups', () => {
  const source = fixture('groups.fits');
  const [hdu] = openFits(source);
  const groups = readGroups(source, hdu as NonNullable<typeof hdu>);

  // Source: written by astropy, first group read by a byte parser in Python.
  test('have the sizes, parameters and data of the file', () => {
    expect(groups.count).toBe(12);
    expect(groups.axes.map(({ ctype, n }) => [ctype, n])).toEqual([
      ['COMPLEX', 3],
      ['STOKES', 2],
      ['FREQ', 1],
      ['IF', 1],
      ['RA', 1],
      ['DEC', 1],
    ]);
    const block = groups.block(0, 1);
    expect(groups.parameters.map((_, i) => block.parameter(i)[0])).toEqual([
      2.051674891845323e-5, 0.0049825394526124, -0.004572127480059862, 258, 2458100.5, 0.25, 10,
    ]);
    expect([...block.data]).toEqual([
      -0.8905918598175049, -0.9916465282440186, 4, -0.454670786857605, 0.0601436011493206, -1,
    ]);
  });

  // Source: FITS Standard 4.0, section 6.1.2 (parameters of one name are added); dates as put in, tolerance 2 ms.
  test('add the two parameters called DATE', () => {
    const dates = groups.block(0, 12).named('DATE') as Float64Array;
    const expected = [...Array(6).fill(2458100.75), ...Array(6).fill(2458100.76)];
    dates.forEach((date, i) => {
      expect(Math.abs(date - expected[i]) * 86400).toBeLessThan(2e-3);
    });
  });
});
