/** The main job: do the intervals of a fit cover as often as they say? Truths are drawn from the prior, observed with
 *  noise, and fitted; a p interval must hold the truth in a fraction p of the cases. The number of hits of N is binomial:
 *  bounds are its central 99.9 % (normal approximation, 3.29 standard deviations). This is calibration in the sense of
 *  Talts et al. 2018, arXiv:1804.06788, theorem 1. Ranks are tested too, with the published limit for 20 bins. */

import { expect, test } from 'vitest';
import type { Basis, Visibilities } from '../../stages/data.ts';
import { drawPosterior } from '../../stages/imaging/posterior-draws.ts';
import { runFit } from '../../stages/imaging/run-fit.ts';
import type { FitSettings } from '../../stages/imaging/settings.ts';
import { randomStream } from '../../stages/numerics/random.ts';
import { quantiles } from '../../stages/numerics/statistics.ts';
import { slowVisibility } from '../stages/fit/synthetic-data.ts';
import { imageOf, UAS } from '../stages/numerics/ring-images.ts';

const N = 10;
const PIXEL = 10;
const K = 5;
const SEEDS = 300;
const DRAWS = 399;
const FLUX = 1.5;

/** A Gaussian mean and K orthonormal waves without flux; eigenvalues fall by halves. */
function smallBasis(): Basis {
  const raw = imageOf(N, N, PIXEL, (x, y) => Math.exp(-(x * x + y * y) / 800));
  const total = raw.pixels.reduce((a, b) => a + b);
  const waves: [number, number, 0 | 1][] = [
    [1, 0, 0],
    [0, 1, 1],
    [1, 1, 0],
    [2, 1, 1],
    [1, 2, 0],
  ];
  const components = waves.map(([a, b, odd]) =>
    Float64Array.from({ length: N * N }, (_, k) => {
      const turns = (a * (k % N) + b * Math.floor(k / N)) / N;
      const phase = 2 * Math.PI * turns;
      return (odd ? Math.sin(phase) : Math.cos(phase)) / Math.sqrt((N * N) / 2);
    }),
  );
  const eigenvalues = Float64Array.from({ length: K }, (_, k) => 0.02 / 2 ** k);
  return {
    nx: N,
    ny: N,
    pixelRadians: PIXEL * UAS,
    resolutionRadians: 0,
    mean: raw.pixels.map((value) => value / total),
    components,
    eigenvalues,
    totalVariance: 0.04,
    scores: new Float64Array(K),
    families: ['wave'],
  };
}

const SETTINGS: FitSettings = {
  data: 'complex-visibilities',
  components: K,
  priorWidth: 1.5,
  flux: FLUX,
  fluxPrior: 0.2,
  shortest: 0,
  gainPriors: { usual: 0.1, stations: {} },
  minimumSnr: 2.5,
  positivity: 0,
  starts: 1,
  posterior: 'gaussian',
  sampler: { chains: 4, warmUp: 100, draws: 150, most: 600, rHat: 1.02, ess: 300 },
  samples: DRAWS,
  seed: 1,
};

/** Baselines at 24 random places; noise differs from row to row. */
function points(random: ReturnType<typeof randomStream>, count = 24) {
  const u = Float64Array.from({ length: count }, () => random.between(-6e9, 6e9));
  const v = Float64Array.from({ length: count }, () => random.between(-6e9, 6e9));
  const sigma = Float64Array.from({ length: count }, () => random.between(0.05, 0.4));
  return { count, u, v, sigma };
}

const basis = smallBasis();
const { count, u, v, sigma } = points(randomStream(3, 'points'));
const parts = [basis.mean, ...basis.components].map((pixels) =>
  Array.from({ length: count }, (_, r) => slowVisibility({ ...basis, pixels }, u[r], v[r])),
);

function observeTruth(truth: readonly number[], random: ReturnType<typeof randomStream>): Visibilities {
  const sum = (part: 0 | 1) =>
    Float64Array.from(u, (_, r) => truth.reduce((total, value, k) => total + value * parts[k][r][part], 0));
  const noisy = (values: Float64Array) => values.map((value, r) => value + sigma[r] * random.normal());
  const [re, im] = [noisy(sum(0)), noisy(sum(1))];
  return {
    target: { name: 'invented', raDegrees: 0, decDegrees: 0 },
    arrayName: 'invented',
    remark: 'invented data',
    stations: [
      { name: 'Alder', xyz: [0, 0, 0] },
      { name: 'Birch', xyz: [0, 0, 0] },
    ],
    wavelengthMetres: 1e-3,
    bandwidthMetres: 1e-5,
    count,
    station1: new Int32Array(count),
    station2: new Int32Array(count).fill(1),
    scan: Int32Array.from(u, (_, r) => r),
    timeMjd: Float64Array.from(u, (_, r) => 58000 + r),
    integrationSeconds: new Float64Array(count).fill(10),
    u,
    v,
    re,
    im,
    sigma,
    sigmaPhase: sigma.map((value, r) => Math.min(Math.PI, value / Math.hypot(re[r], im[r]))),
  };
}

interface Tally {
  readonly hits68: number[];
  readonly hits95: number[];
  readonly ranks: number[][];
}

/** @param widening  factor on the stated errors: 1 for an honest fit */
function tally(seeds: number, widening = 1): Tally {
  const out: Tally = {
    hits68: new Array(1 + K).fill(0),
    hits95: new Array(1 + K).fill(0),
    ranks: Array.from({ length: 1 + K }, () => []),
  };
  for (let seed = 0; seed < seeds; seed++) {
    const random = randomStream(seed, 'coverage');
    const truth = [
      FLUX * (1 + SETTINGS.fluxPrior * random.normal()),
      ...Array.from(
        basis.eigenvalues,
        (value) => FLUX * SETTINGS.priorWidth * Math.sqrt(value) * random.normal(),
      ),
    ];
    const data = observeTruth(truth, random);
    const stated = { ...data, sigma: data.sigma.map((value) => value * widening) };
    stated.sigmaPhase = data.sigmaPhase.map((value) => Math.min(Math.PI, value * widening));
    const { problem, best } = runFit(stated, basis, SETTINGS);
    const draws = drawPosterior(problem.model, best.x, best.curvature, DRAWS, seed);
    for (let k = 0; k <= K; k++) {
      const values =
        k === 0
          ? draws.flux
          : Float64Array.from({ length: DRAWS }, (_, s) => draws.coefficients[s * K + k - 1]);
      const [low95, low, high, high95] = quantiles(values, [0.025, 0.16, 0.84, 0.975]);
      if (truth[k] >= low && truth[k] <= high) out.hits68[k]++;
      if (truth[k] >= low95 && truth[k] <= high95) out.hits95[k]++;
      out.ranks[k].push(values.filter((value) => value < truth[k]).length);
    }
  }
  return out;
}

/** Chi-square of ranks 0 … DRAWS in 20 equal bins. */
function rankChiSquare(ranks: readonly number[]): number {
  const bins = new Array(20).fill(0);
  for (const rank of ranks) bins[Math.floor((rank * 20) / (DRAWS + 1))]++;
  const expected = ranks.length / 20;
  return bins.reduce((sum, n) => sum + (n - expected) ** 2 / expected, 0);
}

test('covers flux and coefficients as often as it says', () => {
  const { hits68, hits95, ranks } = tally(SEEDS);
  const within = (hits: number, p: number) =>
    Math.abs(hits / SEEDS - p) <= 3.29 * Math.sqrt((p * (1 - p)) / SEEDS);
  for (let k = 0; k <= K; k++) {
    expect(within(hits68[k], 0.68), `68 % interval of parameter ${k}: ${hits68[k]} of ${SEEDS}`).toBe(true);
    expect(within(hits95[k], 0.95), `95 % interval of parameter ${k}: ${hits95[k]} of ${SEEDS}`).toBe(true);
    // 99.9 % of chi-square with 19 degrees of freedom.
    expect(rankChiSquare(ranks[k]), `ranks of parameter ${k}`).toBeLessThan(43.82019596451753);
  }
});

test('would show errors stated too small by a third', () => {
  const { hits68 } = tally(120, 2 / 3);
  const p = 0.68;
  const missed = hits68.filter((hits) => hits / 120 < p - 3.29 * Math.sqrt((p * (1 - p)) / 120));
  expect(missed.length).toBeGreaterThan(0);
});
