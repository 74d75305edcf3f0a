/** Posteriors beside the main one, from which the parts of an error are told: with the gains held at the optimum (what
 *  noise alone does), and with the other numbers of components that held-out data admit. Gaussians of the curvature. */

import type { Posterior } from '../data.ts';
import { type FitProblem, resized, solveFrom } from './fit-problem.ts';
import { jointCurvature } from './joint-curvature.ts';
import { componentsOf } from './linear-model.ts';
import { drawPosterior } from './posterior-draws.ts';
import type { FitResult } from './run-fit.ts';
import type { ScanGains } from './scan-gains.ts';

export interface Variant {
  readonly role: 'gains fixed' | 'components';
  readonly posterior: Posterior;
}

/** Draws of each. */
const DRAWS = 60;
/** Other numbers of components that are tried, those nearest to the chosen one. */
const MOST_NUMBERS = 2;

/** Cost: one search from the optimum for each other number of components. */
export function posteriorVariants(result: FitResult, seed: number): Variant[] {
  const { problem, best, gains, choice } = result;
  const held = heldGains(problem, best.x, gains);
  const fixed: Variant = {
    role: 'gains fixed',
    posterior: drawPosterior(problem.model, best.x, held, DRAWS, seed),
  };
  const chosen = componentsOf(problem.model, best.x);
  const others = (choice?.curve ?? [])
    .filter(({ components, aboveBest, standardError }) => components !== chosen && aboveBest <= standardError)
    .map(({ components }) => components)
    .sort((a, b) => Math.abs(a - chosen) - Math.abs(b - chosen))
    .slice(0, MOST_NUMBERS);
  return [
    fixed,
    ...others.map((components): Variant => {
      const { best: other } = solveFrom(problem, [resized(problem.model, best.x, 1 + components)]);
      return {
        role: 'components',
        posterior: drawPosterior(problem.model, other.x, other.curvature, DRAWS, seed),
      };
    }),
  ];
}

/** The block of the parameters in the joint curvature: the gains do not move. */
function heldGains(problem: FitProblem, x: Float64Array, gains: readonly ScanGains[]): Float64Array {
  const joint = jointCurvature(problem, x, gains);
  const n = Math.round(Math.sqrt(joint.length));
  const columns = x.length;
  return Float64Array.from(
    { length: columns * columns },
    (_, k) => joint[Math.floor(k / columns) * n + (k % columns)],
  );
}
