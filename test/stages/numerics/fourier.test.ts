import fc from 'fast-check';
import { expect, test } from 'vitest';
import {
  adjointOfVisibilities,
  type PixelGrid,
  visibilitiesOf,
  visibilitiesOfAll,
} from '../../../stages/numerics/fourier.ts';
import { directVisibility, dot, someNumbers, UAS } from './direct-sums.ts';

// Rounding of a sum of n terms of size 1, and of phases up to 100 rad.
const TOLERANCE = 1e-12;

const grids = fc.record({
  nx: fc.integer({ min: 1, max: 12 }),
  ny: fc.integer({ min: 1, max: 12 }),
  pixelRadians: fc.constantFrom(0.5 * UAS, 2.5 * UAS, 7 * UAS),
});

function points(count: number, seed: number): { u: Float64Array; v: Float64Array } {
  const scale = (values: Float64Array) => values.map((value) => value * 1e10);
  return { u: scale(someNumbers(count, seed)), v: scale(someNumbers(count, seed + 1)) };
}

function visibilities(grid: PixelGrid, pixels: Float64Array, u: Float64Array, v: Float64Array) {
  const re = new Float64Array(u.length);
  const im = new Float64Array(u.length);
  visibilitiesOf(re, im, { ...grid, pixels }, u, v);
  return { re, im };
}

test('equals the direct sum on grids of any size', () => {
  fc.assert(
    fc.property(grids, fc.integer({ min: 1, max: 1e6 }), (grid, seed) => {
      const pixels = someNumbers(grid.nx * grid.ny, seed);
      const { u, v } = points(5, seed + 7);
      const { re, im } = visibilities(grid, pixels, u, v);
      u.forEach((each, k) => {
        const [wantedRe, wantedIm] = directVisibility(grid, pixels, each, v[k] as number);
        expect(Math.abs((re[k] as number) - wantedRe)).toBeLessThan(TOLERANCE);
        expect(Math.abs((im[k] as number) - wantedIm)).toBeLessThan(TOLERANCE);
      });
    }),
    { numRuns: 100 },
  );
});

test('gives the total flux at the origin and conjugates at mirrored points', () => {
  const grid = { nx: 8, ny: 7, pixelRadians: 3 * UAS };
  const pixels = someNumbers(56);
  const { u, v } = points(4, 3);
  const zero = new Float64Array(1);
  expect(visibilities(grid, pixels, zero, zero).re[0]).toBeCloseTo(pixels.reduce((sum, each) => sum + each));
  const one = visibilities(grid, pixels, u, v);
  const other = visibilities(
    grid,
    pixels,
    u.map((each) => -each),
    v.map((each) => -each),
  );
  expect(other.re).toEqual(one.re);
  expect(other.im).toEqual(one.im.map((each) => -each));
});

test('turns the phase of an image that is shifted', () => {
  // Shift theorem: two columns to the west are -2 pixels in x.
  const grid = { nx: 9, ny: 5, pixelRadians: 4 * UAS };
  const pixels = someNumbers(45).map((each, k) => (k % 9 < 7 ? each : 0));
  const shifted = new Float64Array(45);
  shifted.set(pixels.subarray(0, 43), 2);
  const u = Float64Array.of(3e9);
  const v = Float64Array.of(-1e9);
  const here = visibilities(grid, pixels, u, v);
  const there = visibilities(grid, shifted, u, v);
  const phase = -2 * Math.PI * 3e9 * -2 * grid.pixelRadians;
  const [re = 0] = here.re;
  const [im = 0] = here.im;
  expect(there.re[0]).toBeCloseTo(re * Math.cos(phase) - im * Math.sin(phase), 12);
  expect(there.im[0]).toBeCloseTo(re * Math.sin(phase) + im * Math.cos(phase), 12);
});

test('gives each of several images what it has alone', () => {
  const grid = { nx: 6, ny: 6, pixelRadians: UAS };
  const images = [1, 2, 3].map((seed) => someNumbers(36, seed));
  const { u, v } = points(10, 5);
  const re = images.map(() => new Float64Array(10));
  const im = images.map(() => new Float64Array(10));
  visibilitiesOfAll(re, im, grid, images, u, v);
  images.forEach((pixels, m) => {
    expect({ re: re[m], im: im[m] }).toEqual(visibilities(grid, pixels, u, v));
  });
});

test('has the adjoint that it states', () => {
  fc.assert(
    fc.property(grids, fc.integer({ min: 1, max: 1e6 }), (grid, seed) => {
      const pixels = someNumbers(grid.nx * grid.ny, seed);
      const { u, v } = points(6, seed + 1);
      const re = someNumbers(6, seed + 2);
      const im = someNumbers(6, seed + 3);
      const back = new Float64Array(pixels.length);
      adjointOfVisibilities(back, grid, u, v, re, im);
      const forward = visibilities(grid, pixels, u, v);
      const there = dot(forward.re, re) + dot(forward.im, im);
      expect(Math.abs(there - dot(pixels, back))).toBeLessThan(TOLERANCE * 10);
    }),
    { numRuns: 50 },
  );
});

test('gives NaN for NaN and refuses lists of unequal length', () => {
  const grid = { nx: 2, ny: 2, pixelRadians: UAS };
  const one = Float64Array.of(1);
  expect(visibilities(grid, Float64Array.of(1, Number.NaN, 1, 1), one, one).re[0]).toBeNaN();
  expect(() => visibilities(grid, Float64Array.of(1, 2), one, one)).toThrow(
    'an image of 2 pixels on a grid of 2 by 2',
  );
  const pixels = new Float64Array(4);
  expect(() => visibilities(grid, pixels, one, Float64Array.of(1, 2))).toThrow(
    '2 values for 1 points of the Fourier plane',
  );
  expect(() => visibilitiesOfAll([], [one], grid, [pixels], one, one)).toThrow('1 images, 0 and 1 outputs');
});
