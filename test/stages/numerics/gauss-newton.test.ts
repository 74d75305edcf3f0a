/** Damped Gauss-Newton: minima known in closed form, and honest failures. */

import { expect, test } from 'vitest';
import { type CostFunction, gaussNewton } from '../../../stages/numerics/gauss-newton.ts';

/** Half the squares of residuals with their derivatives. */
function squares(residuals: (x: Float64Array) => { r: number[]; J: number[][] }): CostFunction {
  const half = (r: number[]) => r.reduce((sum, value) => sum + value * value, 0) / 2;
  return {
    cost: (x) => half(residuals(x).r),
    expand(x) {
      const { r, J } = residuals(x);
      const n = x.length;
      const gradient = new Float64Array(n);
      const curvature = new Float64Array(n * n);
      r.forEach((value, m) => {
        for (let i = 0; i < n; i++) {
          gradient[i] += value * J[m][i];
          for (let j = 0; j < n; j++) curvature[i * n + j] += J[m][i] * J[m][j];
        }
      });
      return { cost: half(r), gradient, curvature };
    },
  };
}

test('solves a linear problem in one step', () => {
  // 3x + y = 5, x - 2y = 4
  const f = squares((x) => ({
    r: [3 * x[0] + x[1] - 5, x[0] - 2 * x[1] - 4],
    J: [
      [3, 1],
      [1, -2],
    ],
  }));
  const found = gaussNewton(f, Float64Array.of(100, -50));
  expect(found.converged).toBe(true);
  expect(found.steps).toBe(1);
  expect(found.x[0]).toBeCloseTo(2, 10);
  expect(found.x[1]).toBeCloseTo(-1, 10);
});

test('walks down the curved valley of Rosenbrock to (1, 1)', () => {
  // Rosenbrock 1960, Comput. J. 3, 175.
  const f = squares((x) => ({
    r: [10 * (x[1] - x[0] * x[0]), 1 - x[0]],
    J: [
      [-20 * x[0], 10],
      [-1, 0],
    ],
  }));
  const found = gaussNewton(f, Float64Array.of(-1.2, 1), { tolerance: 1e-16 });
  expect(found.converged).toBe(true);
  expect(found.x[0]).toBeCloseTo(1, 7);
  expect(found.x[1]).toBeCloseTo(1, 7);
});

test('damps steps that overshoot', () => {
  // Undamped steps for arctan diverge from |x| > 1.39.
  const f = squares((x) => ({ r: [Math.atan(x[0])], J: [[1 / (1 + x[0] * x[0])]] }));
  const found = gaussNewton(f, Float64Array.of(20), { tolerance: 1e-16 });
  expect(found.converged).toBe(true);
  expect(Math.abs(found.x[0])).toBeLessThan(1e-7);
});

test('reports that it did not converge', () => {
  const f = squares((x) => ({ r: [Math.atan(x[0])], J: [[1 / (1 + x[0] * x[0])]] }));
  expect(gaussNewton(f, Float64Array.of(20), { mostSteps: 2 }).converged).toBe(false);
  const kink: CostFunction = {
    cost: (x) => Math.abs(x[0]),
    expand: (x) => ({
      cost: Math.abs(x[0]),
      gradient: Float64Array.of(1),
      curvature: Float64Array.of(1),
    }),
  };
  expect(gaussNewton(kink, Float64Array.of(0)).converged).toBe(false);
});

test('refuses a start without a cost', () => {
  const f = squares(() => ({ r: [Number.NaN], J: [[1]] }));
  expect(() => gaussNewton(f, Float64Array.of(0))).toThrow(
    'gaussNewton: the cost at the start is not finite',
  );
});
