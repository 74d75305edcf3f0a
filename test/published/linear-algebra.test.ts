/** Linear algebra against published values: NIST StRD regressions, Hilbert matrices (Higham, Accuracy and Stability of
 *  Numerical Algorithms, 2nd ed., section 28.1; singular values with 50 digits), weighted least squares (Press et al.,
 *  Numerical Recipes, 3rd ed., section 15.2; recomputed with mpmath and numpy). */

import { expect, test } from 'vitest';
import { besselJ0 } from '../../stages/numerics/bessel.ts';
import { cholesky, invertSymmetric, leastSquares, solveCholesky } from '../../stages/numerics/linear.ts';
import { filip, longley, norris, type Regression, wampler1 } from './nist-regression.ts';

/** Digits that agree: -log10 of the relative error (McCullough 1998, Am. Stat. 52, 358), the worst of the list. */
function digits(found: ArrayLike<number>, certified: readonly number[]): number {
  const errors = certified.map(
    (value, k) => Math.abs(found[k] - value) / (value === 0 ? 1 : Math.abs(value)),
  );
  return -Math.log10(Math.max(...errors, 1e-16));
}

function solve({ rows, y, coefficients }: Regression) {
  const solved = leastSquares(Float64Array.from(rows.flat()), Float64Array.from(y), coefficients.length);
  if (!solved) throw new Error('no full rank');
  const variance = solved.residualSquares / (y.length - coefficients.length);
  const n = coefficients.length;
  return {
    solution: solved.solution,
    deviations: Float64Array.from({ length: n }, (_, k) => Math.sqrt(variance * solved.inverse[k * n + k])),
    residualDeviation: Math.sqrt(variance),
  };
}

test.each([
  ['Norris', norris, 12],
  ['Longley', longley, 9],
  ['Wampler1', wampler1, 7],
  ['Filip', filip, 6],
] as const)('solves %s to the digits required', (_name, regression, required) => {
  const solved = solve(regression);
  expect(digits(solved.solution, regression.coefficients)).toBeGreaterThan(required);
  expect(digits(solved.deviations, regression.deviations)).toBeGreaterThan(required);
  expect(digits([solved.residualDeviation], [regression.residualDeviation])).toBeGreaterThan(required);
});

test('fails on Filip by the normal equations, as double precision must', () => {
  const n = filip.coefficients.length;
  const normal = new Float64Array(n * n);
  const right = new Float64Array(n);
  filip.rows.forEach((row, m) => {
    for (let i = 0; i < n; i++) {
      right[i] += row[i] * filip.y[m];
      for (let j = 0; j < n; j++) normal[i * n + j] += row[i] * row[j];
    }
  });
  const L = cholesky(normal, n);
  expect(L === null || digits(solveCholesky(L, right), filip.coefficients) < 3).toBe(true);
});

/** Rows i, columns j of 1/(i+j-1), counted from 1. */
function hilbert(n: number): Float64Array {
  return Float64Array.from({ length: n * n }, (_, k) => 1 / (Math.floor(k / n) + (k % n) + 1));
}

test.each([
  [
    5,
    [
      1.5670506910982307, 0.20853421861101334, 0.011407491623419806, 0.0003058980401511917,
      3.287928772171863e-6,
    ],
  ],
  [
    10,
    [
      1.7519196702651776, 0.3429295484835091, 0.035741816271639235, 0.0025308907686700383,
      0.00012874961427637708, 4.729689293182347e-6, 1.228967738751175e-7, 2.1474388173504788e-9,
      2.2667467477629255e-11, 1.0931538193796657e-13,
    ],
  ],
] as const)('finds determinant and trace of the inverse of the Hilbert matrix of order %i', (n, singular) => {
  // Symmetric and positive definite: its singular values are its eigenvalues. The relative error of the smallest
  // pivot is the unit roundoff times the condition number.
  const H = hilbert(n);
  const L = cholesky(H, n);
  const inverse = invertSymmetric(H, n);
  if (!L || !inverse) throw new Error('not positive definite');
  const bound = 2.2e-16 * (singular[0] / singular[n - 1]);
  const sum = (f: (k: number) => number) => Array.from({ length: n }, (_, k) => f(k)).reduce((a, b) => a + b);
  const logDeterminant = 2 * sum((k) => Math.log(L[k * n + k]));
  expect(Math.abs(logDeterminant - sum((k) => Math.log(singular[k])))).toBeLessThan(bound);
  const trace = sum((k) => inverse[k * n + k]);
  expect(Math.abs(trace / sum((k) => 1 / singular[k]) - 1)).toBeLessThan(bound);
});

test('refuses matrices that are not positive definite, that hold NaN, or have no full rank', () => {
  expect(cholesky(Float64Array.of(1, 2, 2, 1), 2)).toBeNull();
  expect(cholesky(Float64Array.of(1, 1.1, 1.1, 1), 2)).toBeNull();
  expect(cholesky(Float64Array.of(0), 1)).toBeNull();
  expect(cholesky(Float64Array.of(1, 0, 0, Number.NaN), 2)).toBeNull();
  expect(leastSquares(Float64Array.of(1, 2, 2, 4, 3, 6), Float64Array.of(1, 2, 3), 2)).toBeNull();
});

test('fits the published weighted line', () => {
  const sigma = [0.1, 0.2, 0.1, 0.2, 0.1];
  const y = [1.1, 2.9, 5.2, 7.1, 8.8];
  const A = Float64Array.from(sigma.flatMap((s, x) => [1 / s, x / s]));
  const b = Float64Array.from(y, (value, k) => value / sigma[k]);
  const fit = leastSquares(A, b, 2);
  expect(digits(fit?.solution ?? [], [1.157983193277311, 1.9352941176470588])).toBeGreaterThan(12);
  const covariance = [0.007563025210084, -0.002352941176470588, -0.002352941176470588, 0.001176470588235294];
  expect(digits(fit?.inverse ?? [], covariance)).toBeGreaterThan(12);
  expect(digits([fit?.residualSquares ?? 0], [5.65546218487395])).toBeGreaterThan(12);
});

test('fits two components to complex visibilities as published', () => {
  // Components: Gaussian of FWHM 15 uas at 10 uas east; thin ring of 42 uas blurred by 10 uas. Analytic visibilities
  // of both: Bracewell, The Fourier Transform and Its Applications.
  const uas = Math.PI / 180 / 3600e6;
  const gaussian = (q: number) => Math.exp(-((Math.PI * q) ** 2) / (4 * Math.LN2));
  const u = [1, 2, 3, 5, 7].map((value) => value * 1e9);
  const sigma = [0.01, 0.01, 0.02, 0.02, 0.01];
  const data = [
    [0.909799271326568, -0.09430042389273402],
    [0.6432040479483285, -0.15621952378448692],
    [0.3404200275396962, -0.1805342493696826],
    [-0.177666252353598, -0.2021679665109673],
    [-0.21276207950138531, -0.09394959993369094],
  ];
  const rows = u.flatMap((value, k) => {
    const spot = gaussian(value * 15 * uas);
    const phase = -2 * Math.PI * value * 10 * uas;
    const ring = besselJ0(Math.PI * value * 42 * uas) * gaussian(value * 10 * uas);
    return [spot * Math.cos(phase), ring, spot * Math.sin(phase), 0].map((x) => x / sigma[k]);
  });
  const b = Float64Array.from(data.flat(), (value, k) => value / sigma[k >> 1]);
  const fit = leastSquares(Float64Array.from(rows), b, 2);
  expect(digits(fit?.solution ?? [], [0.2943559279023158, 0.7036336803806138])).toBeGreaterThan(11);
  expect(
    digits(
      fit?.inverse ?? [],
      [0.0001350429424198, -0.000148831529784112, -0.000148831529784112, 0.000244125246105012],
    ),
  ).toBeGreaterThan(11);
  expect(digits([fit?.residualSquares ?? 0], [4.13557306547633])).toBeGreaterThan(11);
});
