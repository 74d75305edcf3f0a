/** Images: values as astropy reads them, round trips in every type, and what is refused. */

import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { sourceOf } from '../../../../stages/bytes.ts';
import { listHdus, openFits } from '../../../../stages/formats/fits/hdu.ts';
import { appendImageHdu, readImageHdu } from '../../../../stages/formats/fits/image.ts';
import type { Bitpix } from '../../../../stages/formats/fits/numbers.ts';
import { expectedValues, fixture, handmade, numbersOf, problemOf, written } from './fixtures.ts';

type Expected = { extname: string; values: (number | null)[] };

describe('reading', () => {
  const source = fixture('images.fits');
  const hdus = openFits(source);

  // Source: astropy, test/data/fits/expected.json: BITPIX 8, 16, 32, 64, -32, -64; BSCALE, BZERO, BLANK; unsigned.
  test.each((expectedValues.images as Expected[]).map((each, i) => [each.extname, i, each] as const))(
    '%s gives the values that astropy reads',
    (_, i, { extname, values }) => {
      const hdu = hdus[i] as (typeof hdus)[number];
      const image = readImageHdu(source, hdu);
      expect(hdu.extname).toBe(extname);
      expect([image.shape, image.planes, image.planeLength]).toEqual([[3, 2], 1, 6]);
      expect([...image.all()]).toEqual(numbersOf(values));
    },
  );

  test('refuses a 64-bit integer that a double cannot hold, and BSCALE 0', () => {
    const cards = ['SIMPLE  = T', 'BITPIX  = 64', 'NAXIS   = 1', 'NAXIS1  = 2'];
    const data = new Uint8Array(16);
    data.set([0x00, 0x20, 0, 0, 0, 0, 0, 0x01], 8);
    const read = (more: string[]) => {
      const from = sourceOf(handmade([...cards, ...more], data));
      const [hdu] = listHdus(from);
      return readImageHdu(from, hdu as NonNullable<typeof hdu>).all();
    };
    // 0x0020000000000001 = 2^53 + 1.
    expect(problemOf(() => read([])).message).toBe(
      'input, HDU 1, value 2: too-large: expected an integer of at most 53 bits, which a double holds exactly, ' +
        'got 9007199254740993. Store the values as smaller integers or as floating-point numbers.',
    );
    expect(problemOf(() => read(['BSCALE  = 0'])).found).toBe('BSCALE = 0');
  });

  test('refuses an image without pixels', () => {
    const empty = sourceOf(handmade(['SIMPLE  = T', 'BITPIX  = 8', 'NAXIS   = 0']));
    const [hdu] = listHdus(empty);
    expect(problemOf(() => readImageHdu(empty, hdu as NonNullable<typeof hdu>)).message).toBe(
      'input, HDU 1: no-image: expected an image with pixels, got axes []. ' +
        'Give a FITS file whose image is not empty.',
    );
  });
});

describe('round trip', () => {
  const ranges: Record<Bitpix, fc.Arbitrary<number>> = {
    8: fc.integer({ min: 0, max: 255 }),
    16: fc.integer({ min: -32768, max: 32767 }),
    32: fc.integer(),
    64: fc.maxSafeInteger(),
    '-32': fc.float(),
    '-64': fc.double(),
  };

  test.each([8, 16, 32, 64, -32, -64] as const)('keeps values of BITPIX %i, plane by plane', (bitpix) => {
    const sizes = fc.tuple(
      fc.integer({ min: 1, max: 5 }),
      fc.integer({ min: 1, max: 5 }),
      fc.integer({ min: 1, max: 4 }),
    );
    const cube = sizes.chain(([nx, ny, n]) =>
      fc.tuple(
        fc.constant([nx, ny, n]),
        fc.array(fc.array(ranges[bitpix], { minLength: nx * ny, maxLength: nx * ny }), {
          minLength: n,
          maxLength: n,
        }),
        fc.boolean(),
      ),
    );
    fc.assert(
      fc.property(cube, ([shape, planes, first]) => {
        const source = written((sink) => {
          if (!first) appendImageHdu(sink, { shape: [], bitpix: 8, data: [], first: true });
          appendImageHdu(sink, { shape, bitpix, data: planes, first });
        });
        const hdu = openFits(source).at(-1) as ReturnType<typeof openFits>[number];
        const image = readImageHdu(source, hdu);
        expect(image.shape).toEqual(shape);
        planes.forEach((plane, k) => {
          // toEqual, not toBe: integers have no negative zero.
          expect([...image.read(k)].map((x) => x + 0)).toEqual(plane.map((x) => x + 0));
        });
        expect(image.all()).toEqual(Float64Array.from(planes.flat()));
      }),
    );
  });

  test('refuses values that the type cannot hold and pixels that are missing', () => {
    const write = (bitpix: Bitpix, values: number[]) =>
      written((sink) => appendImageHdu(sink, { shape: [2], bitpix, data: [values], first: true }));
    expect(() => write(16, [0, 32768])).toThrow('encodeNumbers: 32768 is no integer of 16 bits');
    expect(() => write(8, [0, 0.5])).toThrow('encodeNumbers: 0.5 is no integer of 8 bits');
    expect(() => write(64, [0, Number.NaN])).toThrow('encodeNumbers: NaN is no integer of 64 bits');
    expect(() => write(-64, [1])).toThrow('startHdu: 8 of 16 bytes written');
  });
});
