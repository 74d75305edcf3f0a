/** Random groups: a file by astropy, round trips through float32, and what is refused. */

import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { appendGroupsHdu, readGroups } from '../../../../stages/formats/fits/groups.ts';
import { openFits } from '../../../../stages/formats/fits/hdu.ts';
import { expectedValues, fixture, problemOf, written } from './fixtures.ts';

const groupsOf = (source: ReturnType<typeof fixture>) => {
  const [hdu] = openFits(source);
  return readGroups(source, hdu as NonNullable<typeof hdu>);
};

// Source: numpy on what astropy was given, test/data/fits/expected.json: PSCAL = 1 / frequency for u and v.
test('scaled parameters and data come out as they were put in', () => {
  const expected = expectedValues['groups-scaled'];
  const groups = groupsOf(fixture('groups-scaled.fits'));
  expect(groups.count).toBe(expected.count);
  expect(groups.axes.map(({ ctype }) => ctype)).toEqual(expected.ctypes);
  const block = groups.block(0, 100);
  expect(block.count).toBe(expected.count);
  // PSCAL stands in the header with 14 to 16 digits: 1e-13.
  expected.uSeconds.forEach((u: number, g: number) => {
    expect(Math.abs((block.parameter(0)[g] as number) / u - 1)).toBeLessThan(1e-13);
    expect(Math.abs((block.parameter(1)[g] as number) - expected.vSeconds[g])).toBeLessThan(1e-21);
  });
  expect([...(block.named('DATE') ?? [])]).toEqual(expected.date);
  expect([...block.data]).toEqual(expected.data);
  expect(block.named('ABSENT')).toBeUndefined();
});

test('blocks of any length give the same groups', () => {
  const groups = groupsOf(fixture('groups.fits'));
  const whole = groups.block(0, groups.count);
  for (const n of [1, 5, 7]) {
    for (let from = 0; from < groups.count; from += n) {
      const block = groups.block(from, n);
      expect(block.data).toEqual(whole.data.subarray(from * 6, (from + block.count) * 6));
      expect(block.parameter(3)).toEqual(whole.parameter(3).subarray(from, from + block.count));
    }
  }
});

describe('round trip', () => {
  test('keeps float32 values; scaled parameters to float32 precision', () => {
    const group = fc.record({
      parameter: fc.float({ noNaN: true, noDefaultInfinity: true, min: -1000, max: 1000 }),
      scaled: fc.double({ noNaN: true, min: 4, max: 1000 }),
      data: fc.array(fc.float(), { minLength: 6, maxLength: 6 }),
    });
    fc.assert(
      fc.property(fc.array(group, { minLength: 1, maxLength: 12 }), (all) => {
        const half = Math.ceil(all.length / 2);
        const source = written((sink) =>
          appendGroupsHdu(sink, {
            parameters: [
              { name: 'PLAIN', scale: 1, zero: 0 },
              { name: 'SCALED', scale: 1 / 3, zero: 2 },
            ],
            axes: [
              { ctype: 'COMPLEX', n: 3, crval: 1, crpix: 1, cdelt: 1 },
              { ctype: 'STOKES', n: 2, crval: -1, crpix: 1, cdelt: -1 },
            ],
            count: all.length,
            blocks: [all.slice(0, half), all.slice(half)].map((part) => ({
              count: part.length,
              parameters: [part.map(({ parameter }) => parameter), part.map(({ scaled }) => scaled)],
              data: part.flatMap(({ data }) => data),
            })),
            cards: [['OBJECT', 'INVENTED']],
          }),
        );
        const block = groupsOf(source).block(0, all.length);
        expect([...block.parameter(0)].map((x) => x + 0)).toEqual(all.map(({ parameter }) => parameter + 0));
        all.forEach(({ scaled }, g) => {
          // Half a unit in the last place of float32 is 2^-24 of the stored value, which is at most scaled * 3.
          expect(Math.abs((block.parameter(1)[g] as number) - scaled)).toBeLessThan(scaled * 6e-8);
        });
        expect([...block.data].map((x) => x + 0)).toEqual(all.flatMap(({ data }) => data.map((x) => x + 0)));
      }),
    );
  });
});

test('an image is refused', () => {
  expect(problemOf(() => groupsOf(fixture('minimal.fits'))).message).toBe(
    'minimal.fits, HDU 1: no-groups: expected random groups with data (NAXIS1 = 0, GROUPS = T, GCOUNT groups) in the ' +
      'first HDU, got an HDU of kind image. Give visibility data as FITS random groups, or declare the format that the ' +
      'file has.',
  );
});
