/** Linear algebra: identities over random matrices. */

import fc from 'fast-check';
import { expect, test } from 'vitest';
import {
  addCombination,
  cholesky,
  invertSymmetric,
  leastSquares,
  solveCholesky,
  solveLower,
  solveLowerTransposed,
} from '../../../stages/numerics/linear.ts';

const entry = fc.double({ min: -1, max: 1, noNaN: true });

/** A A^T + I is positive definite, with a condition number below n^2 + 1. */
const system = fc.integer({ min: 1, max: 8 }).chain((n) =>
  fc
    .tuple(
      fc.array(entry, { minLength: n * n, maxLength: n * n }),
      fc.array(entry, { minLength: n, maxLength: n }),
    )
    .map(([a, b]) => {
      const A = Float64Array.from({ length: n * n }, (_, k) => {
        const [i, j] = [Math.floor(k / n), k % n];
        let sum = i === j ? 1 : 0;
        for (let m = 0; m < n; m++) sum += a[i * n + m] * a[j * n + m];
        return sum;
      });
      return { n, A, b: Float64Array.from(b) };
    }),
);

function multiply(A: Float64Array, x: Float64Array, n: number): number[] {
  return Array.from({ length: n }, (_, i) => x.reduce((sum, value, j) => sum + A[i * n + j] * value, 0));
}

test('solves what it was given', () => {
  fc.assert(
    fc.property(system, ({ n, A, b }) => {
      const L = cholesky(A, n);
      if (!L) return false;
      const x = solveCholesky(L, b);
      const residual = multiply(A, x, n).map((value, i) => Math.abs(value - b[i]));
      const halves = solveLowerTransposed(L, solveLower(L, b));
      return Math.max(...residual) < 1e-12 && halves.every((value, i) => value === x[i]);
    }),
  );
});

test('inverts: A times its inverse is the identity', () => {
  fc.assert(
    fc.property(system, ({ n, A }) => {
      const inverse = invertSymmetric(A, n);
      if (!inverse) return false;
      return Array.from({ length: n }, (_, j) => {
        const column = Float64Array.from({ length: n }, (_, i) => inverse[i * n + j]);
        return multiply(A, column, n).every((value, i) => Math.abs(value - (i === j ? 1 : 0)) < 1e-12);
      }).every(Boolean);
    }),
  );
});

test('leaves residuals at right angles to the columns', () => {
  fc.assert(
    fc.property(system, ({ n, A, b }) => {
      // Two systems over each other: 2n rows.
      const rows = Float64Array.from([...A, ...A.map((value, k) => value * (1 + (k % 3)))]);
      const right = Float64Array.from([...b, ...b.map((value) => 1 - value)]);
      const solved = leastSquares(rows, right, n);
      if (!solved) return false;
      const residual = multiplyRows(rows, solved.solution, n).map((value, m) => value - right[m]);
      const squares = residual.reduce((sum, value) => sum + value * value, 0);
      const angles = Array.from({ length: n }, (_, j) =>
        residual.reduce((sum, value, m) => sum + value * rows[m * n + j], 0),
      );
      return Math.abs(squares - solved.residualSquares) < 1e-11 && Math.max(...angles.map(Math.abs)) < 1e-10;
    }),
  );
});

function multiplyRows(rows: Float64Array, x: Float64Array, n: number): number[] {
  return Array.from({ length: rows.length / n }, (_, m) =>
    x.reduce((sum, value, j) => sum + rows[m * n + j] * value, 0),
  );
}

test('says which size was wrong', () => {
  expect(() => cholesky(new Float64Array(5), 2)).toThrow('cholesky: 5 values where 4 make the matrix');
  expect(() => leastSquares(new Float64Array(5), new Float64Array(3), 2)).toThrow(
    'leastSquares: 5 values where 6 make the matrix',
  );
});

test('adds a combination with the bits of one vector after the other', () => {
  const numbers = (length: number) => fc.array(entry, { minLength: length, maxLength: length });
  const combination = fc
    .tuple(fc.integer({ min: 0, max: 11 }), fc.integer({ min: 1, max: 5 }))
    .chain(([count, d]) => fc.tuple(numbers(count), fc.array(numbers(d), { minLength: 12, maxLength: 12 })));
  fc.assert(
    fc.property(combination, ([factors, rows]) => {
      const vectors = rows.map((row) => Float64Array.from(row));
      const start = vectors[11] as Float64Array;
      const found = Float64Array.from(start);
      addCombination(found, vectors, Float64Array.from(factors));
      const direct = start.map((value, i) =>
        factors.reduce((sum, factor, k) => sum + factor * (vectors[k]?.[i] ?? Number.NaN), value),
      );
      expect([...found]).toEqual([...direct]);
    }),
  );
});
