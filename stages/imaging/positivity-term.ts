/** Soft penalty on negative pixels: without one the centre of a ring goes negative (common practice).
 *
 *    cost = weight/2 * share * sum over pixels of (min(I, 0) / reference)^2
 *
 *  `reference` is a twentieth of the flux prior's mean spread over the effective number of pixels of the mean image,
 *  1 / sum mean^2; `share` is the pixel's solid angle over that of the resolution element, so that the cost does not
 *  depend on the pixel size. Of pixels finer than half a resolution element one in two (three, …) on either axis stands for
 *  its neighbours: they hold nothing that it does not. At weight 1, one resolution element at -reference costs half a unit of chi-square/2. */

import type { Basis } from '../data.ts';
import type { LinearModel } from './linear-model.ts';
import { addResidual, type Expansion } from './term.ts';

/** Sees flux and coefficients only. */
export interface PositivityTerm {
  cost(x: Float64Array): number;
  expand(x: Float64Array, out: Expansion): number;
  /** Adds the gradient alone; returns the cost. */
  adjoint(x: Float64Array, gradient: Float64Array): number;
}

/** Negative brightness that costs one unit, in mean brightness of the mean image. */
const REFERENCE_FRACTION = 0.05;
/** Pixels that vary by less, whitened, are left out: at weight 1 six standard deviations below nothing cost 0.002. They are the rim of the
 *  field, half of it in the demonstration. */
const NEGLIGIBLE = 0.01;

/** @param resolutionRadians  FWHM; 0 counts as two pixels */
export function makePositivityTerm(basis: Basis, model: LinearModel, weight: number): PositivityTerm {
  const stride = strideOf(basis);
  const columns = model.columns;
  const unit = stride * whitening(basis, model.flux);
  const root = Math.sqrt(weight) * unit;
  const reach = (q: number) => unit * spreadOf(basis, model, q);
  const chosen = everyNth(basis, stride).filter((q) => reach(q) >= NEGLIGIBLE);
  const pixelCount = chosen.length;
  // One row per pixel, so that a negative pixel's derivatives lie together.
  const rows = new Float64Array(pixelCount * columns);
  const offset = new Float64Array(pixelCount);
  for (let p = 0; p < pixelCount; p++) {
    const q = chosen[p];
    offset[p] = root * model.flux * basis.mean[q];
    rows[p * columns] = root * model.scales[0] * basis.mean[q];
    for (let k = 1; k < columns; k++) {
      rows[p * columns + k] = root * model.scales[k] * basis.components[k - 1][q];
    }
  }
  const values = new Float64Array(pixelCount);
  const visit = (x: Float64Array, use: (value: number, start: number) => void) => {
    brightness(values, rows, offset, columns, x);
    let cost = 0;
    for (let p = 0; p < pixelCount; p++) {
      const value = values[p];
      if (!(value < 0)) continue;
      cost += (value * value) / 2;
      use(value, p * columns);
    }
    return cost;
  };
  return {
    cost: (x) => visit(x, () => {}),
    expand: (x, out) => visit(x, (value, start) => addResidual(out, value, rows, start)),
    adjoint: (x, gradient) =>
      visit(x, (value, start) => {
        for (let k = 0; k < x.length; k++) gradient[k] += value * rows[start + k];
      }),
  };
}

/** out[p] = offset[p] + rows[p] . x. Four pixels at a time, so that their sums run side by side. */
function brightness(
  out: Float64Array,
  rows: Float64Array,
  offset: Float64Array,
  columns: number,
  x: Float64Array,
): void {
  const [n, count] = [x.length, out.length];
  let p = 0;
  for (; p + 3 < count; p += 4) {
    const i = p * columns;
    let a = offset[p];
    let b = offset[p + 1];
    let c = offset[p + 2];
    let d = offset[p + 3];
    for (let k = 0; k < n; k++) {
      const value = x[k];
      a += rows[i + k] * value;
      b += rows[i + columns + k] * value;
      c += rows[i + 2 * columns + k] * value;
      d += rows[i + 3 * columns + k] * value;
    }
    out[p] = a;
    out[p + 1] = b;
    out[p + 2] = c;
    out[p + 3] = d;
  }
  for (; p < count; p++) {
    let sum = offset[p];
    for (let k = 0; k < n; k++) sum += rows[p * columns + k] * x[k];
    out[p] = sum;
  }
}

/** Standard deviation of a pixel under the prior, Jy. */
function spreadOf({ mean, components }: Basis, { scales, columns }: LinearModel, q: number): number {
  let sum = scales[0] * mean[q] * (scales[0] * mean[q]);
  for (let k = 1; k < columns; k++) {
    const part = scales[k] * components[k - 1][q];
    sum += part * part;
  }
  return Math.sqrt(sum);
}

/** Pixels to half a resolution element, at least 1. */
function strideOf({ pixelRadians, resolutionRadians }: Basis): number {
  return Math.max(1, Math.floor(resolutionRadians / (2 * pixelRadians)));
}

/** Indices of every n-th pixel of every n-th row, the outermost left over on both sides alike. */
function everyNth({ nx, ny }: Basis, n: number): number[] {
  const places = (count: number) => {
    const first = Math.floor(((count - 1) % n) / 2);
    return Array.from({ length: Math.floor((count - 1 - first) / n) + 1 }, (_, k) => first + k * n);
  };
  return places(ny).flatMap((row) => places(nx).map((column) => row * nx + column));
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
