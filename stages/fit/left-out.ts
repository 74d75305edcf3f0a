/** How much the result hangs on one station, and what the fit says of baselines that it has not seen.
 *
 *  A station is left out with all its measurements and the fit found anew from its optimum. Where all is well the flux moves
 *  by what the station knew of it: the variance of the shift is the difference of the two variances (Hausman 1978,
 *  Econometrica 46, 1251). Baselines are held out in five folds; residuals are over their own errors and those of what the
 *  rest foresees. A fault on one baseline spoils the gains of its stations in the other folds: a weak one, or one with few
 *  measurements, may show on a neighbour. */

import { amplitudeTermOf, type FitProblem } from '../imaging/fit-problem.ts';
import { imageAt, predict } from '../imaging/linear-model.ts';
import { type Refit, refitTo } from '../imaging/refit.ts';
import type { FitResult } from '../imaging/run-fit.ts';
import type { FitSettings } from '../imaging/settings.ts';
import { cholesky, invertSymmetric, solveLowerTransposed } from '../numerics/linear.ts';
import { randomStream } from '../numerics/random.ts';
import { measureRing } from '../numerics/ring.ts';
import { standardDeviation } from '../numerics/statistics.ts';
import { InternalError } from '../problem.ts';
import { UAS_PER_RADIAN } from './flux-numbers.ts';
import {
  type Baseline,
  baselineOf,
  type NormalisedResidual,
  normalisedResiduals,
} from './normalised-residuals.ts';

export interface LeftOutStation {
  readonly station: string;
  readonly measurements: number;
  readonly flux: number;
  /** Without the station less with it, Jy, and over the standard deviation that it should have. */
  readonly fluxShift: number;
  readonly fluxShiftDeviations: number;
  /** Of all terms, over the number of measurements that stay. */
  readonly chiSquarePerMeasurement: number;
  /** Of the image's ring, uas; null where one of the two images has none. */
  readonly diameter: number | null;
  readonly diameterShift: number | null;
}

export interface HeldOutBaseline {
  readonly stations: readonly [string, string];
  readonly measurements: number;
  /** Root of the mean square of residuals over their errors: 1 where the fit foresees them. */
  readonly rms: number;
}

export interface HeldOut {
  readonly folds: number;
  readonly measurements: number;
  readonly rms: number;
  readonly baselines: readonly HeldOutBaseline[];
}

const FOLDS = 5;
/** Of the posterior of each fold, for the spread of what it foresees. */
const DRAWS = 16;
/** Least variance of a shift, over that of the flux: below it stands what the search leaves over. */
const LEAST_SHIFT = 0.01;

/** Stations without which a fit can still be made. Cost: one search each from the optimum. */
export function leaveOutStations(result: FitResult, settings: FitSettings): LeftOutStation[] {
  const { problem, best } = result;
  const { model, data } = problem;
  const variance = fluxVariance(best.curvature, best.x.length);
  const whole = diameterOf(problem, best.x);
  const used = usedMeasurements(problem);
  return data.stations.flatMap(({ name }, index) => {
    const refit = refitTo(problem, best.x, settings, (stations) => !stations.includes(index));
    if (refit === null) return [];
    const stay = usedMeasurements(refit.problem);
    if (stay === used) return [];
    const { x, curvature } = refit.best;
    const shift = model.scales[0] * (x[0] - best.x[0]);
    const more = Math.max(fluxVariance(curvature, x.length) - variance, LEAST_SHIFT * variance);
    const at = predict(refit.problem.model, x);
    const diameter = diameterOf(problem, x);
    return [
      {
        station: name,
        measurements: used - stay,
        flux: model.flux + model.scales[0] * x[0],
        fluxShift: shift,
        fluxShiftDeviations: shift / (model.scales[0] * Math.sqrt(more)),
        chiSquarePerMeasurement:
          refit.problem.terms.reduce((sum, term) => sum + term.chiSquare(at), 0) / stay,
        diameter,
        diameterShift: whole === null || diameter === null ? null : diameter - whole,
      },
    ];
  });
}

function usedMeasurements({ terms }: FitProblem): number {
  return terms.reduce((sum, { count }) => sum + count, 0);
}

/** In whitened units. */
function fluxVariance(curvature: Float64Array, n: number): number {
  return invertSymmetric(curvature, n)?.[0] ?? Number.POSITIVE_INFINITY;
}

/** Uas; null where the image has no ring. */
function diameterOf({ basis, model }: FitProblem, x: Float64Array): number | null {
  const pixels = imageAt(model, basis, x);
  if (!pixels.some((value) => value > 0)) return null;
  const { nx, ny, pixelRadians } = basis;
  const { ring, diameter } = measureRing({ nx, ny, pixelRadians, pixels });
  return ring ? diameter * UAS_PER_RADIAN : null;
}

/** Null with fewer than two baselines, or where what stays of some fold is too little for a fit. */
export function holdOutBaselines(
  { problem, best, at, gains }: FitResult,
  settings: FitSettings,
): HeldOut | null {
  const used = normalisedResiduals(problem, settings, at, gains);
  const baselines = [...new Set(used.flatMap(({ baselines: own }) => own))];
  const folds = Math.min(FOLDS, baselines.length);
  if (folds < 2) return null;
  const found = new Map<Baseline, number[]>();
  const all: number[] = [];
  for (let fold = 0; fold < folds; fold++) {
    const held = new Set(baselines.filter((_, place) => place % folds === fold));
    const refit = refitTo(
      problem,
      best.x,
      settings,
      (stations) => !sidesOf(stations).some((s) => held.has(s)),
    );
    if (refit === null) return null;
    for (const { baselines: own, value } of unseenResiduals(problem, refit, settings)) {
      const sides = own.filter((side) => held.has(side));
      if (sides.length > 0) all.push(value);
      for (const side of sides) found.set(side, [...(found.get(side) ?? []), value]);
    }
  }
  const nameOf = (index: string) => problem.data.stations[Number(index)].name;
  return {
    folds,
    measurements: all.length,
    rms: rms(all),
    baselines: baselines.flatMap((side) => {
      const values = found.get(side);
      const [first, second] = side.split('-');
      if (values === undefined) return [];
      return [
        { stations: [nameOf(first), nameOf(second)] as const, measurements: values.length, rms: rms(values) },
      ];
    }),
  };
}

/** Residuals of all measurements by a fit to a part of them, over what they should be: their own errors, and the spread of
 *  the prediction over draws of that fit's Gaussian posterior, each with its gains. */
function unseenResiduals(
  problem: FitProblem,
  { problem: part, best }: Refit,
  settings: FitSettings,
): NormalisedResidual[] {
  const term = amplitudeTermOf(part.terms);
  const residualsAt = (x: Float64Array) => {
    const gains = term?.gains(predict(part.model, x)) ?? [];
    return normalisedResiduals(problem, settings, predict(problem.model, x), gains, true);
  };
  const draws = drawParameters(best, settings.seed).map(residualsAt);
  return residualsAt(best.x).map((residual, m) => {
    const spread = standardDeviation(draws.map((draw) => draw[m].value));
    return { ...residual, value: residual.value / Math.sqrt(1 + spread * spread) };
  });
}

function drawParameters({ x, curvature }: Refit['best'], seed: number): Float64Array[] {
  const L = cholesky(curvature, x.length);
  if (!L) throw new InternalError('drawParameters', 'the curvature is not positive definite');
  const random = randomStream(seed, 'held-out baselines');
  return Array.from({ length: DRAWS }, () => {
    const step = solveLowerTransposed(
      L,
      Float64Array.from(x, () => random.normal()),
    );
    return x.map((value, k) => value + step[k]);
  });
}

function sidesOf(stations: readonly number[]): Baseline[] {
  return stations.flatMap((first, k) => stations.slice(k + 1).map((second) => baselineOf(first, second)));
}

function rms(values: readonly number[]): number {
  return values.length > 0
    ? Math.sqrt(values.reduce((sum, value) => sum + value * value, 0) / values.length)
    : 0;
}
