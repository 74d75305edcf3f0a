/** Calibration of the sampler on a posterior that is no Gaussian, parameter by parameter (Talts et al. 2018, arXiv:1804.06788,
 *  theorem 1). The Gaussian of the curvature stands beside it: its flux is not calibrated. */

import { expect, test } from 'vitest';
import { COMPONENTS, hits, rankChiSquare, rankTruths } from '../stages/imaging/sampled-truths.ts';

const SEEDS = 300;
/** 99.9 % of chi-square with 9 degrees of freedom: NIST/SEMATECH e-Handbook of Statistical Methods, table 1.3.6.7.4. */
const LIMIT = 27.877;

test('draws so that the truths of flux and coefficients have uniform ranks', () => {
  const { sampled, gaussian } = rankTruths(1000, 1000 + SEEDS);
  for (let k = 0; k <= COMPONENTS; k++) {
    const ranks = sampled[k] ?? [];
    expect(rankChiSquare(ranks), `ranks of parameter ${k}`).toBeLessThan(LIMIT);
    for (const p of [0.68, 0.95]) {
      const bound = 3.29 * Math.sqrt((p * (1 - p)) / SEEDS);
      expect(Math.abs(hits(ranks, p) / SEEDS - p), `${p} of parameter ${k}`).toBeLessThan(bound);
    }
  }
  expect(rankChiSquare(gaussian[0] ?? [])).toBeGreaterThan(LIMIT);
});
