import { inflateSync } from 'node:zlib';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { brightness } from '../../../stages/formats/drawing/colour.ts';
import { crc32, encodePng } from '../../../stages/formats/drawing/png.ts';
import { interpolate } from '../../../stages/formats/drawing/raster.ts';
import { decodeIndexed } from '../../picture.ts';

const whole = (nx: number, ny: number) => ({ x0: -0.5, x1: nx - 0.5, y0: -0.5, y1: ny - 0.5 });

describe('PNG', () => {
  it('has the published check value of CRC-32', () => {
    // The check value of this CRC over the nine digits is cbf43926: common practice.
    expect(crc32(new TextEncoder().encode('123456789'))).toBe(0xcbf43926);
  });

  it('ends with the end chunk that every PNG file ends with', () => {
    // W3C PNG third edition, section 11.2.5: no data, so always these bytes.
    const png = encodePng(1, 1, Uint8Array.of(7), brightness);
    expect(Buffer.from(png.subarray(-12)).toString('hex')).toBe('0000000049454e44ae426082');
  });

  it('gives every pixel back, read by another decompressor', () => {
    const shape = fc.tuple(fc.integer({ min: 1, max: 12 }), fc.integer({ min: 1, max: 12 }));
    const picture = shape.chain(([width, height]) =>
      fc
        .uint8Array({ minLength: width * height, maxLength: width * height })
        .map((pixels) => ({ width, height, pixels })),
    );
    fc.assert(
      fc.property(picture, ({ width, height, pixels }) => {
        const decoded = decodeIndexed(encodePng(width, height, pixels, brightness), inflateSync);
        expect([decoded.width, decoded.height]).toEqual([width, height]);
        expect(decoded.indices).toEqual(pixels);
        expect(decoded.palette).toEqual(brightness.entries);
      }),
    );
  });

  it('refuses pixels that do not fill the raster', () => {
    expect(() => encodePng(2, 2, new Uint8Array(3), brightness)).toThrow(
      'encodePng: indices do not fill the raster',
    );
  });
});

describe('interpolation', () => {
  it('passes through the pixels and reproduces a plane away from the edges', () => {
    const [nx, ny] = [9, 7];
    const plane = (x: number, y: number) => 3 - 0.7 * x + 0.2 * y;
    const pixels = Float64Array.from({ length: nx * ny }, (_, p) => plane(p % nx, Math.floor(p / nx)));
    const same = interpolate({ nx, ny, pixels }, whole(nx, ny), nx, ny);
    for (let j = 0; j < ny; j++) {
      for (let i = 0; i < nx; i++) expect(same[(ny - 1 - j) * nx + i]).toBeCloseTo(pixels[j * nx + i], 12);
    }
    const fine = interpolate({ nx, ny, pixels }, { x0: 2, x1: 6, y0: 2, y1: 4 }, 40, 20);
    for (let r = 0; r < 20; r++) {
      for (let c = 0; c < 40; c++) {
        expect(fine[r * 40 + c]).toBeCloseTo(plane(2 + (4 * (c + 0.5)) / 40, 4 - (2 * (r + 0.5)) / 20), 12);
      }
    }
  });

  it('reproduces a parabola, as the kernel with a = -1/2 does', () => {
    // Keys 1981, section IV: the error is of third order, so second-degree polynomials are exact.
    const pixels = Float64Array.from({ length: 10 }, (_, i) => (i - 4.3) * (i - 4.3));
    const fine = interpolate({ nx: 10, ny: 1, pixels }, { x0: 2, x1: 7, y0: 0, y1: 0 }, 25, 1);
    fine.forEach((value, c) => {
      const x = 2 + (5 * (c + 0.5)) / 25;
      expect(value).toBeCloseTo((x - 4.3) * (x - 4.3), 11);
    });
  });
});
