/** Tail probabilities, rank correlation and the Sun against tables and worked examples. */

import { describe, expect, test } from 'vitest';
import { chiSquareTail } from '../../stages/numerics/chi-square.ts';
import { rankCorrelation } from '../../stages/numerics/rank-correlation.ts';
import { separation, sunAt } from '../../stages/numerics/sun.ts';
import { binomialTail, deviationsOf, normalTail, ofTrials } from '../../stages/numerics/tails.ts';

const DEGREE = Math.PI / 180;

describe('Tails', () => {
  test.each([
    // Abramowitz & Stegun, table 26.8: chi-square for Q = 0.05 and 0.005.
    [1, 3.84146, 0.05],
    [10, 18.307, 0.05],
    [30, 43.773, 0.05],
    [10, 25.1882, 0.005],
    [100, 140.169, 0.005],
  ])('of chi-square with %d degrees beyond %d is %d', (degrees, value, probability) => {
    expect(chiSquareTail(value, degrees)).toBeCloseTo(probability, 5);
  });

  test('of the normal distribution beyond 1, 2, 3 is 0.15866, 0.02275, 0.00135 (ibid., table 26.1)', () => {
    expect([1, 2, 3].map((x) => normalTail(x).toFixed(5))).toEqual(['0.15866', '0.02275', '0.00135']);
  });

  test('of the binomial distribution: 8 or more of 10 at 1/2 is 56/1024', () => {
    expect(binomialTail(8, 10, 0.5)).toBeCloseTo(56 / 1024, 13);
    expect([
      binomialTail(0, 5, 0.3),
      binomialTail(6, 5, 0.3),
      binomialTail(2, 5, 0),
      binomialTail(2, 5, 1),
    ]).toEqual([1, 0, 0, 1]);
  });

  test('of many trials are 1 − (1 − p)^m, without cancellation', () => {
    expect(ofTrials(0.05, 20)).toBeCloseTo(1 - 0.95 ** 20, 13);
    expect(ofTrials(1e-18, 7) / 7e-18).toBeCloseTo(1, 12);
    expect(ofTrials(1, 3)).toBe(1);
  });

  test('turn into standard deviations and back', () => {
    for (const z of [0.5, 1, 3, 6]) expect(deviationsOf(2 * normalTail(z))).toBeCloseTo(z, 9);
    expect(deviationsOf(1)).toBe(0);
    expect(Number.isFinite(deviationsOf(0))).toBe(true);
  });
});

describe('Kendall’s rank correlation', () => {
  test('of the tuna of Hollander & Wolfe 1973, p. 187: tau 4/9, 26 concordant pairs of 36', () => {
    const x = [44.4, 45.9, 41.9, 53.3, 44.7, 44.1, 50.7, 45.2, 60.1];
    const y = [2.6, 3.1, 2.5, 5.0, 3.6, 4.0, 5.2, 2.8, 3.8];
    const { tau, deviations } = rankCorrelation(x, y);
    expect(tau).toBeCloseTo(4 / 9, 14);
    // S = 26 − 10 = 16, var S = 9·8·23/18 = 92, drawn to 0 by 1.
    expect(deviations).toBeCloseTo(15 / Math.sqrt(92), 14);
  });

  test('has the variance that all orders of tied values have, counted out', () => {
    const x = [1, 2, 2, 3, 4, 4];
    const y = [1, 1, 2, 3, 3, 3];
    const S = (order: readonly number[]) => {
      let sum = 0;
      for (let i = 0; i < 6; i++) {
        for (let j = i + 1; j < 6; j++) sum += Math.sign(x[j] - x[i]) * Math.sign(order[j] - order[i]);
      }
      return sum;
    };
    const all = permutations(y).map(S);
    const variance = all.reduce((sum, s) => sum + s * s, 0) / all.length;
    const { deviations } = rankCorrelation(x, y);
    expect(deviations).toBeCloseTo((S(y) - 1) / Math.sqrt(variance), 12);
  });

  test('of what does not change is nothing', () => {
    expect(rankCorrelation([1, 2, 3], [5, 5, 5])).toEqual({ tau: 0, deviations: 0, probability: 1 });
  });
});

function permutations(values: readonly number[]): number[][] {
  if (values.length < 2) return [[...values]];
  return values.flatMap((value, k) =>
    permutations([...values.slice(0, k), ...values.slice(k + 1)]).map((rest) => [value, ...rest]),
  );
}

describe('The Sun', () => {
  test('stands at 198.38083, −7.78507 degrees on 1992 October 13.0 (Meeus, example 25.a)', () => {
    const { ra, dec } = sunAt(2448908.5 - 2400000.5);
    expect(ra / DEGREE).toBeCloseTo(198.38083, 4);
    expect(dec / DEGREE).toBeCloseTo(-7.78507, 4);
  });

  test('crosses the equator northwards at 2000 March 20 7:35 UT (common practice), within a minute of arc', () => {
    const mjd = 51623 + (7 + 35 / 60) / 24;
    const { ra, dec } = sunAt(mjd);
    expect(Math.abs(dec) / DEGREE).toBeLessThan(1 / 60);
    expect(Math.min(ra, 2 * Math.PI - ra) / DEGREE).toBeLessThan(1 / 60);
  });

  test('is apart from a star by the rule that puts two bright stars 32.7930 degrees apart (Meeus, example 17.a)', () => {
    const first = { ra: 213.9154 * DEGREE, dec: 19.1825 * DEGREE };
    const second = { ra: 201.2983 * DEGREE, dec: -11.1614 * DEGREE };
    expect(separation(first, second) / DEGREE).toBeCloseTo(32.793, 4);
  });
});
