/** Models of models.ts as pixels, drawn in the Fourier plane: the pixels are the inverse transform of the model's
 *  visibilities at the frequencies of the grid, so the image's visibilities there are the model's own to rounding,
 *  and the flux and the centroid come out without interpolation.
 *
 *    I[j,i] = 1/(nx ny) sum_kl V(k/(nx p), l/(ny p)) exp(+2 pi i (u_k x_i + v_l y_j))
 *
 *  What that costs: flux beyond the edge comes in at the other side, and a model with detail finer than two pixels
 *  shows ripples beside its edges (Gibbs); `softened` takes care of those. The frequencies at half the sampling rate,
 *  which an even count has without their mirror, are left out. */

import { makeTransform2d } from './dft.ts';
import { cos, sin } from './elementary.ts';
import type { PixelGrid } from './fourier.ts';
import {
  type CircularPart,
  gaussianTaper,
  isCircular,
  type Model,
  type ModelPart,
  makeCircularTransform,
  makeShapeTransform,
} from './models.ts';

/** Full width of the Gaussian, in pixels, that makes a sharp edge drawable: it leaves 3 % of the amplitude at the
 *  grid's highest frequency, ripples below 1 % of an edge's height. */
export const SOFTENING_PIXELS = 2;

/** Frequencies at which the model's blur leaves less than this are taken as nothing. */
const NEGLIGIBLE_TAPER = 1e-12;

/** The model with a further Gaussian of SOFTENING_PIXELS pixels. */
export function softened(model: Model, pixelRadians: number): Model {
  const pixel = SOFTENING_PIXELS * pixelRadians;
  return { ...model, blur: Math.sqrt(model.blur * model.blur + pixel * pixel) };
}

/** Makes the drawing of models on a grid; it writes to the pixels it is given, length nx*ny, in the unit of the parts'
 *  fluxes. Cost per part: half a shape's transform per pixel; plus one two-dimensional transform. */
export function makeDrawing(grid: PixelGrid): (outPixels: Float64Array, model: Model) => void {
  const { nx, ny, pixelRadians } = grid;
  const transform = makeTransform2d(nx, ny);
  const U = frequencies(nx, pixelRadians);
  const V = frequencies(ny, pixelRadians);
  const im = new Float64Array(nx * ny);
  return (outPixels, model) => {
    outPixels.fill(0);
    im.fill(0);
    addHalfPlane(outPixels, im, model, U, V, grid);
    mirrorHalfPlane(outPixels, im, nx, ny);
    // x falls with the index and y rises: a forward transform in x and an inverse one in y. Row l and row ny - l are
    // exchanged to make the inverse of a forward one.
    flipRows(outPixels, nx, ny);
    flipRows(im, nx, ny);
    transform(outPixels, im);
    for (let k = 0; k < outPixels.length; k++) outPixels[k] = (outPixels[k] as number) / (nx * ny);
  };
}

/** Frequencies of a transform of length n in its order 0, 1, … -1, in wavelengths; NaN for the unpaired one. */
function frequencies(n: number, pixelRadians: number): Float64Array {
  return Float64Array.from({ length: n }, (_, k) => {
    if (2 * k === n) return Number.NaN;
    return (2 * k < n ? k : k - n) / (n * pixelRadians);
  });
}

/** Adds the visibilities for v >= 0, turned to the phase centre of pixel (0, 0). */
function addHalfPlane(
  re: Float64Array,
  im: Float64Array,
  model: Model,
  U: Float64Array,
  V: Float64Array,
  grid: PixelGrid,
): void {
  const taperX = U.map((u) => gaussianTaper(u * u, model.blur));
  const taperY = V.map((v) => gaussianTaper(v * v, model.blur));
  for (const part of model.parts) {
    const place = placeOf(part, U, V, taperX, taperY, grid);
    if (part.shape === 'point') addPoint(re, im, place);
    else if (isCircular(part)) addCircularPart(re, im, part, place, U, V);
    else addPart(re, im, part, place, U, V);
  }
}

/** A point has no shape, and is the product of its factors along u and v: those of -u are the conjugates of those of u.
 *  Curves are made of many points. */
function addPoint(
  re: Float64Array,
  im: Float64Array,
  { reX, imX, reY, imY, taperX, taperY }: PartPlace,
): void {
  const [nx, width] = [reX.length, (reX.length + 1) >> 1];
  const realX = reX.map((value, k) => value * taperX[k]);
  const imagX = imX.map((value, k) => value * taperX[k]);
  for (let l = 0; 2 * l < reY.length; l++) {
    const c = reY[l] * taperY[l];
    const d = imY[l] * taperY[l];
    const row = l * nx;
    re[row] += realX[0] * c - imagX[0] * d;
    im[row] += realX[0] * d + imagX[0] * c;
    for (let k = 1, east = row + 1, west = row + nx - 1; k < width; k++, east++, west--) {
      const a = realX[k];
      const b = imagX[k];
      re[east] += a * c - b * d;
      im[east] += a * d + b * c;
      re[west] += a * c + b * d;
      im[west] += a * d - b * c;
    }
  }
}

/** A part's flux, taper and place: factors along u and along v. */
interface PartPlace {
  readonly reX: Float64Array;
  readonly imX: Float64Array;
  readonly reY: Float64Array;
  readonly imY: Float64Array;
  /** With the flux. */
  readonly taperX: Float64Array;
  readonly taperY: Float64Array;
}

function placeOf(
  part: ModelPart,
  U: Float64Array,
  V: Float64Array,
  taperX: Float64Array,
  taperY: Float64Array,
  { nx, ny, pixelRadians }: PixelGrid,
): PartPlace {
  // exp(+2 pi i (u x_0 + v y_0)) for the first pixel's place, exp(-2 pi i (u x + v y)) for the part's.
  const x = phasesAt(U, ((nx - 1) / 2) * pixelRadians - part.x);
  const y = phasesAt(V, -((ny - 1) / 2) * pixelRadians - part.y);
  const withFlux = taperX.map((taper) => part.flux * taper);
  return { reX: x.re, imX: x.im, reY: y.re, imY: y.im, taperX: withFlux, taperY };
}

/** Adds one visibility at column k and row l. */
function addAt(
  re: Float64Array,
  im: Float64Array,
  { reX, imX, reY, imY, taperX, taperY }: PartPlace,
  k: number,
  l: number,
  real: number,
  imaginary: number,
): void {
  const taper = taperX[k] * taperY[l];
  const c = taper * (reX[k] * reY[l] - imX[k] * imY[l]);
  const s = taper * (reX[k] * imY[l] + imX[k] * reY[l]);
  const at = l * reX.length + k;
  re[at] = re[at] + real * c - imaginary * s;
  im[at] = im[at] + real * s + imaginary * c;
}

/** The unpaired frequency, whose taper is NaN, counts as nothing. */
function isNothing({ taperX, taperY }: PartPlace, k: number, l: number): boolean {
  return !(Math.abs(taperX[k] * taperY[l]) > NEGLIGIBLE_TAPER);
}

function addPart(
  re: Float64Array,
  im: Float64Array,
  part: ModelPart,
  place: PartPlace,
  U: Float64Array,
  V: Float64Array,
): void {
  const value = new Float64Array(2);
  const shape = makeShapeTransform(part);
  for (let l = 0; 2 * l < V.length; l++) {
    for (let k = 0; k < U.length; k++) {
      if (isNothing(place, k, l)) continue;
      shape(value, U[k], V[l]);
      addAt(re, im, place, k, l, value[0], value[1]);
    }
  }
}

/** A circular part needs one evaluation of its radial functions for both signs of u and, where the frequencies of the two
 *  axes are the same, for (u, v) and (v, u): distances from the origin are the same to the bit. */
function addCircularPart(
  re: Float64Array,
  im: Float64Array,
  part: CircularPart,
  place: PartPlace,
  U: Float64Array,
  V: Float64Array,
): void {
  const [nx, width] = [U.length, (U.length + 1) >> 1];
  const { radial, along, across } = makeCircularTransform(part);
  const isSquare = nx === V.length;
  const reals = new Float64Array(width * V.length);
  const sizes = new Float64Array(width * V.length).fill(Number.NaN);
  const value = new Float64Array(2);
  for (let l = 0; 2 * l < V.length; l++) {
    const p = V[l] * part.length;
    for (let k = 0; k < width; k++) {
      if (isNothing(place, k, l)) continue;
      const q = U[k] * part.length;
      const rho = Math.sqrt(p * p + q * q);
      const at = isSquare && k < l ? k * width + l : l * width + k;
      if (Number.isNaN(sizes[at])) {
        radial(value, rho);
        reals[at] = value[0];
        sizes[at] = value[1];
      }
      const real = reals[at];
      const size = sizes[at];
      addAt(re, im, place, k, l, real, size === 0 ? 0 : (size * (p * along + q * across)) / rho);
      if (k > 0)
        addAt(re, im, place, nx - k, l, real, size === 0 ? 0 : (size * (p * along - q * across)) / rho);
    }
  }
}

/** exp(2 pi i u x) for every u; those of -u are the conjugates of those of u. NaN for the unpaired one. */
function phasesAt(U: Float64Array, x: number): { re: Float64Array; im: Float64Array } {
  const n = U.length;
  const re = new Float64Array(n).fill(Number.NaN);
  const im = new Float64Array(n).fill(Number.NaN);
  for (let k = 0; 2 * k < n; k++) {
    const phase = 2 * Math.PI * U[k] * x;
    re[k] = cos(phase);
    im[k] = sin(phase);
    if (k === 0) continue;
    re[n - k] = re[k];
    im[n - k] = -im[k];
  }
  return { re, im };
}

/** V(-u,-v) is the conjugate of V(u,v), since the image is real. */
function mirrorHalfPlane(re: Float64Array, im: Float64Array, nx: number, ny: number): void {
  for (let l = 1; 2 * l < ny; l++) {
    for (let k = 0; k < nx; k++) {
      const to = (ny - l) * nx + ((nx - k) % nx);
      re[to] = re[l * nx + k] as number;
      im[to] = -(im[l * nx + k] as number);
    }
  }
}

function flipRows(values: Float64Array, nx: number, ny: number): void {
  for (let l = 1; 2 * l < ny; l++) {
    for (let k = 0; k < nx; k++) {
      const a = l * nx + k;
      const b = (ny - l) * nx + k;
      const kept = values[a] as number;
      values[a] = values[b] as number;
      values[b] = kept;
    }
  }
}
