/** The fit again, from its optimum, to a part of its measurements. */

import type { Visibilities } from '../data.ts';
import type { Minimum } from '../numerics/gauss-newton.ts';
import { type FitProblem, fitClosures, makeTerms, solveFrom } from './fit-problem.ts';
import type { BasisVisibilities, LinearModel } from './linear-model.ts';
import { pointsOf } from './points.ts';
import { takeOf, takeRows } from './select-rows.ts';
import type { FitSettings } from './settings.ts';

/** Whether a measurement on these stations stays. */
export type Keeps = (stations: readonly number[]) => boolean;

export interface Refit {
  /** The problem of what stays; `model` sees its rows only. */
  readonly problem: FitProblem;
  readonly best: Minimum;
}

/** A hundredth of the cost of one measurement. */
const TOLERANCE = 1e-2;
const MOST_STEPS = 20;

/** Null when no measurement of some term stays. Closures are chosen anew. Cost: some five Gauss-Newton steps. */
export function refitTo(
  problem: FitProblem,
  x: Float64Array,
  settings: FitSettings,
  keeps: Keeps,
): Refit | null {
  const { data, points } = keep(problem.data, keeps);
  const sets = fitClosures(data, settings.minimumSnr);
  const terms = makeTerms(settings.data, data, sets, problem.deviations, settings.minimumSnr);
  if (terms.some(({ count }) => count === 0)) return null;
  const visibilities = takePoints(problem.visibilities, points);
  const { u, v } = pointsOf(data);
  const { ramp } = problem.model;
  const model: LinearModel = {
    ...problem.model,
    ...takePoints(problem.model, points),
    count: points.length,
    offsetRe: take(problem.model.offsetRe, points),
    offsetIm: take(problem.model.offsetIm, points),
    ramp: ramp && { scale: ramp.scale, u, v },
  };
  const part = { ...problem, data, sets, visibilities, model, terms };
  const { best } = solveFrom(part, [x], { tolerance: TOLERANCE, mostSteps: MOST_STEPS });
  return { problem: part, best };
}

/** The measurements that stay, and the numbers of their points among all. */
function keep(all: Visibilities, keeps: Keeps): { data: Visibilities; points: number[] } {
  const { squared, triples } = all;
  const rows = chosen(all.count, (r) => keeps([all.station1[r], all.station2[r]]));
  const squares = squared && chosen(squared.count, (r) => keeps([squared.station1[r], squared.station2[r]]));
  const products =
    triples &&
    chosen(triples.count, (t) => keeps([triples.station1[t], triples.station2[t], triples.station3[t]]));
  const from = pointsOf(all);
  const points = [
    ...rows,
    ...(squares ?? []).map((r) => from.squared + r),
    ...(products ?? []).flatMap((t) => [0, 1, 2].map((side) => from.triples + 3 * t + side)),
  ];
  if ((squares?.length ?? 0) + (products?.length ?? 0) > 0) points.push(from.origin);
  const data = {
    ...takeRows(all, rows),
    ...(squared && squares ? { squared: takeOf(squared, squares) } : {}),
    ...(triples && products ? { triples: takeOf(triples, products) } : {}),
  };
  return { data, points };
}

function chosen(count: number, stays: (r: number) => boolean): number[] {
  return Array.from({ length: count }, (_, r) => r).filter(stays);
}

function take(values: Float64Array, places: readonly number[]): Float64Array {
  return Float64Array.from(places, (place) => values[place]);
}

function takePoints({ columns, re, im }: BasisVisibilities, points: readonly number[]): BasisVisibilities {
  const rowsOf = (values: Float64Array) => {
    const out = new Float64Array(points.length * columns);
    points.forEach((point, r) => {
      out.set(values.subarray(point * columns, (point + 1) * columns), r * columns);
    });
    return out;
  };
  return { columns, re: rowsOf(re), im: rowsOf(im) };
}
