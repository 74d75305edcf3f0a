/** Station gains from log amplitudes: outside values and identities. */

import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { type LogGainEquation, solveLogGains } from '../../../stages/numerics/gains.ts';

const baselines = (N: number) =>
  Array.from({ length: N }, (_, i) => i).flatMap((i) =>
    Array.from({ length: N - i - 1 }, (_, k) => [i, i + 1 + k] as const),
  );

function amplitudeEquations(N: number, logGain: readonly number[], sigma = 1): LogGainEquation[] {
  return baselines(N).map(([i, j]) => ({
    stations: [i, j],
    signs: [1, 1],
    value: (logGain[i] as number) + (logGain[j] as number),
    sigma,
  }));
}

const NONE = Number.POSITIVE_INFINITY;

describe('Gains', () => {
  test('of three stations are |g1| = sqrt(R12 R13 / R23) and so on: 1.2, 0.8, 1.05 from 0.96, 1.26, 0.84', () => {
    // R_ij = |V_ij| / |M_ij| = |g_i| |g_j|; arithmetic by hand.
    const R = [0.96, 1.26, 0.84];
    const equations = baselines(3).map(([i, j], k) => ({
      stations: [i, j],
      signs: [1, 1],
      value: Math.log(R[k] as number),
      sigma: 1,
    }));
    const solved = solveLogGains(equations, 3, NONE);
    const gains = [...(solved?.logGain ?? [])].map(Math.exp);
    [1.2, 0.8, 1.05].forEach((gain, k) => {
      expect(gains[k]).toBeCloseTo(gain, 13);
    });
  });

  // (AᵀA)⁻¹ = [I − J/(2N−2)]/(N−2): closed form, and the numerical inverse computed outside.
  test.each([
    [3, 0.75, -0.25],
    [4, 0.4166666666666667, -0.08333333333333333],
    [5, 0.2916666666666667, -0.041666666666666664],
    [8, 0.15476190476190477, -0.011904761904761904],
  ])('of %d stations from all baselines have variance %d and covariance %d', (N, variance, covariance) => {
    const solved = solveLogGains(amplitudeEquations(N, new Array(N).fill(0)), N, NONE);
    for (let i = 0; i < N; i++) {
      for (let j = 0; j < N; j++) {
        expect(solved?.covariance[i * N + j]).toBeCloseTo(i === j ? variance : covariance, 13);
      }
    }
  });

  test('come back from the amplitudes that they make', () => {
    fc.assert(
      fc.property(
        fc.array(fc.double({ min: -1, max: 1, noNaN: true }), { minLength: 3, maxLength: 9 }),
        (gains) => {
          const solved = solveLogGains(amplitudeEquations(gains.length, gains, 0.1), gains.length, NONE);
          gains.forEach((gain, k) => {
            expect(Math.abs((solved?.logGain[k] ?? 9) - gain)).toBeLessThan(1e-12);
          });
        },
      ),
      { seed: 7 },
    );
  });

  test('that nothing determines are not given', () => {
    const difference: LogGainEquation = { stations: [0, 1], signs: [1, -1], value: 0.4, sigma: 0.1 };
    expect(solveLogGains([difference], 2, NONE)).toBeNull();
    expect(solveLogGains([], 2, NONE)).toBeNull();
  });

  test('that a difference alone tells are halved by the prior', () => {
    const difference: LogGainEquation = { stations: [0, 1], signs: [1, -1], value: 0.4, sigma: 1e-4 };
    const solved = solveLogGains([difference], 2, 0.5);
    expect(solved?.logGain[0]).toBeCloseTo(0.2, 6);
    expect(solved?.logGain[1]).toBeCloseTo(-0.2, 6);
  });
});
