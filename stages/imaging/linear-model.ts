/** The image model and its visibilities in whitened parameters x, whose prior is the standard normal distribution:
 *
 *    flux          F   = F0 (1 + fluxWidth x_0)
 *    coefficients  b_k = F0 priorWidth sqrt(lambda_k) x_k          k = 1 … K, Jy
 *    image             = F mean + sum_k b_k component_k
 *    visibilities      = offset + D x                               linear, D computed once
 *
 *  Where the centroid is a parameter, two more stand behind these and the visibilities are turned: centroid.ts.
 *
 *  The image is the source at the resolution of the basis, whose images were convolved with a Gaussian of FWHM w. The
 *  data are not, so the transform of an image is divided by that of the Gaussian, exp(-(pi w)^2 (u^2 + v^2) / (4 ln 2)).
 *  Without it the library's blur stands against the data: of four invented rings one was lost, and reduced chi-squares
 *  were higher in all.
 *
 *  Columns are nested: a model of fewer components uses the first columns. */

import type { Basis } from '../data.ts';
import { visibilitiesOfAll } from '../numerics/fourier.ts';
import { addCombination } from '../numerics/linear.ts';
import { gaussianTaper } from '../numerics/models.ts';
import { linearPart, moved, placeAt, type Ramp } from './centroid.ts';

/** Derivatives of visibilities by parameters. */
export interface Slopes {
  readonly columns: number;
  /** D[r*columns + k], Jy. */
  readonly re: Float64Array;
  readonly im: Float64Array;
}

/** Its `columns` are 1 + K. */
export interface LinearModel extends Slopes {
  /** Number of visibilities. */
  readonly count: number;
  /** Jy per unit of each parameter; scales[0] belongs to the flux. */
  readonly scales: Float64Array;
  /** F0, Jy. */
  readonly flux: number;
  /** Visibilities at x = 0, Jy. */
  readonly offsetRe: Float64Array;
  readonly offsetIm: Float64Array;
  /** Null where the centroid is no parameter. */
  readonly ramp: Ramp | null;
}

/** Visibilities of a model at one place of the parameters. */
export interface ModelVisibilities {
  readonly re: Float64Array;
  readonly im: Float64Array;
}

/** Visibilities of the unblurred sources that the basis stands for, at unit flux and unit coefficients: the mean, then
 *  the components; B[r*(K+1) + k]. */
export interface BasisVisibilities {
  readonly columns: number;
  readonly re: Float64Array;
  readonly im: Float64Array;
}

/** Cost: one sum over pixels per point and image. */
export function basisVisibilities(basis: Basis, u: Float64Array, v: Float64Array): BasisVisibilities {
  const images = [basis.mean, ...basis.components];
  const columns = images.length;
  const outRe = images.map(() => new Float64Array(u.length));
  const outIm = images.map(() => new Float64Array(u.length));
  visibilitiesOfAll(outRe, outIm, basis, images, u, v);
  const re = new Float64Array(u.length * columns);
  const im = new Float64Array(u.length * columns);
  for (let r = 0; r < u.length; r++) {
    const unblurring = 1 / gaussianTaper(u[r] * u[r] + v[r] * v[r], basis.resolutionRadians);
    for (let k = 0; k < columns; k++) {
      re[r * columns + k] = unblurring * outRe[k][r];
      im[r * columns + k] = unblurring * outIm[k][r];
    }
  }
  return { columns, re, im };
}

export interface PriorSettings {
  /** Prior mean of the flux, Jy. */
  readonly flux: number;
  /** Relative standard deviation of the flux. */
  readonly fluxWidth: number;
  /** Standard deviation of the coefficients over what the library has. */
  readonly priorWidth: number;
}

/** Returns the whitened model, the centroid no parameter. @param eigenvalues K or more */
export function makeLinearModel(
  visibilities: BasisVisibilities,
  eigenvalues: Float64Array,
  prior: PriorSettings,
): LinearModel {
  const { columns } = visibilities;
  const count = visibilities.re.length / columns;
  const scales = new Float64Array(columns);
  scales[0] = prior.flux * prior.fluxWidth;
  for (let k = 1; k < columns; k++) scales[k] = prior.flux * prior.priorWidth * Math.sqrt(eigenvalues[k - 1]);
  const scaled = (values: Float64Array) => values.map((value, index) => value * scales[index % columns]);
  const offset = (values: Float64Array) =>
    Float64Array.from({ length: count }, (_, r) => values[r * columns] * prior.flux);
  return {
    count,
    columns,
    scales,
    flux: prior.flux,
    offsetRe: offset(visibilities.re),
    offsetIm: offset(visibilities.im),
    re: scaled(visibilities.re),
    im: scaled(visibilities.im),
    ramp: null,
  };
}

/** Returns the visibilities at x; components beyond its length count as zero. */
export function predict(model: LinearModel, x: Float64Array): ModelVisibilities {
  const place = placeAt(model, x);
  const unmoved = predictUnmoved(model, linearPart(model, x));
  return model.ramp && place ? moved(unmoved, model.ramp, place) : unmoved;
}

/** Returns the visibilities of the image with its centroid at the phase centre. @param x  flux and coefficients */
export function predictUnmoved(model: LinearModel, x: Float64Array): ModelVisibilities {
  const re = new Float64Array(model.count);
  const im = new Float64Array(model.count);
  writePrediction(model, x, { re, im });
  return { re, im };
}

/** The same into arrays at hand. Two rows at a time, so that their sums run side by side. */
export function writePrediction(model: LinearModel, x: Float64Array, { re, im }: ModelVisibilities): void {
  const { count, columns, re: D, im: E, offsetRe, offsetIm } = model;
  const n = x.length;
  for (let r = 0; r < count; r += 2) {
    const next = r + 1 < count ? r + 1 : r;
    const p = r * columns;
    const q = next * columns;
    let a = offsetRe[r];
    let b = offsetIm[r];
    let c = offsetRe[next];
    let d = offsetIm[next];
    for (let k = 0; k < n; k++) {
      const value = x[k];
      a += D[p + k] * value;
      b += E[p + k] * value;
      c += D[q + k] * value;
      d += E[q + k] * value;
    }
    re[r] = a;
    im[r] = b;
    re[next] = c;
    im[next] = d;
  }
}

/** slope += D^T pull, over the first columns. Four rows at a time, so that a sum is fetched once for them. */
export function addPull(
  slope: Float64Array,
  { columns: stride, re: D, im: E }: Slopes,
  { re, im }: ModelVisibilities,
  columns: number,
): void {
  const count = re.length;
  let r = 0;
  for (; r + 3 < count; r += 4) {
    const p = r * stride;
    const q = p + stride;
    const s = q + stride;
    const t = s + stride;
    const a0 = re[r];
    const a1 = re[r + 1];
    const a2 = re[r + 2];
    const a3 = re[r + 3];
    const b0 = im[r];
    const b1 = im[r + 1];
    const b2 = im[r + 2];
    const b3 = im[r + 3];
    for (let k = 0; k < columns; k++) {
      const first = a0 * D[p + k] + b0 * E[p + k] + (a1 * D[q + k] + b1 * E[q + k]);
      slope[k] += first + (a2 * D[s + k] + b2 * E[s + k] + (a3 * D[t + k] + b3 * E[t + k]));
    }
  }
  for (; r < count; r++) {
    const p = r * stride;
    for (let k = 0; k < columns; k++) slope[k] += re[r] * D[p + k] + im[r] * E[p + k];
  }
}

/** Number of components that parameters hold. */
export function componentsOf(model: LinearModel, x: Float64Array): number {
  return linearPart(model, x).length - 1;
}

/** Returns flux and coefficients, Jy, of whitened parameters. */
export function fluxAndCoefficients(
  model: LinearModel,
  x: Float64Array,
): { flux: number; coefficients: Float64Array } {
  const length = componentsOf(model, x);
  return {
    flux: model.flux + model.scales[0] * x[0],
    coefficients: Float64Array.from({ length }, (_, k) => model.scales[k + 1] * x[k + 1]),
  };
}

/** Returns the image of whitened parameters, Jy per pixel; the centroid stands at the origin. */
export function imageAt(model: LinearModel, basis: Basis, x: Float64Array): Float64Array {
  const { flux, coefficients } = fluxAndCoefficients(model, x);
  const pixels = basis.mean.map((value) => flux * value);
  addCombination(pixels, basis.components, coefficients);
  return pixels;
}
