/** The number of components, chosen by held-out scans.
 *
 *  Scans are dealt into folds, neighbours into different ones. For every number of the ladder and every fold the fit is
 *  made without the fold and scored on it: -2 ln of the likelihood of its scans, gains at their optimum under their
 *  prior. The choice is the largest number whose score exceeds the best one by no more than one standard error of the
 *  difference, paired by scan (Hastie, Tibshirani and Friedman, 2nd ed., section 7.10, with paired differences).
 *
 *  The largest, not the smallest: the prior holds components that the data do not need, while missing ones bias the
 *  diameter and make its interval too narrow. Measured on an invented ring (eight stations, 298 rows, a library of
 *  2,700 images, truth 33.2 uas at the basis' resolution): 31.7 +- 0.2 with 25 components, the smallest number within
 *  one standard error, and 32.1 +- 1.2 with 80. */

import { mean, standardDeviation } from '../numerics/statistics.ts';
import { type FitProblem, resized, solveFrom } from './fit-problem.ts';
import { predict } from './linear-model.ts';

export interface ChoiceStep {
  readonly components: number;
  /** Sum of the scores of all scans. */
  readonly heldOut: number;
  /** Difference of the score to the best of the ladder, and its standard error. */
  readonly aboveBest: number;
  readonly standardError: number;
}

export interface ComponentChoice {
  readonly components: number;
  readonly folds: number;
  readonly scans: number;
  readonly curve: readonly ChoiceStep[];
}

const LADDER = [10, 15, 20, 25, 30, 35, 40, 50, 60, 80];
const FOLDS = 5;
/** A hundredth of the score of one measurement. */
const TOLERANCE = 1e-2;
const MOST_STEPS = 25;

/** The numbers of components that are tried: the ladder up to what the basis has. */
export function ladder(available: number): number[] {
  const steps = LADDER.filter((components) => components < available);
  return [...steps, Math.min(available, LADDER[LADDER.length - 1])];
}

/** @param start  whitened parameters near the optimum, any length
 *  @returns null with fewer than two scans, which leave nothing to hold out */
export function chooseComponents(
  problem: FitProblem,
  start: Float64Array,
  progress: (fraction: number) => void,
): ComponentChoice | null {
  const scans = [...new Set(problem.terms.flatMap((term) => term.scans))].sort((a, b) => a - b);
  if (scans.length < 2) return null;
  const folds = Math.min(FOLDS, scans.length);
  const steps = ladder(problem.model.columns - 1);
  const scores = steps.map(() => new Float64Array(scans.length));
  for (let fold = 0; fold < folds; fold++) {
    const isHeldOut = (place: number) => place % folds === fold;
    const kept = new Set(scans.filter((_, place) => !isHeldOut(place)));
    let x = start;
    steps.forEach((components, step) => {
      const options = { scans: kept, tolerance: TOLERANCE, mostSteps: MOST_STEPS };
      x = solveFrom(problem, [resized(problem.model, x, 1 + components)], options).best.x;
      const at = predict(problem.model, x);
      scans.forEach((scan, place) => {
        if (!isHeldOut(place)) return;
        const only = new Set([scan]);
        scores[step][place] = problem.terms.reduce((sum, term) => sum + 2 * term.only(only).cost(at), 0);
      });
      progress((fold + (step + 1) / steps.length) / folds);
    });
  }
  return { folds, scans: scans.length, ...largestWithin(steps, scores) };
}

function largestWithin(steps: readonly number[], scores: readonly Float64Array[]) {
  const totals = scores.map((row) => mean(row) * row.length);
  const best = totals.indexOf(Math.min(...totals));
  const curve = steps.map((components, step) => {
    const difference = scores[step].map((value, place) => value - scores[best][place]);
    return {
      components,
      heldOut: totals[step],
      aboveBest: totals[step] - totals[best],
      standardError: standardDeviation(difference) * Math.sqrt(difference.length),
    };
  });
  const chosen = curve.findLast(({ aboveBest, standardError }) => aboveBest <= standardError) ?? curve[best];
  return { components: chosen.components, curve };
}
