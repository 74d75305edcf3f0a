/** Calibration of the sampler on a posterior that is no Gaussian (Talts et al. 2018, arXiv:1804.06788, theorem 1): the ranks
 *  of truths among the draws are uniform. Few seeds here; test/long/sampler-coverage.test.ts has many. */

import { expect, test } from 'vitest';
import { hits, rankChiSquare, rankTruths } from './sampled-truths.ts';

const SEEDS = 24;
/** 99.9 % of chi-square with 9 degrees of freedom: NIST/SEMATECH e-Handbook of Statistical Methods, table 1.3.6.7.4. */
const LIMIT = 27.877;

test('draws so that truths have uniform ranks, and shows draws that lie too close', () => {
  const { sampled, narrowed, divergences, trajectories } = rankTruths(0, SEEDS);
  const ranks = sampled.flat();
  expect(rankChiSquare(ranks)).toBeLessThan(LIMIT);
  // Binomial, 3.29 standard deviations.
  const p = 0.68;
  expect(Math.abs(hits(ranks, p) / ranks.length - p)).toBeLessThan(
    3.29 * Math.sqrt((p * (1 - p)) / ranks.length),
  );
  expect(hits(ranks, 0.95) / ranks.length).toBeGreaterThan(
    0.95 - 3.29 * Math.sqrt((0.95 * 0.05) / ranks.length),
  );
  expect(rankChiSquare(narrowed.flat())).toBeGreaterThan(LIMIT);
  // The valley that flux and gains share is straightened: before, some 5 % went astray.
  expect(divergences / trajectories).toBeLessThan(0.005);
});
