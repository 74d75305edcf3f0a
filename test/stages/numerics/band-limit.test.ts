import fc from 'fast-check';
import { expect, test } from 'vitest';
import { makeModes } from '../../../stages/numerics/band-limit.ts';
import { dot, largestDifference, someNumbers, UAS } from './direct-sums.ts';

const shapes = fc.record({
  nx: fc.integer({ min: 1, max: 14 }),
  ny: fc.integer({ min: 1, max: 14 }),
  seed: fc.integer({ min: 1, max: 1e6 }),
});

function withoutMean(values: Float64Array): Float64Array {
  const mean = values.reduce((sum, value) => sum + value, 0) / values.length;
  return values.map((value) => value - mean);
}

test('has orthonormal functions: what is synthesised projects to itself', () => {
  fc.assert(
    fc.property(shapes, ({ nx, ny, seed }) => {
      const modes = makeModes({ nx, ny, pixelRadians: UAS }, 0, 0);
      const coefficients = someNumbers(modes.count, seed);
      const pixels = new Float64Array(nx * ny);
      modes.synthesize(pixels, coefficients, 3);
      const back = new Float64Array(modes.count);
      modes.project(back, pixels);
      expect(largestDifference(back, coefficients)).toBeLessThan(1e-13);
      expect(pixels.reduce((sum, value) => sum + value, 0)).toBeCloseTo(3, 11);
      // Parseval: the constant holds 3^2 / (nx ny).
      expect(dot(pixels, pixels)).toBeCloseTo(dot(coefficients, coefficients) + 9 / (nx * ny), 11);
    }),
  );
});

test('holds every image of an odd number of pixels', () => {
  const [nx, ny] = [9, 7];
  const modes = makeModes({ nx, ny, pixelRadians: UAS }, 0, 0);
  expect(modes.count).toBe(nx * ny - 1);
  const pixels = withoutMean(someNumbers(nx * ny));
  const coefficients = new Float64Array(modes.count);
  modes.project(coefficients, pixels);
  const back = new Float64Array(nx * ny);
  modes.synthesize(back, coefficients, 0);
  expect(largestDifference(back, pixels)).toBeLessThan(1e-14);
});

test('has the projection as the adjoint of the synthesis', () => {
  fc.assert(
    fc.property(shapes, ({ nx, ny, seed }) => {
      const modes = makeModes({ nx, ny, pixelRadians: UAS }, 0, 0);
      const pixels = someNumbers(nx * ny, seed);
      const coefficients = someNumbers(modes.count, seed + 1);
      const image = new Float64Array(nx * ny);
      modes.synthesize(image, coefficients, 0);
      const projected = new Float64Array(modes.count);
      modes.project(projected, pixels);
      expect(Math.abs(dot(image, pixels) - dot(coefficients, projected))).toBeLessThan(1e-12);
    }),
  );
});

test('tapers as a periodic convolution with the Gaussian does', () => {
  // A Gaussian of 4 pixels, with what comes in from two fields on every side; odd counts, so that no frequency is left
  // out.
  const grid = { nx: 21, ny: 17, pixelRadians: 2 * UAS };
  const fwhm = 4 * grid.pixelRadians;
  const sigma = 4 / Math.sqrt(8 * Math.LN2);
  const kernel = (d: number, n: number) => {
    let sum = 0;
    for (let turn = -2; turn <= 2; turn++) sum += Math.exp(-((d + turn * n) ** 2) / (2 * sigma * sigma));
    return sum / (Math.sqrt(2 * Math.PI) * sigma);
  };
  const pixels = someNumbers(21 * 17);
  const wanted = pixels.map((_, to) => {
    let sum = 0;
    pixels.forEach((value, from) => {
      const across = kernel((to % 21) - (from % 21), 21);
      sum += value * across * kernel(Math.floor(to / 21) - Math.floor(from / 21), 17);
    });
    return sum;
  });
  const modes = makeModes(grid, fwhm, 0);
  const coefficients = new Float64Array(modes.count);
  modes.project(coefficients, pixels);
  const found = new Float64Array(21 * 17);
  modes.synthesize(
    found,
    coefficients,
    pixels.reduce((sum, value) => sum + value, 0),
  );
  // A sampled Gaussian of 4 pixels repeats in frequency: exp(-(pi 4 / 2)^2 / (4 ln 2)) = 6.5e-7 at the highest.
  expect(largestDifference(found, wanted)).toBeLessThan(2e-6);
});

test('leaves out what the taper brings to the cut, and begins with the lowest frequencies', () => {
  // Taper above 0.01 for (pi u F)^2 < 4 ln2 ln100: u F < 1.13744; with a field of 160 uas and 12 uas, 15.166 cycles per
  // field: as many functions as there are points with whole coordinates in that circle, but for its centre.
  const grid = { nx: 64, ny: 64, pixelRadians: 2.5 * UAS };
  let points = -1;
  for (let k = -16; k <= 16; k++) for (let l = -16; l <= 16; l++) if (k * k + l * l < 15.166 ** 2) points++;
  const modes = makeModes(grid, 12 * UAS, 0.01);
  expect(modes.count).toBe(points);
  const first = new Float64Array(64 * 64);
  modes.synthesize(
    first,
    Float64Array.from({ length: points }, (_, m) => (m === 0 ? 1 : 0)),
    0,
  );
  // One cycle along x, the cosine about the centre: constant in columns.
  expect(first[0]).toBeCloseTo(Math.sqrt(2 / 64 / 64) * Math.cos((2 * Math.PI * -31.5) / 64), 14);
  expect(first[63 * 64]).toBe(first[0]);
});

test('refuses widths and lengths that are none', () => {
  const grid = { nx: 4, ny: 4, pixelRadians: UAS };
  expect(() => makeModes(grid, Number.NaN, 0)).toThrow('width NaN, cut 0');
  expect(() => makeModes(grid, 0, 1)).toThrow('width 0, cut 1');
  const modes = makeModes(grid, 0, 0);
  expect(() => modes.project(new Float64Array(2), new Float64Array(16))).toThrow(
    '2 coefficients for 8 modes, 16 pixels for 4 by 4',
  );
});
