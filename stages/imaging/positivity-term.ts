/** Soft penalty on negative pixels: without one the centre of a ring goes negative (common practice).
 *
 *    cost = weight/2 * share * sum over pixels of (min(I, 0) / reference)^2
 *
 *  `reference` is a twentieth of the flux prior's mean spread over the effective number of pixels of the mean image,
 *  1 / sum mean^2; `share` is the pixel's solid angle over that of the resolution element, so that the cost does not
 *  depend on the pixel size. At weight 1, one resolution element at -reference costs half a unit of chi-square/2. */

import type { Basis } from '../data.ts';
import type { LinearModel } from './linear-model.ts';
import { addResidual, type Expansion } from './term.ts';

/** Sees flux and coefficients only. */
export interface PositivityTerm {
  cost(x: Float64Array): number;
  expand(x: Float64Array, out: Expansion): number;
}

/** Negative brightness that costs one unit, in mean brightness of the mean image. */
const REFERENCE_FRACTION = 0.05;

/** @param resolutionRadians  FWHM; 0 counts as two pixels */
export function makePositivityTerm(basis: Basis, model: LinearModel, weight: number): PositivityTerm {
  const pixelCount = basis.mean.length;
  const columns = model.columns;
  const root = Math.sqrt(weight) * whitening(basis, model.flux);
  // One row per pixel, so that a negative pixel's derivatives lie together.
  const rows = new Float64Array(pixelCount * columns);
  const offset = new Float64Array(pixelCount);
  for (let p = 0; p < pixelCount; p++) {
    offset[p] = root * model.flux * basis.mean[p];
    rows[p * columns] = root * model.scales[0] * basis.mean[p];
    for (let k = 1; k < columns; k++) {
      rows[p * columns + k] = root * model.scales[k] * basis.components[k - 1][p];
    }
  }
  const pixel = (x: Float64Array, p: number) => {
    let sum = offset[p];
    const start = p * columns;
    for (let k = 0; k < x.length; k++) sum += rows[start + k] * x[k];
    return sum;
  };
  const visit = (x: Float64Array, out: Expansion | null) => {
    let cost = 0;
    for (let p = 0; p < pixelCount; p++) {
      const value = pixel(x, p);
      if (value < 0) {
        cost += (value * value) / 2;
        if (out) addResidual(out, value, rows, p * columns);
      }
    }
    return cost;
  };
  return { cost: (x) => visit(x, null), expand: visit };
}

function whitening(basis: Basis, flux: number): number {
  let squares = 0;
  for (const value of basis.mean) squares += value * value;
  const reference = REFERENCE_FRACTION * flux * squares;
  const resolution = basis.resolutionRadians > 0 ? basis.resolutionRadians : 2 * basis.pixelRadians;
  // Solid angle of a Gaussian of that FWHM, pi w^2 / (4 ln 2).
  const element = (Math.PI * resolution * resolution) / (4 * Math.LN2);
  return Math.sqrt((basis.pixelRadians * basis.pixelRadians) / element) / reference;
}
