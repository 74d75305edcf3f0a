/** The posterior as a Gaussian of the curvature at the optimum (Laplace's method): covariance H^-1 in whitened
 *  parameters; draws x + L^-T z with H = L L^T and z standard normal. In pairs, z and -z follow each other (Hammersley and
 *  Morton 1956, Proc. Camb. Phil. Soc. 52, 449): what is nearly linear in x then has the median of the optimum with few draws. */

import type { Posterior } from '../data.ts';
import { choleskyNearby, solveLowerTransposed } from '../numerics/linear.ts';
import { randomStream } from '../numerics/random.ts';
import { InternalError } from '../problem.ts';
import { type Place, placeAt } from './centroid.ts';
import { componentsOf, fluxAndCoefficients, type LinearModel } from './linear-model.ts';

/** Draws of flux and coefficients, with the place of each where the centroid is a parameter. */
export interface PlacedPosterior extends Posterior {
  readonly places: readonly Place[] | null;
}

export function drawPosterior(
  model: LinearModel,
  x: Float64Array,
  curvature: Float64Array,
  count: number,
  seed: number,
  isPaired = false,
): PlacedPosterior {
  const columns = x.length;
  // A model visibility beside a null makes the curvature of its phase as large as doubles go.
  const L = choleskyNearby(curvature, columns);
  if (!L) throw new InternalError('drawPosterior', 'the curvature is not positive definite');
  const random = randomStream(seed, 'posterior');
  const flux = new Float64Array(count);
  const components = componentsOf(model, x);
  const coefficients = new Float64Array(count * components);
  const places: Place[] = [];
  let z = new Float64Array(columns);
  for (let s = 0; s < count; s++) {
    z =
      isPaired && s % 2 === 1
        ? z.map((value) => -value)
        : Float64Array.from({ length: columns }, () => random.normal());
    const step = solveLowerTransposed(L, z);
    const at = x.map((value, k) => value + step[k]);
    const draw = fluxAndCoefficients(model, at);
    flux[s] = draw.flux;
    coefficients.set(draw.coefficients, s * components);
    const place = placeAt(model, at);
    if (place) places.push(place);
  }
  return { count, components, flux, coefficients, places: model.ramp ? places : null };
}

/** Draws of data that do not see the flux: each scaled by a draw of the stated flux, which knows nothing of the shape. A draw
 *  of none is drawn again. @param fluxPrior  relative standard deviation */
export function withStatedFlux<T extends Posterior>(posterior: T, fluxPrior: number, seed: number): T {
  const random = randomStream(seed, 'stated flux');
  const factors = Float64Array.from({ length: posterior.count }, () => {
    let factor = 0;
    while (!(factor > 0)) factor = 1 + fluxPrior * random.normal();
    return factor;
  });
  return {
    ...posterior,
    flux: posterior.flux.map((value, s) => value * factors[s]),
    coefficients: posterior.coefficients.map(
      (value, k) => value * factors[Math.floor(k / posterior.components)],
    ),
  };
}
