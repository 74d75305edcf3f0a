/** A Hamiltonian sampler (Duane, Kennedy, Pendleton and Roweth 1987, Phys. Lett. B 195, 216; Neal 2011, Handbook of Markov
 *  Chain Monte Carlo, ch. 5): momenta drawn anew for every trajectory, which is accepted by the change of energy. A step turns
 *  position and momentum as a standard normal would, exactly, between two half steps of the force that remains (splitting: the
 *  same, section 5.5.1; Shahbaba, Lan, Johnson and Neal 2014, Stat. Comput. 24, 339): the nearer the target is to a standard
 *  normal, the longer steps can be. In the demonstration a trajectory takes three gradients, where leapfrog steps took five.
 *
 *  Warm-up: the step size of each chain by dual averaging towards a stated acceptance (Hoffman and Gelman 2014, J. Mach.
 *  Learn. Res. 15, 1593, section 3.2); the scale of each coordinate (a diagonal mass) from the spread of all chains' draws
 *  in windows that double, shrunk towards 1, and the step sizes anew after each. A trajectory's length is drawn from 0.8 to
 *  1.6 quarter periods of a standard normal, so that no coordinate resonates with it (Neal 2011, section 5.3.2); a part of
 *  the trajectories has finer steps (the same, section 5.4.2). The target is best whitened first: then all scales are near 1. */

import { cos, exp, ln, pow, sin } from './elementary.ts';
import { type RandomStream, randomStream } from './random.ts';

export interface Target {
  readonly dimension: number;
  /** Returns -ln of the density but for a constant, infinite where it is 0; writes its gradient. */
  evaluate(x: Float64Array, gradient: Float64Array): number;
}

export interface HamiltonianOptions {
  readonly chains: number;
  /** Trajectories before any is kept. */
  readonly warmUp: number;
  /** Trajectories of each chain in a round. */
  readonly draws: number;
  /** Trajectories of each chain at most. */
  readonly most: number;
  readonly seed: number;
  /** Where a chain starts. */
  readonly start: (random: RandomStream) => Float64Array;
  /** Whether what there is suffices; asked after every round. Draws by chain. */
  readonly suffices: (draws: readonly (readonly Float64Array[])[]) => boolean;
  readonly progress?: (fraction: number) => void;
}

export interface HamiltonianRun {
  /** By chain. */
  readonly draws: readonly (readonly Float64Array[])[];
  /** -ln of the density of each draw, by chain. */
  readonly energies: readonly Float64Array[];
  readonly stepSizes: readonly number[];
  /** Mean probability of acceptance after the warm-up. */
  readonly acceptance: number;
  /** Trajectories after the warm-up whose energy went astray. */
  readonly divergences: number;
  readonly gradients: number;
  /** False when the limit was reached first. */
  readonly sufficed: boolean;
}

/** Stated for curved densities (Hoffman and Gelman 2014); 0.65, which costs least of Gaussians, leaves their tails out. */
const ACCEPTANCE = 0.8;
const QUARTER_PERIOD = Math.PI / 2;
/** Of a trajectory, in quarter periods. From 0.6 to 1.4 the demonstration's posterior takes as many gradients with effective sizes
 *  a sixth smaller, from 1 to 1.8 half as many again until its chains agree (means of seven seeds). */
const [SHORTEST, LONGEST] = [0.8, 1.6];
/** A change of energy that no step size in use gives: the integration has left the density's typical set. */
const DIVERGENCE = 1000;
/** Bounds the cost of a trajectory where the density has places that no step is small enough for. */
const MOST_STEPS = 32;
/** One trajectory in ten goes in steps of a third: it gets into tails where others are always rejected, and out of them. */
const FINE_SHARE = 0.1;
const FINER = 3;
const SMALLEST_STEP = QUARTER_PERIOD / MOST_STEPS;
/** Chains that accept less than this even with the smallest steps are stuck: more of the same shows nothing. */
const HOPELESS = 0.3;
/** Parts of the warm-up after which the scales are learned from the draws since the last time. */
const WINDOWS = [1 / 8, 1 / 4, 1 / 2, 3 / 4];
/** Weight, in draws, of the belief that a coordinate's scale is 1. */
const SHRINKAGE = 50;
/** Hoffman and Gelman's constants, but for GAMMA: with their 0.05 short windows settle at an acceptance of 0.9, with 0.15 at
 *  0.82 (measured in 192 dimensions). */
const [GAMMA, T0, KAPPA] = [0.15, 10, 0.75];

/** Draws from a target. Cost: some five gradients a trajectory; fixed order, the same bits everywhere. */
export function sampleHamiltonian(target: Target, options: HamiltonianOptions): HamiltonianRun {
  const { chains: count, warmUp, draws, most, suffices, progress = () => {} } = options;
  const scales = new Float64Array(target.dimension).fill(1);
  const chains = Array.from({ length: count }, (_, c) =>
    makeChain(target, scales, options, randomStream(options.seed, `chain ${c}`)),
  );
  const all = count * (warmUp + draws);
  let done = 0;
  const step = (work: () => void) => {
    work();
    done++;
    if (done % 20 === 0) progress(Math.min(1, done / all));
  };
  const ends = WINDOWS.map((part) => Math.floor(part * warmUp));
  let spread = makeSpread(target.dimension);
  for (let k = 0; k < warmUp; k++) {
    for (const chain of chains) step(() => addTo(spread, chain.warm()));
    if (!ends.includes(k + 1)) continue;
    rescale(scales, spread);
    spread = makeSpread(target.dimension);
    for (const chain of chains) chain.tuneAnew();
  }
  let sufficed = false;
  for (let kept = 0; kept < most && !sufficed; ) {
    const round = Math.min(draws, most - kept);
    for (const chain of chains) for (let k = 0; k < round; k++) step(() => chain.keep());
    kept += round;
    sufficed = suffices(chains.map((chain) => chain.draws));
    if (acceptanceOf(chains) < HOPELESS) break;
  }
  const sum = (value: (chain: Chain) => number) => chains.reduce((total, chain) => total + value(chain), 0);
  return {
    draws: chains.map((chain) => chain.draws),
    energies: chains.map((chain) => Float64Array.from(chain.energies)),
    stepSizes: chains.map((chain) => chain.stepSize()),
    acceptance: acceptanceOf(chains),
    divergences: sum((chain) => chain.divergences),
    gradients: sum((chain) => chain.gradients),
    sufficed,
  };
}

function acceptanceOf(chains: readonly Chain[]): number {
  const kept = chains.reduce((sum, chain) => sum + chain.draws.length, 0);
  return chains.reduce((sum, chain) => sum + chain.accepted, 0) / kept;
}

interface Chain {
  readonly draws: Float64Array[];
  readonly energies: number[];
  accepted: number;
  divergences: number;
  gradients: number;
  /** A trajectory from whose acceptance the step size learns; returns where it ends. */
  warm(): Float64Array;
  /** Starts to learn the step size from where it stands. */
  tuneAnew(): void;
  keep(): void;
  stepSize(): number;
}

/** @param scales  of the coordinates, shared by all chains and changed during the warm-up */
function makeChain(
  target: Target,
  scales: Float64Array,
  options: HamiltonianOptions,
  random: RandomStream,
): Chain {
  const n = target.dimension;
  let x = Float64Array.from(options.start(random));
  let gradient = new Float64Array(n);
  let energy = target.evaluate(x, gradient);
  if (!Number.isFinite(energy))
    throw new RangeError('sampleHamiltonian: a chain starts where the density is 0');
  let tuner = makeTuner(pow(n, -0.25), 10);
  const chain: Chain = {
    draws: [],
    energies: [],
    accepted: 0,
    divergences: 0,
    gradients: 1,
    stepSize: () => tuner.settled(),
    warm() {
      tuner.learn(trajectory(tuner.next()).probability);
      return x;
    },
    tuneAnew() {
      tuner = makeTuner(tuner.settled(), 2);
    },
    keep() {
      const { probability, diverged } = trajectory(
        tuner.settled(),
        random.uniform() < FINE_SHARE ? FINER : 1,
      );
      chain.accepted += probability;
      if (diverged) chain.divergences++;
      chain.draws.push(x);
      chain.energies.push(energy);
    },
  };

  /** One trajectory; moves to its end or stays. */
  function trajectory(full: number, finer = 1): { probability: number; diverged: boolean } {
    const size = full / finer;
    const momentum = Float64Array.from({ length: n }, () => random.normal());
    const length = QUARTER_PERIOD * random.between(SHORTEST, LONGEST);
    const steps = Math.min(finer * MOST_STEPS, Math.max(1, Math.round(length / size)));
    const at = Float64Array.from(x);
    const slope = Float64Array.from(gradient);
    const before = energy + kinetic(momentum);
    const [cosine, sine] = [cos(size), sin(size)];
    let [now, change] = [energy, 0];
    for (let k = 0; k < steps; k++) {
      for (let i = 0; i < n; i++) {
        const q = at[i] / scales[i];
        const p = momentum[i] - (size / 2) * (scales[i] * slope[i] - q);
        at[i] = scales[i] * (q * cosine + p * sine);
        momentum[i] = p * cosine - q * sine;
      }
      now = target.evaluate(at, slope);
      chain.gradients++;
      for (let i = 0; i < n; i++) {
        momentum[i] -= (size / 2) * (scales[i] * slope[i] - at[i] / scales[i]);
      }
      change = now + kinetic(momentum) - before;
      if (!(change < DIVERGENCE)) break;
    }
    const diverged = !(change < DIVERGENCE);
    const probability = diverged ? 0 : Math.min(1, exp(-change));
    if (random.uniform() < probability) {
      x = at;
      gradient = slope;
      energy = now;
    }
    return { probability, diverged };
  }
  return chain;
}

function kinetic(momentum: Float64Array): number {
  let sum = 0;
  for (const p of momentum) sum += p * p;
  return sum / 2;
}

/** Dual averaging of the logarithm of the step size. @param bold  times `first`: what is tried before anything is known */
function makeTuner(first: number, bold: number) {
  const centre = ln(bold * first);
  let [m, error, log, average] = [0, 0, ln(first), ln(first)];
  return {
    next: () => exp(log),
    settled: () => exp(average),
    learn(probability: number) {
      m++;
      error += (ACCEPTANCE - probability - error) / (m + T0);
      log = centre - (Math.sqrt(m) / GAMMA) * error;
      // A trajectory needs at least one step.
      log = Math.max(ln(SMALLEST_STEP), Math.min(log, ln(QUARTER_PERIOD)));
      const weight = pow(m, -KAPPA);
      average = weight * log + (1 - weight) * average;
    },
  };
}

type Spread = { count: number; readonly sum: Float64Array; readonly squares: Float64Array };

function makeSpread(n: number): Spread {
  return { count: 0, sum: new Float64Array(n), squares: new Float64Array(n) };
}

function addTo(spread: Spread, x: Float64Array): void {
  spread.count++;
  for (let i = 0; i < x.length; i++) {
    spread.sum[i] += x[i];
    spread.squares[i] += x[i] * x[i];
  }
}

/** Standard deviations of the coordinates, shrunk towards 1. */
function rescale(scales: Float64Array, { count, sum, squares }: Spread): void {
  if (count < 2) return;
  for (let i = 0; i < scales.length; i++) {
    const variance = Math.max(0, squares[i] - (sum[i] * sum[i]) / count) / (count - 1);
    scales[i] = Math.sqrt((count * variance + SHRINKAGE) / (count + SHRINKAGE));
  }
}
