/** Transforms and Fourier sums against values from outside. */

import { expect, test } from 'vitest';
import { makeLineTransform } from '../../stages/numerics/dft.ts';
import { visibilitiesOf } from '../../stages/numerics/fourier.ts';
import { gaussianTaper } from '../../stages/numerics/models.ts';

const UAS = Math.PI / 180 / 3600e6;

function transform(x: readonly number[]): [number, number][] {
  const line = new Float64Array(2 * x.length);
  x.forEach((value, n) => {
    line[2 * n] = value;
  });
  makeLineTransform(x.length)(line);
  return x.map((_, k) => [line[2 * k] as number, line[2 * k + 1] as number]);
}

function expectClose(
  found: readonly [number, number][],
  wanted: readonly (readonly number[])[],
  tol: number,
): void {
  found.forEach(([re, im], k) => {
    expect(Math.abs(re - (wanted[k]?.[0] as number))).toBeLessThanOrEqual(tol);
    expect(Math.abs(im - (wanted[k]?.[1] as number))).toBeLessThanOrEqual(tol);
  });
}

const HALF_ROOT = Math.SQRT1_2;

// Kernel exp(-2 pi i k n / N): Bracewell, The Fourier Transform and Its Applications, ch. 11; Oppenheim and Schafer.
// Computed by hand (sums of roots of unity), confirmed there with numpy.
test.each([
  {
    x: [1, 2, 3, 4],
    X: [
      [10, 0],
      [-2, 2],
      [-2, 0],
      [-2, -2],
    ],
  },
  { x: [1, 0, 0, 0, 0, 0, 0, 0], X: Array.from({ length: 8 }, () => [1, 0]) },
  { x: [1, 1, 1, 1, 1, 1, 1, 1], X: [[8, 0], ...Array.from({ length: 7 }, () => [0, 0])] },
  {
    x: [0, 1, 0, 0],
    X: [
      [1, 0],
      [0, -1],
      [-1, 0],
      [0, 1],
    ],
  },
  {
    x: [1, 1, 0, 0, 0, 0, 0, 0],
    X: [
      [2, 0],
      [1 + HALF_ROOT, -HALF_ROOT],
      [1, -1],
      [1 - HALF_ROOT, -HALF_ROOT],
      [0, 0],
      [1 - HALF_ROOT, HALF_ROOT],
      [1, 1],
      [1 + HALF_ROOT, HALF_ROOT],
    ],
  },
])('transforms $x', ({ x, X }) => {
  expectClose(transform(x), X, 1e-14);
});

test('finds a cosine of three cycles in bins 3 and 13 of 16', () => {
  // Same source.
  const x = Array.from({ length: 16 }, (_, n) => Math.cos((2 * Math.PI * 3 * n) / 16));
  const X = x.map((_, k) => [k === 3 || k === 13 ? 8 : 0, 0]);
  expectClose(transform(x), X, 1e-14);
});

test('transforms a length that is no power of two', () => {
  // X_k = -7/2 + i (7/2) cot(pi k / 7) for x = 1 … 7; digits by mpmath.
  const X = [
    [28, 0],
    [-3.5, 7.267824888003178],
    [-3.5, 2.791156861088414],
    [-3.5, 0.7988521603655248],
    [-3.5, -0.7988521603655248],
    [-3.5, -2.791156861088414],
    [-3.5, -7.267824888003178],
  ];
  expectClose(transform([1, 2, 3, 4, 5, 6, 7]), X, 1e-13);
});

test('gives a point east of the centre a phase that falls with u', () => {
  // V = exp(-2 pi i (u l + v m)): Thompson, Moran and Swenson, 3rd ed., ch. 3 (van Cittert and Zernike); u = 1e9 and
  // l = 10 uas give -17.4532925199433 degrees (mpmath). East is the first column.
  const pixels = Float64Array.of(1, 0, 0);
  const re = new Float64Array(1);
  const im = new Float64Array(1);
  const image = { nx: 3, ny: 1, pixelRadians: 10 * UAS, pixels };
  visibilitiesOf(re, im, image, Float64Array.of(1e9), Float64Array.of(0));
  const phase = (Math.atan2(im[0] as number, re[0] as number) * 180) / Math.PI;
  expect(Math.abs(phase + 17.4532925199433)).toBeLessThan(1e-12);
});

test('pairs Gaussian widths by 4 ln2 / pi', () => {
  // FWHM_uv times FWHM_image = 0.882542400610606374: Fourier pair of Gaussians, Bracewell ch. 6; mpmath.
  const fwhm = 12 * UAS;
  const halfWidth = 0.8825424006106064 / fwhm / 2;
  expect(Math.abs(gaussianTaper(halfWidth * halfWidth, fwhm) - 0.5)).toBeLessThan(1e-15);
});
