/** Diagnostics of chains and the Hamiltonian sampler against numbers from outside. */

import { readFileSync } from 'node:fs';
import { describe, expect, test } from 'vitest';
import { basicRHat, diagnose } from '../../stages/numerics/chain-diagnostics.ts';
import { sampleHamiltonian, type Target } from '../../stages/numerics/hamiltonian.ts';
import { mean, standardDeviation } from '../../stages/numerics/statistics.ts';

/** Four sets of 4 chains of 100 invented draws, and what the R package posterior 1.4.0 and a numpy implementation found in
 *  them, equal to 1e-13 (check value rhat.ess). Method: Vehtari et al. 2021, Bayesian Analysis 16, 667. */
const { chains: sets, results } = JSON.parse(
  readFileSync(new URL('../data/chains/chains.json', import.meta.url), 'utf8'),
) as {
  chains: Record<string, number[][]>;
  results: Record<string, { rhat: number; ess_bulk: number; ess_tail: number; mcse_mean: number }>;
};

describe('diagnostics', () => {
  test.each(Object.keys(sets))('are those published for the chains %s', (name) => {
    const chains = (sets[name] as number[][]).map((chain) => Float64Array.from(chain));
    const found = diagnose(chains);
    const expected = results[name] as (typeof results)[string];
    expect(Math.abs(found.rHat / expected.rhat - 1)).toBeLessThan(1e-8);
    expect(Math.abs(found.essBulk / expected.ess_bulk - 1)).toBeLessThan(1e-8);
    expect(Math.abs(found.essTail / expected.ess_tail - 1)).toBeLessThan(1e-8);
    expect(Math.abs(found.mcseMean / expected.mcse_mean - 1)).toBeLessThan(1e-8);
  });

  // By hand (check-values, section 7): W = 19/6, B = 9/2, var+ = 7/2, R-hat^2 = 21/19.
  test('have the R-hat of two short chains', () => {
    expect(basicRHat([Float64Array.of(1, 2, 3, 4), Float64Array.of(2, 3, 4, 7)])).toBeCloseTo(
      1.0513149660756935,
      12,
    );
  });

  test('refuse chains of unequal length', () => {
    expect(() => diagnose([new Float64Array(5), new Float64Array(6)])).toThrow('chains of 5, 6 draws');
  });
});

/** -ln of a Gaussian with mean and inverse covariance. */
function gaussian(centre: readonly number[], inverse: readonly (readonly number[])[]): Target {
  return {
    dimension: centre.length,
    evaluate(x, gradient) {
      let energy = 0;
      inverse.forEach((row, i) => {
        gradient[i] = row.reduce((sum, value, j) => sum + value * (x[j] - (centre[j] as number)), 0);
        energy += ((x[i] - (centre[i] as number)) * gradient[i]) / 2;
      });
      return energy;
    },
  };
}

function sample(target: Target, draws = 1000, seed = 3) {
  return sampleHamiltonian(target, {
    chains: 4,
    warmUp: 300,
    draws,
    most: draws,
    seed,
    start: (random) => Float64Array.from({ length: target.dimension }, () => random.normal()),
    suffices: () => false,
  });
}

const coordinate = (run: ReturnType<typeof sample>, i: number) =>
  run.draws.map((chain) => Float64Array.from(chain, (x) => x[i]));

describe('the Hamiltonian sampler', () => {
  // Check value posterior.gaussian_linear: Bishop, Pattern Recognition and Machine Learning, eqs. 3.50 and 3.51;
  // tolerances from there: mean within 4 Monte-Carlo standard errors, variance within 5 %.
  test('finds the posterior of a straight line', () => {
    const A = [0, 1, 2, 3];
    const y = [1, 2.2, 2.9, 4.1];
    const target: Target = {
      dimension: 2,
      evaluate(x, gradient) {
        let energy = (x[0] * x[0] + x[1] * x[1]) / 8;
        gradient.set([x[0] / 4, x[1] / 4]);
        A.forEach((t, k) => {
          const residual = (x[0] + x[1] * t - (y[k] as number)) / 0.2;
          energy += (residual * residual) / 2;
          gradient[0] += residual / 0.2;
          gradient[1] += (residual * t) / 0.2;
        });
        return energy;
      },
    };
    const run = sample(target, 4000);
    const means = [1.0456836190108092, 1.0011347812944433];
    const variances = [0.027769931764461037, 0.007948424437936384];
    means.forEach((expected, i) => {
      const chains = coordinate(run, i);
      const all = Float64Array.from(chains.flatMap((chain) => [...chain]));
      const { rHat, mcseMean, essBulk } = diagnose(chains);
      expect(rHat).toBeLessThan(1.01);
      expect(essBulk).toBeGreaterThan(2000);
      expect(Math.abs(mean(all) - expected)).toBeLessThan(4 * mcseMean);
      const deviation = standardDeviation(all);
      expect(Math.abs((deviation * deviation) / (variances[i] as number) - 1)).toBeLessThan(0.05);
    });
    expect(run.divergences).toBe(0);
    expect(run.acceptance).toBeGreaterThan(0.7);
  });

  // Closed form: a coordinate of covariance [[1, 0.9], [0.9, 1]] has unit variance, the correlation is 0.9.
  test('learns the scales of unlike coordinates', () => {
    const run = sample(
      gaussian(
        [5, -2, 100],
        [
          [1 / 0.19, -0.9 / 0.19, 0],
          [-0.9 / 0.19, 1 / 0.19, 0],
          [0, 0, 1 / 400],
        ],
      ),
    );
    [5, -2, 100].forEach((expected, i) => {
      const chains = coordinate(run, i);
      const { rHat, mcseMean } = diagnose(chains);
      expect(rHat).toBeLessThan(1.02);
      expect(Math.abs(mean(chains.flatMap((chain) => [...chain])) - expected)).toBeLessThan(4 * mcseMean);
    });
    expect(standardDeviation(coordinate(run, 2).flatMap((chain) => [...chain]))).toBeCloseTo(20, -0.5);
  });

  /** Whether the mean of a quantity of the draws is within 4 Monte-Carlo standard errors of what it must be. */
  function expectMean(run: ReturnType<typeof sample>, expected: number, of: (x: Float64Array) => number) {
    const chains = run.draws.map((chain) => Float64Array.from(chain, of));
    const { mcseMean } = diagnose(chains);
    const found = mean(chains.flatMap((chain) => [...chain]));
    expect(Math.abs(found - expected), `${found} for ${expected} +- ${mcseMean}`).toBeLessThan(4 * mcseMean);
  }

  // Closed form: x ~ N(0, 1), y | x ~ N(x^2, 1): E[x^2] = E[y] = 1. Of 30 seeds the farthest is 2.8 standard errors off; with
  // steps of one size seed 23 is 4.5 off, because the tails are left out.
  test.each([1, 23])('follows a bent density into its tails, seed %d', (seed) => {
    const banana: Target = {
      dimension: 2,
      evaluate(x, gradient) {
        const r = x[1] - x[0] * x[0];
        gradient.set([x[0] - 2 * x[0] * r, r]);
        return (x[0] * x[0] + r * r) / 2;
      },
    };
    const run = sample(banana, 3000, seed);
    expectMean(run, 1, (x) => x[0] * x[0]);
    expectMean(run, 1, (x) => x[1]);
    // Where the density is bent most some trajectories go astray: they are counted, not hidden.
    expect(run.divergences).toBeGreaterThan(0);
  });

  // Closed form: v ~ N(0, 1), x_k | v ~ N(0, e^v): E[v] = 0, E[v^2] = 1, E[x_k^2] = e^{1/2}.
  test.each([1, 2])('finds its way through a funnel, seed %d', (seed) => {
    const funnel: Target = {
      dimension: 3,
      evaluate(x, gradient) {
        const narrow = Math.exp(-x[0]);
        const squares = narrow * (x[1] * x[1] + x[2] * x[2]);
        gradient.set([x[0] + 1 - squares / 2, narrow * x[1], narrow * x[2]]);
        return (x[0] * x[0]) / 2 + x[0] + squares / 2;
      },
    };
    const run = sample(funnel, 3000, seed);
    expectMean(run, 0, (x) => x[0]);
    expectMean(run, 1, (x) => x[0] * x[0]);
    expectMean(run, Math.exp(0.5), (x) => x[2] * x[2]);
  });

  // Neal 2011, section 5.5.1: the part that is a standard normal is followed exactly, so that no energy is lost on it.
  test('keeps the energy of a standard normal, whose steps err by nothing', () => {
    const target: Target = {
      dimension: 20,
      evaluate(x, gradient) {
        gradient.set(x);
        return x.reduce((sum, value) => sum + value * value, 0) / 2;
      },
    };
    const run = sampleHamiltonian(target, {
      chains: 2,
      warmUp: 0,
      draws: 50,
      most: 50,
      seed: 3,
      start: (random) => Float64Array.from({ length: 20 }, () => random.normal()),
      suffices: () => true,
    });
    expect(1 - run.acceptance).toBeLessThan(1e-12);
  });

  test('gives the same bits for the same seed, and stops when told', () => {
    const target = gaussian([0], [[1]]);
    expect(sample(target, 20).draws).toEqual(sample(target, 20).draws);
    const stopped = sampleHamiltonian(target, {
      chains: 2,
      warmUp: 10,
      draws: 5,
      most: 100,
      seed: 1,
      start: () => Float64Array.of(0),
      suffices: (draws) => (draws[0]?.length ?? 0) >= 10,
    });
    expect(stopped.draws.map((chain) => chain.length)).toEqual([10, 10]);
    expect(stopped.sufficed).toBe(true);
  });
});
