/** The posterior as a Gaussian of the curvature at the optimum (Laplace's method): covariance H^-1 in whitened
 *  parameters; draws x + L^-T z with H = L L^T and z standard normal. */

import type { Posterior } from '../data.ts';
import { cholesky, solveLowerTransposed } from '../numerics/linear.ts';
import { randomStream } from '../numerics/random.ts';
import { InternalError } from '../problem.ts';
import { fluxAndCoefficients, type LinearModel } from './linear-model.ts';

export function drawPosterior(
  model: LinearModel,
  x: Float64Array,
  curvature: Float64Array,
  count: number,
  seed: number,
): Posterior {
  const columns = x.length;
  const L = cholesky(curvature, columns);
  if (!L) throw new InternalError('drawPosterior', 'the curvature is not positive definite');
  const random = randomStream(seed, 'posterior');
  const flux = new Float64Array(count);
  const coefficients = new Float64Array(count * (columns - 1));
  for (let s = 0; s < count; s++) {
    const z = Float64Array.from({ length: columns }, () => random.normal());
    const step = solveLowerTransposed(L, z);
    const draw = fluxAndCoefficients(
      model,
      x.map((value, k) => value + step[k]),
    );
    flux[s] = draw.flux;
    coefficients.set(draw.coefficients, s * (columns - 1));
  }
  return { count, components: columns - 1, flux, coefficients };
}
