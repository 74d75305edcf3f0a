/** One geometric model fitted to the data terms of a fit: damped Gauss-Newton steps from the best of a list of starts, the
 *  derivatives of its visibilities by central differences. */

import { exp } from '../../numerics/elementary.ts';
import { gaussNewton, type Minimum } from '../../numerics/gauss-newton.ts';
import { visibilitiesOfModel } from '../../numerics/models.ts';
import { moved, type Place } from '../centroid.ts';
import type { FitProblem } from '../fit-problem.ts';
import type { ModelVisibilities } from '../linear-model.ts';
import { pointsOf } from '../points.ts';
import { makeExpansion, mirror, type Term } from '../term.ts';
import type { ModelKind } from './model-kinds.ts';

/** What the visibilities of a model depend on besides its parameters. */
export interface Setting {
  readonly u: Float64Array;
  readonly v: Float64Array;
  /** Jy. */
  readonly flux: number;
  /** L0 of model-kinds.ts, radians. */
  readonly length: number;
  /** Scale of the centroid's offsets, where they are parameters. */
  readonly placeScale: number | null;
}

export interface FittedModel {
  readonly kind: ModelKind;
  readonly minimum: Minimum;
}

const STEP = 1e-4;
const MOST_STEPS = 25;
/** Searches from the best so many starts. */
const MOST_SEARCHES = 2;
/** Standard deviation of the logarithm of the flux. */
const FLUX_WIDTH = 0.5;

export function settingOf({ data, model, basis }: FitProblem): Setting {
  const { u, v } = pointsOf(data);
  return {
    u,
    v,
    flux: model.flux,
    // A quarter of the field.
    length: (basis.nx * basis.pixelRadians) / 4,
    placeScale: model.ramp?.scale ?? null,
  };
}

/** Number of parameters, flux and place among them. */
export function parametersOf(kind: ModelKind, { placeScale }: Setting): number {
  return 1 + kind.size + (placeScale === null ? 0 : 2);
}

/** Visibilities, Jy. @param x  flux, the kind's parameters, and the place's two where the setting has them */
export function predictModel(kind: ModelKind, x: Float64Array, setting: Setting): ModelVisibilities {
  const { u, v, flux, length, placeScale } = setting;
  const re = new Float64Array(u.length);
  const im = new Float64Array(u.length);
  visibilitiesOfModel(re, im, kind.build(x.subarray(1, 1 + kind.size), length), u, v);
  const scale = flux * exp(FLUX_WIDTH * x[0]);
  for (let r = 0; r < re.length; r++) {
    re[r] *= scale;
    im[r] *= scale;
  }
  if (placeScale === null) return { re, im };
  const place = { east: placeScale * x[1 + kind.size], north: placeScale * x[2 + kind.size] };
  return moved({ re, im }, { scale: placeScale, u, v }, place);
}

/** The best fit. @param place  where the source stands, for settings with a place */
export function fitModel(
  kind: ModelKind,
  terms: readonly Term[],
  setting: Setting,
  place: Place | null,
): FittedModel {
  const objective = makeModelObjective(kind, terms, setting);
  const starts = kind.starts
    .map((start) => Float64Array.of(0, ...start, ...placeStart(setting, place)))
    .map((x) => ({ x, cost: objective.cost(x) }))
    .sort((a, b) => a.cost - b.cost)
    .slice(0, MOST_SEARCHES);
  const minima = starts.map(({ x }) => gaussNewton(objective, x, { mostSteps: MOST_STEPS, tolerance: 1e-2 }));
  return { kind, minimum: minima.reduce((a, b) => (b.cost < a.cost ? b : a)) };
}

/** The best fit near another, to some of the data. */
export function refitModel(
  { kind, minimum }: FittedModel,
  terms: readonly Term[],
  setting: Setting,
): Minimum {
  return gaussNewton(makeModelObjective(kind, terms, setting), minimum.x, { mostSteps: 12, tolerance: 1e-2 });
}

function placeStart({ placeScale }: Setting, place: Place | null): number[] {
  if (placeScale === null) return [];
  return [(place?.east ?? 0) / placeScale, (place?.north ?? 0) / placeScale];
}

function makeModelObjective(kind: ModelKind, terms: readonly Term[], setting: Setting) {
  const prior = (x: Float64Array) => x.reduce((sum, value) => sum + value * value, 0) / 2;
  // A step is costed first and expanded when it is taken: the visibilities are the same.
  let last: { x: Float64Array; at: ModelVisibilities } | null = null;
  const predicted = (x: Float64Array) => {
    if (last?.x !== x) last = { x, at: predictModel(kind, x, setting) };
    return last.at;
  };
  return {
    cost(x: Float64Array) {
      const at = predicted(x);
      return terms.reduce((sum, term) => sum + term.cost(at), prior(x));
    },
    expand(x: Float64Array) {
      const n = x.length;
      const at = predicted(x);
      const slopes = slopesByDifferences(kind, x, setting);
      const out = makeExpansion(n);
      let cost = prior(x);
      for (const term of terms) cost += term.expand(at, slopes, out);
      for (let k = 0; k < n; k++) {
        out.gradient[k] += x[k];
        out.curvature[k * n + k] += 1;
      }
      mirror(out);
      return { cost, gradient: out.gradient, curvature: out.curvature };
    },
  };
}

function slopesByDifferences(kind: ModelKind, x: Float64Array, setting: Setting) {
  const columns = x.length;
  const count = setting.u.length;
  const re = new Float64Array(count * columns);
  const im = new Float64Array(count * columns);
  for (let k = 0; k < columns; k++) {
    const shifted = (h: number) =>
      predictModel(
        kind,
        Float64Array.from(x, (value, i) => (i === k ? value + h : value)),
        setting,
      );
    const [up, down] = [shifted(STEP), shifted(-STEP)];
    for (let r = 0; r < count; r++) {
      re[r * columns + k] = (up.re[r] - down.re[r]) / (2 * STEP);
      im[r * columns + k] = (up.im[r] - down.im[r]) / (2 * STEP);
    }
  }
  return { columns, re, im };
}
