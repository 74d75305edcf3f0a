/** The posterior by a Hamiltonian sampler: whitened flux and coefficients x (and the place of the centroid where it is a
 *  parameter), and with amplitudes the gain of every station and scan as a parameter h of unit prior. Density: exp of minus
 *  the cost of objective.ts, its gains no longer at their optimum. Coordinates are whitened by the Cholesky factor of the
 *  curvature at the optimum, in which the density is near a standard normal; straightening.ts takes out what is bent. */

import { type ChainDiagnostics, diagnose } from '../numerics/chain-diagnostics.ts';
import type { Minimum } from '../numerics/gauss-newton.ts';
import { type HamiltonianRun, sampleHamiltonian, type Target } from '../numerics/hamiltonian.ts';
import { applyInverse, applyInverseTransposed, cholesky, profileOf } from '../numerics/linear.ts';
import type { RandomStream } from '../numerics/random.ts';
import { InternalError } from '../problem.ts';
import { linearPart, type Place, placeAt, slopesAt } from './centroid.ts';
import type { ExplicitGains } from './explicit-gains.ts';
import { amplitudeTermOf, type FitProblem } from './fit-problem.ts';
import { jointCurvature } from './joint-curvature.ts';
import {
  addPull,
  componentsOf,
  fluxAndCoefficients,
  type LinearModel,
  predict,
  writePrediction,
} from './linear-model.ts';
import type { PlacedPosterior } from './posterior-draws.ts';
import type { ScanGains } from './scan-gains.ts';
import { makeStraightening } from './straightening.ts';

export interface SamplerSettings {
  readonly chains: number;
  readonly warmUp: number;
  /** Of each chain in a round. */
  readonly draws: number;
  /** Of each chain at most. */
  readonly most: number;
  readonly rHat: number;
  readonly ess: number;
}

export interface SampledPosterior extends PlacedPosterior {
  /** From 0, of every draw. */
  readonly chain: Int32Array;
}

export interface SamplerReport {
  readonly chains: number;
  readonly draws: number;
  readonly warmUp: number;
  readonly parameters: number;
  readonly gains: number;
  /** The worst over flux, coefficients and place. */
  readonly rHat: number;
  readonly essBulk: number;
  readonly essTail: number;
  readonly flux: ChainDiagnostics;
  readonly logPosterior: ChainDiagnostics;
  readonly acceptance: number;
  readonly stepSizes: readonly number[];
  readonly divergences: number;
  readonly gradients: number;
  readonly targets: { readonly rHat: number; readonly ess: number };
  readonly met: boolean;
}

/** Chains start this much wider than the Gaussian of the curvature. */
const OVERDISPERSION = 1.5;
const NEARER = 0.8;

/** Samples. @param count  draws to hand over, evenly out of those of all chains
 *  Cost: three to five gradients a draw, each as long as one evaluation of the cost. */
export function samplePosterior(
  problem: FitProblem,
  best: Minimum,
  gains: readonly ScanGains[],
  settings: SamplerSettings,
  { count, seed, progress }: { count: number; seed: number; progress?: (fraction: number) => void },
): { posterior: SampledPosterior; report: SamplerReport } {
  const density = makeDensity(problem, best, gains);
  const columns = best.x.length;
  const parametersOf = (draws: readonly (readonly Float64Array[])[]) => {
    const positions = draws.map((chain) => chain.map((y) => density.position(y)));
    return Array.from({ length: columns }, (_, k) =>
      positions.map((chain) => Float64Array.from(chain, (z) => z[k])),
    );
  };
  const run = sampleHamiltonian(density.target, {
    ...settings,
    seed,
    start: (random) => startOf(density.target, random),
    suffices: (draws) => {
      if (draws.length * draws[0].length < count) return false;
      return parametersOf(draws).every((chains) => isMet(diagnose(chains), settings));
    },
    ...(progress ? { progress } : {}),
  });
  const found = parametersOf(run.draws).map(diagnose);
  return {
    posterior: takeDraws(problem.model, run, density.position, columns, count),
    report: reportOf(run, found, settings, density.target.dimension - columns),
  };
}

/** A place wider about the optimum than the posterior; drawn nearer until it is no place of hardly any probability, from
 *  which a chain may not find back: beyond a null of a visibility, or a phase that has gone round. */
function startOf(target: Target, random: RandomStream): Float64Array {
  const n = target.dimension;
  const scratch = new Float64Array(n);
  const lowest = target.evaluate(new Float64Array(n), scratch);
  const at = Float64Array.from({ length: n }, () => OVERDISPERSION * random.normal());
  while (!(target.evaluate(at, scratch) - lowest < OVERDISPERSION * OVERDISPERSION * n)) {
    for (let k = 0; k < n; k++) at[k] *= NEARER;
  }
  return at;
}

function isMet(
  { rHat, essBulk, essTail }: ChainDiagnostics,
  targets: { rHat: number; ess: number },
): boolean {
  return rHat <= targets.rHat && essBulk >= targets.ess && essTail >= targets.ess;
}

interface Density {
  readonly target: Target;
  /** Parameters x and h of whitened coordinates. */
  position(y: Float64Array): Float64Array;
}

function makeDensity(problem: FitProblem, best: Minimum, gains: readonly ScanGains[]): Density {
  const { model, positivity } = problem;
  const amplitudes = amplitudeTermOf(problem.terms);
  const explicit = amplitudes?.explicit() ?? null;
  const others = problem.terms.filter((term) => term !== amplitudes);
  const columns = best.x.length;
  const white = whiten(problem, best, gains, explicit);
  const straightening = explicit && makeStraightening(model, best.x, explicit.scales);
  const n = white.dimension;
  const z = new Float64Array(n);
  const slope = new Float64Array(n);
  const [x, h] = [z.subarray(0, columns), z.subarray(columns)];
  const [slopeX, slopeH] = [slope.subarray(0, columns), slope.subarray(columns)];
  const [linear, slopeLinear] = [linearPart(model, x), linearPart(model, slopeX)];
  const room = () => ({ re: new Float64Array(model.count), im: new Float64Array(model.count) });
  const [own, pull] = [room(), room()];
  const evaluate = (y: Float64Array, gradient: Float64Array) => {
    white.position(y, z);
    straightening?.apply(x, h);
    const at = model.ramp ? predict(model, x) : own;
    if (!model.ramp) writePrediction(model, x, own);
    pull.re.fill(0);
    pull.im.fill(0);
    let energy = 0;
    for (let k = 0; k < n; k++) energy += (z[k] * z[k]) / 2;
    slope.set(z);
    for (const term of others) energy += term.adjoint(at, pull);
    if (explicit) energy += explicit.adjoint(at, h, pull, slopeH);
    if (positivity) energy += positivity.adjoint(linear, slopeLinear);
    addPull(slopeX, slopesAt(model, x, at), pull, columns);
    straightening?.pullBack(x, slopeX, slopeH);
    white.gradient(slope, gradient);
    return energy;
  };
  const position = (y: Float64Array) => {
    const out = new Float64Array(n);
    white.position(y, out);
    straightening?.apply(out, out.subarray(columns));
    return out;
  };
  return { position, target: { dimension: n, evaluate } };
}

/** Coordinates y with (h, x) = optimum + L^-T y. The gains stand first: those of different scans meet only through x, so
 *  that hardly any of their part of L is other than 0. */
function whiten(
  problem: FitProblem,
  best: Minimum,
  gains: readonly ScanGains[],
  explicit: ExplicitGains | null,
) {
  const columns = best.x.length;
  const centre = Float64Array.of(...best.x, ...(explicit?.whitened(gains) ?? []));
  const n = centre.length;
  const count = n - columns;
  const H = jointCurvature(problem, best.x, gains);
  const place = (k: number) => (k < count ? columns + k : k - count);
  const turned = Float64Array.from(H, (_, k) => H[place(Math.floor(k / n)) * n + place(k % n)]);
  const L = cholesky(turned, n);
  if (!L) throw new InternalError('samplePosterior', 'the curvature is not positive definite');
  const profile = profileOf(L, n);
  const scratch = new Float64Array(n);
  return {
    dimension: n,
    position(y: Float64Array, z: Float64Array): void {
      scratch.set(y);
      applyInverseTransposed(L, scratch, profile);
      for (let k = 0; k < columns; k++) z[k] = centre[k] + scratch[count + k];
      for (let k = 0; k < count; k++) z[columns + k] = centre[columns + k] + scratch[k];
    },
    gradient(slope: Float64Array, out: Float64Array): void {
      for (let k = 0; k < count; k++) out[k] = slope[columns + k];
      for (let k = 0; k < columns; k++) out[count + k] = slope[k];
      applyInverse(L, out, profile);
    },
  };
}

/** Draws spread evenly over those of all chains, chain by chain. */
function takeDraws(
  model: LinearModel,
  { draws }: HamiltonianRun,
  position: (y: Float64Array) => Float64Array,
  columns: number,
  count: number,
): SampledPosterior {
  const length = draws[0].length;
  const total = draws.length * length;
  const flux = new Float64Array(count);
  const chain = new Int32Array(count);
  const places: Place[] = [];
  let [components, coefficients] = [0, new Float64Array(0)];
  for (let s = 0; s < count; s++) {
    const at = Math.min(total - 1, Math.floor(((s + 0.5) * total) / count));
    chain[s] = Math.floor(at / length);
    const x = position(draws[chain[s]][at % length]).subarray(0, columns);
    const draw = fluxAndCoefficients(model, x);
    if (s === 0) {
      components = componentsOf(model, x);
      coefficients = new Float64Array(count * components);
    }
    flux[s] = draw.flux;
    coefficients.set(draw.coefficients, s * components);
    const place = placeAt(model, x);
    if (place) places.push(place);
  }
  return { count, components, flux, coefficients, chain, places: model.ramp ? places : null };
}

function reportOf(
  run: HamiltonianRun,
  found: readonly ChainDiagnostics[],
  settings: SamplerSettings,
  gains: number,
): SamplerReport {
  return {
    chains: run.draws.length,
    draws: run.draws.length * run.draws[0].length,
    warmUp: settings.warmUp,
    parameters: found.length,
    gains,
    rHat: Math.max(...found.map(({ rHat }) => rHat)),
    essBulk: Math.min(...found.map(({ essBulk }) => essBulk)),
    essTail: Math.min(...found.map(({ essTail }) => essTail)),
    flux: found[0],
    logPosterior: diagnose(run.energies),
    acceptance: run.acceptance,
    stepSizes: run.stepSizes,
    divergences: run.divergences,
    gradients: run.gradients,
    targets: { rHat: settings.rHat, ess: settings.ess },
    met: found.every((each) => isMet(each, settings)),
  };
}
