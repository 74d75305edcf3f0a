/** Round trips of the formats between stages, and what their readers refuse. */

import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { sourceOf } from '../../../stages/bytes.ts';
import { fromArcsec, fromDegrees, toArcsec, toDegrees } from '../../../stages/formats/angles.ts';
import { readBasis, writeBasis } from '../../../stages/formats/basis.ts';
import type { NewCard } from '../../../stages/formats/fits/header.ts';
import { appendImageHdu } from '../../../stages/formats/fits/image.ts';
import { readPosterior, readVariants, writePosterior } from '../../../stages/formats/posterior.ts';
import { readSkyCube, readSkyImage, startSkyCube, writeSkyImage } from '../../../stages/formats/sky-image.ts';
import { readVisibilities } from '../../../stages/formats/visibilities.ts';
import { writeVisibilities } from '../../../stages/formats/visibilities-write.ts';
import { fixture, problemOf, written } from './fits/fixtures.ts';
import { basis, image, optical, posterior, visibilities } from './our-files.ts';

describe('images', () => {
  test('come back to the bit, but for the last bit of the pixel size when first written', () => {
    const { unit, ...once } = readSkyImage(written((sink) => writeSkyImage(sink, image)));
    expect(once).toEqual({ ...image, pixelRadians: once.pixelRadians });
    expect(once.pixelRadians / image.pixelRadians).toBeCloseTo(1, 15);
    expect(unit).toBe('Jy/pixel');
    expect(readSkyImage(written((sink) => writeSkyImage(sink, once)))).toEqual({ ...once, unit });
  });

  test('of a cube come back in single precision', () => {
    const planes = [0, 1, 2].map((k) => image.pixels.map((x) => x * 0.1 + k));
    const cube = readSkyCube(
      written((sink) => {
        const writer = startSkyCube(sink, { ...image, count: 3 });
        for (const plane of planes) writer.plane(plane);
        writer.end();
      }),
    );
    expect([cube.nx, cube.ny, cube.count]).toEqual([5, 4, 3]);
    for (const [k, plane] of planes.entries()) expect(cube.plane(k)).toEqual(plane.map(Math.fround));
  });

  const picture = (cards: NewCard[], shape = [2, 2]) =>
    written((sink) => {
      const data = [Float64Array.from({ length: shape.reduce((a, b) => a * b, 1) }, (_, i) => i)];
      appendImageHdu(sink, { shape, bitpix: -64, data, cards, first: true });
    });
  const degree = Math.PI / 180;

  // Source: FITS Standard 4.0, section 8: CDELT1 < 0 is east to the left, CONVENTIONS.
  test('are turned to x west, y north by the signs of CDELT', () => {
    const read = (x: number, y: number) =>
      [...readSkyImage(picture([['CDELT1', x] as const, ['CDELT2', y] as const])).pixels].join('');
    expect([read(-1, 1), read(1, 1), read(-1, -1), read(1, -1)]).toEqual(['0123', '1032', '2301', '3210']);
  });

  test('have pixel sizes in the unit of CUNIT, or from CDi_j, with further axes of one element', () => {
    const mas: NewCard[] = [1, 2].flatMap((n): NewCard[] => [
      [`CDELT${n}`, n === 1 ? -2 : 2],
      [`CUNIT${n}`, 'mas'],
    ]);
    expect(readSkyImage(picture(mas)).pixelRadians / (2 * degree)).toBeCloseTo(1 / 3.6e6, 20);
    const cd: NewCard[] = [
      ['CD1_1', -0.5],
      ['CD2_2', 0.5],
    ];
    expect(readSkyImage(picture(cd, [2, 2, 1, 1])).pixelRadians).toBe(0.5 * degree);
  });

  test.each([
    [[], 'bad-grid', '0 by 0 degrees'],
    [
      [
        ['CDELT1', -1],
        ['CDELT2', 2],
      ],
      'bad-grid',
      '-1 by 2 degrees',
    ],
    [
      [
        ['CDELT1', -1],
        ['CDELT2', 1],
        ['CROTA2', 30],
      ],
      'bad-grid',
      'CROTA2 = 30',
    ],
    [
      [
        ['CDELT1', -1],
        ['CDELT2', 1],
        ['CUNIT1', 'parsec'],
      ],
      'bad-grid',
      'parsec',
    ],
  ] as [NewCard[], string, string][])('with %j are refused', (cards, code, found) => {
    const problem = problemOf(() => readSkyImage(picture(cards)));
    expect([problem.code, problem.found]).toEqual([code, found]);
  });

  test('of more than one plane, without pixels or with NaN are refused', () => {
    const cards: NewCard[] = [
      ['CDELT1', -1],
      ['CDELT2', 1],
    ];
    expect(problemOf(() => readSkyImage(picture(cards, [2, 2, 3]))).found).toBe('a cube of 3 images');
    expect(problemOf(() => readSkyImage(fixture('minimal.fits'))).code).toBe('no-image');
    const bad = written((sink) =>
      appendImageHdu(sink, { shape: [2, 2], bitpix: -64, data: [[1, 2, Number.NaN, 4]], cards, first: true }),
    );
    expect(problemOf(() => readSkyImage(bad)).message).toBe(
      'written, HDU 1, plane 1, pixel (1, 2): not-finite: expected a finite value, got NaN. ' +
        'Fill undefined pixels, with zeros if they are empty sky.',
    );
    const nan = { ...image, pixels: image.pixels.map(() => Number.NaN) };
    expect(() => written((sink) => writeSkyImage(sink, nan))).toThrow('writeSkyImage: pixel 0 is NaN');
  });
});

describe('angles', () => {
  const angle = fc.double({ min: 1e-13, max: 1e-3, noNaN: true });
  test('change in the last bit at most when first written, and never again', () => {
    for (const [to, from] of [
      [toDegrees, fromDegrees],
      [toArcsec, fromArcsec],
    ] as const) {
      fc.assert(
        fc.property(angle, (radians) => {
          const once = from(to(radians));
          expect(Math.abs(once - radians)).toBeLessThanOrEqual(radians * 3e-16);
          expect(from(to(once))).toBe(once);
        }),
      );
    }
  });
});

describe('basis', () => {
  test('comes back', () => {
    const source = written((sink) => writeBasis(sink, basis));
    const once = readBasis(source);
    expect({ ...once, pixelRadians: 0, resolutionRadians: 0 }).toEqual({
      ...basis,
      pixelRadians: 0,
      resolutionRadians: 0,
    });
    expect(once.pixelRadians / basis.pixelRadians).toBeCloseTo(1, 15);
    expect(once.resolutionRadians / basis.resolutionRadians).toBeCloseTo(1, 15);
    expect(readBasis(written((sink) => writeBasis(sink, once)))).toEqual(once);
  });

  test('whose parts do not belong together is refused', () => {
    const wrong = written((sink) =>
      writeBasis(sink, {
        ...basis,
        components: [basis.mean],
        eigenvalues: Float64Array.of(1),
        scores: Float64Array.of(1, 2, 3),
      }),
    );
    expect(readBasis(wrong).components).toHaveLength(1);
    expect(problemOf(() => readBasis(fixture('table.fits'))).code).toBe('no-image');
    expect(problemOf(() => readBasis(written((sink) => writeSkyImage(sink, image)))).message).toBe(
      'written: missing-table: expected one binary table with EXTNAME SPECTRUM, got 0 among unnamed. ' +
        'Give a file of the format that the input declares.',
    );
    const nan = { ...basis, scores: basis.scores.map(() => Number.NaN) };
    expect(() => written((sink) => writeBasis(sink, nan))).toThrow('writeBasis, scores: value 0 is NaN');
  });
});

describe('posterior', () => {
  test('comes back, whatever its size', () => {
    expect(readPosterior(written((sink) => writePosterior(sink, posterior)))).toEqual(posterior);
    fc.assert(
      fc.property(fc.nat(20), fc.nat(5), (count, components) => {
        const flux = Float64Array.from({ length: count }, (_, i) => i / 7);
        const coefficients = Float64Array.from({ length: count * components }, (_, i) => i / 3);
        const draws = { count, components, flux, coefficients };
        expect(readPosterior(written((sink) => writePosterior(sink, draws)))).toEqual(draws);
      }),
    );
  });
});

test('variants of a posterior come back by their role, and another role is refused', () => {
  const file = (role: string) =>
    written((sink) =>
      writePosterior(sink, posterior, { variants: [{ role: role as 'components', posterior }] }),
    );
  for (const role of ['gains fixed', 'components'])
    expect(readVariants(file(role))).toEqual([{ role, posterior }]);
  expect(problemOf(() => readVariants(file('other'))).message).toBe(
    'written, HDU 3 (VARIANT): bad-value: expected ROLE gains fixed or components, got "other". Give the output of a stage of kind fit.',
  );
});

describe('visibilities', () => {
  const back = readVisibilities(written((sink) => writeVisibilities(sink, visibilities)));

  test('come back: names, places, times and counts to the bit', () => {
    for (const key of [
      'target',
      'arrayName',
      'remark',
      'stations',
      'wavelengthMetres',
      'bandwidthMetres',
      'count',
      'station1',
      'station2',
      'scan',
      'timeMjd',
      'integrationSeconds',
      'sigma',
    ] as const) {
      expect(back[key], key).toEqual(visibilities[key]);
    }
  });

  test('come back: complex numbers and coordinates to rounding', () => {
    // Amplitude and phase, metres and degrees: a few roundings of 1.1e-16 each.
    for (const key of ['u', 'v', 're', 'im', 'sigmaPhase'] as const) {
      for (const [i, value] of visibilities[key].entries()) {
        const scale = Math.max(Math.abs(value), key === 're' || key === 'im' ? 0.75 : 0);
        expect(Math.abs((back[key][i] as number) - value), key).toBeLessThanOrEqual(scale * 1e-15);
      }
    }
  });

  test('without a single row come back', () => {
    const none = {
      ...visibilities,
      count: 0,
      ...Object.fromEntries(
        ['u', 'v', 're', 'im', 'sigma', 'sigmaPhase', 'timeMjd', 'integrationSeconds'].map((k) => [
          k,
          new Float64Array(0),
        ]),
      ),
      ...Object.fromEntries(['station1', 'station2', 'scan'].map((k) => [k, new Int32Array(0)])),
    };
    expect(readVisibilities(written((sink) => writeVisibilities(sink, none)))).toEqual(none);
  });

  test('come back with squared visibilities and triple products', () => {
    const again = readVisibilities(written((sink) => writeVisibilities(sink, optical)));
    expect(again.count).toBe(0);
    // Metres and degrees: a few roundings of 1.1e-16 each; indices, times, values and what is missing to the bit.
    for (const part of ['squared', 'triples'] as const) {
      const [found, put] = [again[part], optical[part]] as unknown as Record<string, Float64Array>[];
      for (const [key, values] of Object.entries(put)) {
        if (key === 'count') continue;
        for (const [k, value] of values.entries()) {
          const exact = found[key][k] === value;
          const isScaled = /^[uv]|phase/i.test(key);
          expect(exact || (isScaled && Math.abs(found[key][k] / value - 1) < 1e-15), `${key} ${k}`).toBe(
            true,
          );
        }
      }
    }
    // A standing file: written again it has the same bytes.
    const bytesOf = (data: typeof again) =>
      Buffer.from(written((sink) => writeVisibilities(sink, data)).read(0, 5760));
    expect(bytesOf(again).equals(bytesOf(optical))).toBe(true);
  });

  test('are refused with a squared visibility or a triple product that no stage writes', () => {
    const { squared, triples } = optical as Required<typeof optical>;
    const write = (change: object) => written((sink) => writeVisibilities(sink, { ...optical, ...change }));
    const error = write({ squared: { ...squared, sigma: Float64Array.of(0.1, 0) } });
    expect(problemOf(() => readVisibilities(error)).message).toBe(
      'written, HDU 6 (OI_VIS2), row 2: bad-row: expected a row in use with errors above 0 and NS_SCAN from 0, got VIS2ERR ' +
        '0. Give the output of a stage, or take the file through a stage of kind ingest.',
    );
    const none = new Float64Array(3).fill(Number.POSITIVE_INFINITY);
    const nothing = write({ triples: { ...triples, sigmaAmplitude: none, sigmaPhase: none } });
    expect(problemOf(() => readVisibilities(nothing)).found).toBe('T3AMPERR NaN, T3PHIERR NaN');
    const early = write({ triples: { ...triples, scan: Int32Array.of(0, -1, 0) } });
    expect(problemOf(() => readVisibilities(early)).found).toBe('NS_SCAN -1');
    expect(() => write({ squared: { ...squared, value: Float64Array.of(Number.NaN, 0) } })).toThrow(
      'VIS2DATA: value 0 is NaN',
    );
  });

  test('are refused when they are other OIFITS', () => {
    expect(problemOf(() => readVisibilities(fixture('double.oifits'))).message).toBe(
      'double.oifits: wrong-layout: expected one OI_VIS of correlated flux in Jy, one OI_VIS2 and one OI_T3 at most, with ' +
        'one target, one wavelength and a column NS_SCAN, got 1 OI_VIS (absolute, unit ""), 1 targets, 1 OI_WAVELENGTH, ' +
        '1 OI_VIS2, 1 OI_T3, 1 OI_FLUX. ' +
        'Other OIFITS goes through a stage of kind ingest first.',
    );
  });

  test('are refused with a row that no stage writes', () => {
    const write = (change: object) =>
      written((sink) => writeVisibilities(sink, { ...visibilities, ...change }));
    expect(problemOf(() => readVisibilities(write({ sigma: Float64Array.of(0.1, 0, 0.1) }))).message).toBe(
      'written, HDU 5 (OI_VIS), row 2: bad-row: expected a row in use with VISAMPERR above 0, stations in the order of ' +
        'OI_ARRAY, NS_SCAN from 0, got VISAMPERR 0. Give the output of a stage, or take the file through a stage of ' +
        'kind ingest.',
    );
    const turned = { station1: Int32Array.of(1, 0, 1), station2: Int32Array.of(0, 2, 2) };
    expect(problemOf(() => readVisibilities(write(turned))).found).toBe(
      'stations against the order of OI_ARRAY',
    );
    expect(() => write({ re: Float64Array.of(Number.NaN, 0, 0) })).toThrow('VISAMP: value 0 is NaN');
    const nowhere = {
      stations: visibilities.stations.map(({ name }) => ({ name, xyz: [0, Number.NaN, 0] })),
    };
    const target = { ...visibilities.target, decDegrees: Number.POSITIVE_INFINITY };
    for (const [change, expected] of [
      [nowhere, 'STAXYZ of AA finite'],
      [{ target }, 'RAEP0 and DECEP0 finite'],
      [{ bandwidthMetres: Number.NaN }, 'EFF_BAND finite'],
    ] as const) {
      expect(problemOf(() => readVisibilities(write(change))).expected).toBe(expected);
    }
  });
});

test('damaged bytes are refused', () => {
  const bytes = new Uint8Array(sourceBytes());
  bytes[bytes.length - 2880] = (bytes[bytes.length - 2880] as number) ^ 1;
  expect(problemOf(() => readVisibilities(sourceOf(bytes))).code).toBe('checksum');
});

function sourceBytes(): Uint8Array {
  const source = written((sink) => writeVisibilities(sink, visibilities));
  return source.read(0, source.size);
}
