/** Truths drawn from the prior, observed behind unknown gains and station phases, fitted and sampled: where in the draws does
 *  each truth stand? With amplitudes, closure phases and gains of 30 % the posterior is no Gaussian. */

import type { Basis, Posterior, Visibilities } from '../../../stages/data.ts';
import { drawPosterior } from '../../../stages/imaging/posterior-draws.ts';
import { runFit } from '../../../stages/imaging/run-fit.ts';
import { samplePosterior } from '../../../stages/imaging/sampler.ts';
import type { FitSettings } from '../../../stages/imaging/settings.ts';
import { randomStream } from '../../../stages/numerics/random.ts';
import { slowVisibility } from '../fit/synthetic-data.ts';
import { imageOf, UAS } from '../numerics/ring-images.ts';

const N = 10;
const PIXEL = 10;
export const COMPONENTS = 4;
const FLUX = 1.5;
const STATIONS = 5;
const SCANS = 3;
export const DRAWS = 99;
const GAINS = 0.3;
/** Jy: a signal-to-noise from 10 to 50. */
const NOISE = 0.02;

export const SETTINGS: FitSettings = {
  data: 'closure-phases-and-amplitudes',
  components: COMPONENTS,
  priorWidth: 1,
  flux: FLUX,
  fluxPrior: 0.2,
  shortest: 0,
  gainPriors: { usual: GAINS, stations: {} },
  minimumSnr: 0,
  positivity: 0,
  starts: 1,
  posterior: 'sampled',
  sampler: { chains: 4, warmUp: 60, draws: 100, most: 100, rHat: 1.05, ess: 100 },
  samples: DRAWS,
  seed: 1,
};

/** A Gaussian mean and orthonormal waves without flux. */
function waveBasis(): Basis {
  const raw = imageOf(N, N, PIXEL, (x, y) => Math.exp(-(x * x + y * y) / 200));
  const total = raw.pixels.reduce((a, b) => a + b);
  const waves: [number, number, 0 | 1][] = [
    [1, 0, 0],
    [0, 1, 1],
    [1, 1, 0],
    [2, 1, 1],
  ];
  const components = waves.map(([a, b, odd]) =>
    Float64Array.from({ length: N * N }, (_, k) => {
      const phase = (2 * Math.PI * (a * (k % N) + b * Math.floor(k / N))) / N;
      return (odd ? Math.sin(phase) : Math.cos(phase)) / Math.sqrt((N * N) / 2);
    }),
  );
  return {
    nx: N,
    ny: N,
    pixelRadians: PIXEL * UAS,
    resolutionRadians: 0,
    mean: raw.pixels.map((value) => value / total),
    components,
    eigenvalues: Float64Array.from({ length: COMPONENTS }, (_, k) => 0.001 / 2 ** k),
    totalVariance: 0.002,
    scores: new Float64Array(COMPONENTS),
    families: ['wave'],
  };
}

const basis = waveBasis();
const layout = layOut();
const parts = [basis.mean, ...basis.components].map((pixels) =>
  Array.from(layout.u, (u, r) => slowVisibility({ ...basis, pixels }, u, layout.v[r] as number)),
);

/** Stations at random places, which turn from scan to scan. */
function layOut() {
  const random = randomStream(5, 'layout');
  const at = Array.from({ length: STATIONS }, () => [random.between(-2e9, 2e9), random.between(-2e9, 2e9)]);
  const rows = Array.from({ length: SCANS }, (_, scan) =>
    at.flatMap(([x, y], i) =>
      at.slice(i + 1).map(([p, q], k) => {
        const [c, s] = [Math.cos(scan / 2), Math.sin(scan / 2)];
        const [dx, dy] = [(p as number) - (x as number), (q as number) - (y as number)];
        return { i, j: i + 1 + k, scan, u: c * dx - s * dy, v: s * dx + c * dy };
      }),
    ),
  ).flat();
  const column = (key: 'u' | 'v') => Float64Array.from(rows, (row) => row[key]);
  return { rows, u: column('u'), v: column('v') };
}

function observeTruth(truth: readonly number[], random: ReturnType<typeof randomStream>): Visibilities {
  const { rows, u, v } = layout;
  const station = Array.from({ length: SCANS * STATIONS }, () => ({
    gain: Math.exp(GAINS * random.normal()),
    phase: random.between(-Math.PI, Math.PI),
  }));
  const seen = rows.map(({ i, j, scan }, r) => {
    const [a, b] = ([0, 1] as const).map((part) =>
      truth.reduce((sum, value, k) => sum + value * ((parts[k]?.[r]?.[part] as number) ?? 0), 0),
    ) as [number, number];
    const first = station[scan * STATIONS + i] as (typeof station)[number];
    const second = station[scan * STATIONS + j] as (typeof station)[number];
    const [c, s] = [Math.cos(first.phase - second.phase), Math.sin(first.phase - second.phase)];
    const gain = first.gain * second.gain;
    return [
      gain * (a * c - b * s) + NOISE * random.normal(),
      gain * (a * s + b * c) + NOISE * random.normal(),
    ] as const;
  });
  return {
    target: { name: 'invented', raDegrees: 0, decDegrees: 0 },
    arrayName: 'invented',
    remark: 'invented data',
    stations: Array.from({ length: STATIONS }, (_, k) => ({ name: `Alder ${k + 1}`, xyz: [0, 0, 0] })),
    wavelengthMetres: 1e-3,
    bandwidthMetres: 1e-5,
    count: rows.length,
    station1: Int32Array.from(rows, ({ i }) => i),
    station2: Int32Array.from(rows, ({ j }) => j),
    scan: Int32Array.from(rows, ({ scan }) => scan),
    timeMjd: Float64Array.from(rows, ({ scan }) => 58000 + scan),
    integrationSeconds: new Float64Array(rows.length).fill(10),
    u,
    v,
    re: Float64Array.from(seen, ([re]) => re),
    im: Float64Array.from(seen, ([, im]) => im),
    sigma: new Float64Array(rows.length).fill(NOISE),
    sigmaPhase: Float64Array.from(seen, ([re, im]) => Math.min(Math.PI, NOISE / Math.hypot(re, im))),
  };
}

export interface Ranks {
  /** By parameter (flux, coefficients): how many of the DRAWS draws lie below the truth, for every seed. */
  readonly sampled: number[][];
  readonly gaussian: number[][];
  /** Of the sampled draws, moved half way to their median. */
  readonly narrowed: number[][];
  /** Trajectories that went astray, of how many. */
  divergences: number;
  trajectories: number;
}

/** @param from, to  seeds, `to` not among them */
export function rankTruths(from: number, to: number): Ranks {
  const ranks: Ranks = { sampled: [], gaussian: [], narrowed: [], divergences: 0, trajectories: 0 };
  for (let k = 0; k <= COMPONENTS; k++) {
    ranks.sampled.push([]);
    ranks.gaussian.push([]);
    ranks.narrowed.push([]);
  }
  for (let seed = from; seed < to; seed++) {
    const random = randomStream(seed, 'truth');
    const truth = [
      FLUX * (1 + SETTINGS.fluxPrior * random.normal()),
      ...Array.from(basis.eigenvalues, (value) => FLUX * Math.sqrt(value) * random.normal()),
    ];
    const { problem, best, gains } = runFit(observeTruth(truth, random), basis, SETTINGS);
    const { posterior, report } = samplePosterior(problem, best, gains, SETTINGS.sampler, {
      count: DRAWS,
      seed,
    });
    ranks.divergences += report.divergences;
    ranks.trajectories += report.draws;
    const laplace = drawPosterior(problem.model, best.x, best.curvature, DRAWS, seed);
    truth.forEach((value, k) => {
      ranks.sampled[k]?.push(rankOf(value, valuesOf(posterior, k)));
      ranks.gaussian[k]?.push(rankOf(value, valuesOf(laplace, k)));
      ranks.narrowed[k]?.push(rankOf(value, narrowed(valuesOf(posterior, k))));
    });
  }
  return ranks;
}

function valuesOf({ flux, coefficients }: Posterior, k: number): Float64Array {
  if (k === 0) return flux;
  return Float64Array.from({ length: DRAWS }, (_, s) => coefficients[s * COMPONENTS + k - 1] as number);
}

function narrowed(values: Float64Array): Float64Array {
  const middle = Float64Array.from(values).sort()[(DRAWS - 1) / 2] as number;
  return values.map((value) => (value + middle) / 2);
}

function rankOf(truth: number, draws: Float64Array): number {
  return draws.filter((draw) => draw < truth).length;
}

/** Chi-square of ranks 0 … DRAWS in 10 equal bins. */
export function rankChiSquare(ranks: readonly number[]): number {
  const bins = new Array<number>(10).fill(0);
  for (const rank of ranks) bins[Math.floor((rank * 10) / (DRAWS + 1))]++;
  const expected = ranks.length / 10;
  return bins.reduce((sum, n) => sum + (n - expected) ** 2 / expected, 0);
}

/** How many truths the central interval of probability p holds. */
export function hits(ranks: readonly number[], p: number): number {
  const outside = ((1 - p) / 2) * (DRAWS + 1);
  return ranks.filter((rank) => rank >= outside && rank < DRAWS + 1 - outside).length;
}
