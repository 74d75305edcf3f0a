/** Identities of the transforms: Bracewell, The Fourier Transform and Its Applications, ch. 6 and 11. */

import fc from 'fast-check';
import { expect, test } from 'vitest';
import { makeLineTransform, makeTransform2d } from '../../../stages/numerics/dft.ts';
import { largestDifference, someNumbers } from './direct-sums.ts';

const lengths = fc.constantFrom(1, 2, 3, 4, 5, 7, 8, 12, 16, 31, 32, 64);

function transform(line: Float64Array): Float64Array {
  const out = Float64Array.from(line);
  makeLineTransform(line.length / 2)(out);
  return out;
}

function exchange(line: Float64Array): Float64Array {
  return line.map((_, k) => line[k ^ 1] as number);
}

test('equals the sum as it stands at every length', () => {
  fc.assert(
    fc.property(lengths, fc.integer({ min: 1, max: 1e6 }), (n, seed) => {
      const line = someNumbers(2 * n, seed);
      const wanted = new Float64Array(2 * n);
      for (let k = 0; k < n; k++) {
        for (let m = 0; m < n; m++) {
          const phase = (-2 * Math.PI * k * m) / n;
          const [a, b] = [line[2 * m] as number, line[2 * m + 1] as number];
          wanted[2 * k] = (wanted[2 * k] as number) + a * Math.cos(phase) - b * Math.sin(phase);
          wanted[2 * k + 1] = (wanted[2 * k + 1] as number) + a * Math.sin(phase) + b * Math.cos(phase);
        }
      }
      expect(largestDifference(transform(line), wanted)).toBeLessThan(1e-11);
    }),
  );
});

test('keeps the sum of squares and comes back when re and im are exchanged', () => {
  fc.assert(
    fc.property(lengths, fc.integer({ min: 1, max: 1e6 }), (n, seed) => {
      const line = someNumbers(2 * n, seed);
      const spectrum = transform(line);
      const square = (values: Float64Array) => values.reduce((sum, value) => sum + value * value, 0);
      expect(square(spectrum) / n).toBeCloseTo(square(line), 11);
      const back = exchange(transform(exchange(spectrum))).map((value) => value / n);
      expect(largestDifference(back, line)).toBeLessThan(1e-13);
    }),
  );
});

test('turns a convolution into a product', () => {
  const n = 16;
  const a = someNumbers(n, 1);
  const b = someNumbers(n, 2);
  const complex = (values: Float64Array) =>
    Float64Array.from({ length: 2 * n }, (_, k) => (k % 2 === 0 ? (values[k / 2] as number) : 0));
  const convolved = a.map((_, k) => {
    let sum = 0;
    for (let m = 0; m < n; m++) sum += (a[m] as number) * (b[(k - m + n) % n] as number);
    return sum;
  });
  const A = transform(complex(a));
  const B = transform(complex(b));
  const product = new Float64Array(2 * n);
  for (let k = 0; k < 2 * n; k += 2) {
    product[k] = (A[k] as number) * (B[k] as number) - (A[k + 1] as number) * (B[k + 1] as number);
    product[k + 1] = (A[k] as number) * (B[k + 1] as number) + (A[k + 1] as number) * (B[k] as number);
  }
  expect(largestDifference(transform(complex(convolved)), product)).toBeLessThan(1e-12);
});

test('transforms two dimensions as rows and then columns', () => {
  const [nx, ny] = [8, 5];
  const re = someNumbers(40, 1);
  const im = someNumbers(40, 2);
  const [wantedRe, wantedIm] = [new Float64Array(40), new Float64Array(40)];
  for (let l = 0; l < ny; l++) {
    for (let k = 0; k < nx; k++) {
      for (let at = 0; at < 40; at++) {
        const phase = -2 * Math.PI * ((k * (at % nx)) / nx + (l * Math.floor(at / nx)) / ny);
        const [a, b] = [re[at] as number, im[at] as number];
        const to = l * nx + k;
        wantedRe[to] = (wantedRe[to] as number) + a * Math.cos(phase) - b * Math.sin(phase);
        wantedIm[to] = (wantedIm[to] as number) + a * Math.sin(phase) + b * Math.cos(phase);
      }
    }
  }
  makeTransform2d(nx, ny)(re, im);
  expect(largestDifference(re, wantedRe)).toBeLessThan(1e-12);
  expect(largestDifference(im, wantedIm)).toBeLessThan(1e-12);
});

test('refuses lengths that are none', () => {
  for (const length of [0, -1, 1.5, Number.NaN]) {
    expect(() => makeLineTransform(length)).toThrow(`a transform of length ${length}`);
  }
  expect(() => makeTransform2d(2, 2)(new Float64Array(3), new Float64Array(4))).toThrow(
    '3 and 4 values for a transform of 2 by 2',
  );
});
