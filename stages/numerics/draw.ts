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
  gaussianTaper,
  isCircular,
  type Model,
  makeMirroredTransform,
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
  { nx, ny, pixelRadians }: PixelGrid,
): void {
  const taperX = U.map((u) => gaussianTaper(u * u, model.blur));
  const taperY = V.map((v) => gaussianTaper(v * v, model.blur));
  const value = new Float64Array(3);
  for (const part of model.parts) {
    // exp(+2 pi i (u x_0 + v y_0)) for the first pixel's place, exp(-2 pi i (u x + v y)) for the part's.
    const x = phasesAt(U, ((nx - 1) / 2) * pixelRadians - part.x);
    const y = phasesAt(V, -((ny - 1) / 2) * pixelRadians - part.y);
    const isNothing = (l: number, k: number) =>
      !(Math.abs(part.flux * (taperX[k] as number) * (taperY[l] as number)) > NEGLIGIBLE_TAPER);
    const add = (l: number, k: number, real: number, imaginary: number) => {
      const taper = part.flux * (taperX[k] as number) * (taperY[l] as number);
      const c =
        taper * ((x.re[k] as number) * (y.re[l] as number) - (x.im[k] as number) * (y.im[l] as number));
      const s =
        taper * ((x.re[k] as number) * (y.im[l] as number) + (x.im[k] as number) * (y.re[l] as number));
      const at = l * nx + k;
      re[at] = (re[at] as number) + real * c - imaginary * s;
      im[at] = (im[at] as number) + real * s + imaginary * c;
    };
    const [shape, mirrored] = [makeShapeTransform(part), makeMirroredTransform(part)];
    // A circular part needs one evaluation for both signs of u. The frequency without a mirror is taken as nothing anyway.
    const [paired, single] = isCircular(part) ? [(nx - 1) >> 1, 1] : [0, nx];
    for (let l = 0; 2 * l < ny; l++) {
      for (let k = 0; k < single; k++) {
        if (isNothing(l, k)) continue;
        shape(value, U[k] as number, V[l] as number);
        add(l, k, value[0] as number, value[1] as number);
      }
      for (let k = 1; k <= paired; k++) {
        if (isNothing(l, k)) continue;
        mirrored(value, U[k] as number, V[l] as number);
        add(l, k, value[0] as number, value[1] as number);
        add(l, nx - k, value[0] as number, value[2] as number);
      }
    }
  }
}

/** exp(2 pi i u x) for every u. */
function phasesAt(U: Float64Array, x: number): { re: Float64Array; im: Float64Array } {
  return { re: U.map((u) => cos(2 * Math.PI * u * x)), im: U.map((u) => sin(2 * Math.PI * u * x)) };
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
