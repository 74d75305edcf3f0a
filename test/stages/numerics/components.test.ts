import fc from 'fast-check';
import { expect, test } from 'vitest';
import { makeMomentSum, orientation, principalComponents } from '../../../stages/numerics/components.ts';
import { dot, largestDifference, someNumbers } from './direct-sums.ts';

function momentsOf(rows: readonly Float64Array[], blockRows?: number) {
  const sum = makeMomentSum(rows[0]?.length ?? 0, blockRows);
  for (const row of rows) sum.add(row);
  return sum.finish();
}

function someRows(n: number, d: number, seed: number): Float64Array[] {
  const values = someNumbers(n * d, seed);
  return Array.from({ length: n }, (_, r) =>
    values.slice(r * d, (r + 1) * d).map((value, i) => value + i / 3),
  );
}

const sizes = fc.record({
  n: fc.integer({ min: 2, max: 40 }),
  d: fc.integer({ min: 1, max: 11 }),
  seed: fc.integer({ min: 1, max: 1e6 }),
});

test('equals mean and covariance of all rows at once', () => {
  fc.assert(
    fc.property(sizes, ({ n, d, seed }) => {
      const rows = someRows(n, d, seed);
      const mean = Float64Array.from(
        { length: d },
        (_, i) => rows.reduce((sum, row) => sum + (row[i] as number), 0) / n,
      );
      const wanted = Float64Array.from({ length: d * d }, (_, at) => {
        const [i, j] = [Math.floor(at / d), at % d];
        const product = (row: Float64Array) =>
          ((row[i] as number) - (mean[i] as number)) * ((row[j] as number) - (mean[j] as number));
        return rows.reduce((sum, row) => sum + product(row), 0) / (n - 1);
      });
      const found = momentsOf(rows);
      expect(found.count).toBe(n);
      expect(largestDifference(found.mean, mean)).toBeLessThan(1e-14);
      expect(largestDifference(found.covariance, wanted)).toBeLessThan(1e-13);
    }),
  );
});

test('gives the same bits whatever the size of a block', () => {
  const rows = someRows(37, 10, 4);
  const wanted = momentsOf(rows, 1);
  for (const blockRows of [2, 5, 32, 37, 100]) expect(momentsOf(rows, blockRows)).toEqual(wanted);
});

test('keeps its digits far from zero', () => {
  // Adding 1e8 to every value changes no covariance; values lose 1e-8 by it, sums about zero would lose all.
  const rows = someRows(30, 3, 9);
  const far = rows.map((row) => row.map((value) => value + 1e8));
  expect(largestDifference(momentsOf(far).covariance, momentsOf(rows).covariance)).toBeLessThan(1e-7);
});

test('finds orthonormal vectors whose variances are the eigenvalues', () => {
  const rows = someRows(40, 6, 2);
  const moments = momentsOf(rows);
  const { eigenvalues, vectors, totalVariance } = principalComponents(moments, 6);
  vectors.forEach((a, k) => {
    vectors.forEach((b, m) => {
      expect(dot(a, b)).toBeCloseTo(k === m ? 1 : 0, 13);
    });
    const scores = rows.map((row) => dot(a, row) - dot(a, moments.mean));
    expect(dot(scores, scores) / 39).toBeCloseTo(eigenvalues[k] as number, 13);
  });
  expect(eigenvalues.reduce((sum, value) => sum + value, 0)).toBeCloseTo(totalVariance, 13);
  expect(eigenvalues.toSorted((a, b) => b - a)).toEqual(eigenvalues);
});

test('leaves (n-1)/n of the eigenvalues left out as the mean square of reconstruction', () => {
  // Eckart and Young 1936; Golub and Van Loan, Matrix Computations, 4th ed., theorem 2.4.8.
  fc.assert(
    fc.property(sizes, ({ n, d, seed }) => {
      const rows = someRows(n, d, seed);
      const moments = momentsOf(rows);
      const { eigenvalues, vectors } = principalComponents(moments, d);
      const kept = seed % d;
      let left = 0;
      for (const row of rows) {
        const rest = row.map((value, i) => value - (moments.mean[i] as number));
        for (const vector of vectors.slice(0, kept)) {
          const score = dot(vector, rest);
          vector.forEach((value, i) => {
            rest[i] = (rest[i] as number) - score * value;
          });
        }
        left += dot(rest, rest);
      }
      const wanted = ((n - 1) / n) * eigenvalues.slice(kept).reduce((sum, value) => sum + value, 0);
      expect(Math.abs(left / n - wanted)).toBeLessThan(1e-12);
    }),
  );
});

test('finds no variance beyond the rank of the rows', () => {
  const directions = someRows(3, 8, 5);
  const rows = Array.from({ length: 50 }, (_, r) => {
    const weights = someNumbers(3, r + 1);
    return directions.reduce(
      (sum, each, m) => sum.map((value, i) => value + (weights[m] as number) * (each[i] as number)),
      new Float64Array(8),
    );
  });
  const { eigenvalues } = principalComponents(momentsOf(rows), 8);
  expect(eigenvalues[2]).toBeGreaterThan(1e-3);
  for (const value of eigenvalues.slice(3)) expect(value).toBeLessThan(1e-14);
});

test('makes the largest value positive, the first of equal ones', () => {
  expect(orientation(Float64Array.of(0.5, -2, 1))).toBe(-1);
  expect(orientation(Float64Array.of(0.5, 2, 1))).toBe(1);
  expect(orientation(Float64Array.of(-1, 1 + 1e-15))).toBe(-1);
  expect(orientation(Float64Array.of(1, -1 - 1e-15))).toBe(1);
  expect(orientation(new Float64Array(2))).toBe(1);
});

test('refuses one row, rows of unequal length, and more components than values', () => {
  const sum = makeMomentSum(2);
  sum.add(Float64Array.of(1, 2));
  expect(() => sum.finish()).toThrow('a covariance of 1 rows');
  expect(() => sum.add(Float64Array.of(1))).toThrow('a row of 1 values among rows of 2');
  sum.add(Float64Array.of(2, 3));
  expect(() => principalComponents(sum.finish(), 3)).toThrow('3 components of 2 values');
});
