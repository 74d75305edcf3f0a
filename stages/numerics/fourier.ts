/** Direct Fourier sums between an image and points of the Fourier plane:
 *
 *    V(u,v) = sum_ij I[j*nx + i] exp(-2 pi i (u x_i + v y_j)),   x_i = ((nx-1)/2 - i) p,  y_j = (j - (ny-1)/2) p
 *
 *  (CONVENTIONS; x index rises to the west, p is the pixel in radians, u and v in wavelengths; Thompson, Moran and
 *  Swenson, 3rd ed., ch. 3, sign of OIFITS 2). The kernel separates, exp(-2 pi i u x) exp(-2 pi i v y), and the pixels
 *  lie symmetric about the origin, so the image is first folded into its even and odd parts in x: half the work.
 *
 *  Cost per point: (nx + ny) sines and cosines, shared by all images of one call, and nx*ny multiply-adds per image. */

import { cos, sin } from './elementary.ts';

/** A square-pixelled image, x fastest; `SkyImage` in data.ts is one. */
export interface PixelImage {
  readonly nx: number;
  readonly ny: number;
  readonly pixelRadians: number;
  /** length nx*ny */
  readonly pixels: Float64Array;
}

/** The shape of an image without its pixels. */
export type PixelGrid = Omit<PixelImage, 'pixels'>;

/** Visibilities of an image.
 *  @param outRe, outIm  written; length of u; in the unit of a pixel
 *  @param image         Jy per pixel
 *  @param u, v          wavelengths
 *  @throws RangeError on a length mismatch. NaN in gives NaN out. */
export function visibilitiesOf(
  outRe: Float64Array,
  outIm: Float64Array,
  image: PixelImage,
  u: Float64Array,
  v: Float64Array,
): void {
  visibilitiesOfAll([outRe], [outIm], image, [image.pixels], u, v);
}

/** Visibilities of several images on one grid, such as the components of a basis: phase tables are made once.
 *  @param outRe, outIm  one array per image, written; each of the length of u
 *  @param grid          nx, ny, pixelRadians
 *  @param images        pixels of each image, length nx*ny
 *  @param u, v          wavelengths
 *  @throws RangeError on a length mismatch */
export function visibilitiesOfAll(
  outRe: readonly Float64Array[],
  outIm: readonly Float64Array[],
  grid: PixelGrid,
  images: readonly Float64Array[],
  u: Float64Array,
  v: Float64Array,
): void {
  requireLengths(grid, images, [...outRe, ...outIm, v], u.length);
  if (!(outRe.length === images.length && outIm.length === images.length)) {
    throw new RangeError(`${images.length} images, ${outRe.length} and ${outIm.length} outputs`);
  }
  const folded = images.map((pixels) => foldInX(pixels, grid.nx, grid.ny));
  const phases = makePhases(grid);
  const sum = new Float64Array(2);
  for (let k = 0; k < u.length; k++) {
    fillPhases(phases, grid, u[k] as number, v[k] as number);
    for (let m = 0; m < images.length; m++) {
      sumFolded(sum, folded[m] as Folded, phases, grid.ny);
      (outRe[m] as Float64Array)[k] = sum[0] as number;
      (outIm[m] as Float64Array)[k] = sum[1] as number;
    }
  }
}

/** The adjoint of visibilitiesOf: pixels[j] = sum_k Re(conj(kernel_kj) (re_k + i im_k)), so that
 *  sum_k (Re V_k re_k + Im V_k im_k) = sum_j I_j pixels_j for every image I. It is the gradient of a sum over
 *  visibilities by the pixels, and with re, im from data the dirty image times the number of points.
 *  @param outPixels  written; length nx*ny
 *  @param u, v, re, im  one value per point
 *  @throws RangeError on a length mismatch. Cost: as visibilitiesOf, without its folding. */
export function adjointOfVisibilities(
  outPixels: Float64Array,
  grid: PixelGrid,
  u: Float64Array,
  v: Float64Array,
  re: Float64Array,
  im: Float64Array,
): void {
  requireLengths(grid, [outPixels], [v, re, im], u.length);
  const { nx, ny } = grid;
  const phases = makePhases(grid);
  const { cosX, sinX, cosY, sinY } = phases;
  outPixels.fill(0);
  for (let k = 0; k < u.length; k++) {
    fillPhases(phases, grid, u[k] as number, v[k] as number);
    const a = re[k] as number;
    const b = im[k] as number;
    for (let j = 0; j < ny; j++) {
      const c = cosY[j] as number;
      const s = sinY[j] as number;
      const rowRe = a * c - b * s;
      const rowIm = a * s + b * c;
      for (let i = 0; i < nx; i++) {
        const at = j * nx + i;
        outPixels[at] = (outPixels[at] as number) + rowRe * (cosX[i] as number) - rowIm * (sinX[i] as number);
      }
    }
  }
}

interface Folded {
  /** I(x) + I(-x) and I(x) - I(-x) for the half of the columns with x > 0, and the column x = 0 of an odd count in
   *  `even`, halved in neither. Row after row, `half` values each. */
  readonly half: number;
  readonly even: Float64Array;
  readonly odd: Float64Array;
}

function foldInX(pixels: Float64Array, nx: number, ny: number): Folded {
  const half = (nx + 1) >> 1;
  const even = new Float64Array(half * ny);
  const odd = new Float64Array(half * ny);
  for (let j = 0; j < ny; j++) {
    for (let i = 0; i < half; i++) {
      const east = pixels[j * nx + i] as number;
      const mirror = nx - 1 - i;
      const west = mirror === i ? 0 : (pixels[j * nx + mirror] as number);
      even[j * half + i] = east + west;
      odd[j * half + i] = east - west;
    }
  }
  return { half, even, odd };
}

interface Phases {
  /** cos and sin of 2 pi u x_i, and of 2 pi v y_j. */
  readonly cosX: Float64Array;
  readonly sinX: Float64Array;
  readonly cosY: Float64Array;
  readonly sinY: Float64Array;
}

function makePhases({ nx, ny }: PixelGrid): Phases {
  return {
    cosX: new Float64Array(nx),
    sinX: new Float64Array(nx),
    cosY: new Float64Array(ny),
    sinY: new Float64Array(ny),
  };
}

function fillPhases(phases: Phases, { nx, ny, pixelRadians }: PixelGrid, u: number, v: number): void {
  // Column 0 is the easternmost: x falls with i, y rises with j.
  fillAxis(phases.cosX, phases.sinX, nx, -2 * Math.PI * u * pixelRadians);
  fillAxis(phases.cosY, phases.sinY, ny, 2 * Math.PI * v * pixelRadians);
}

/** cos and sin of (i - (n-1)/2)*step; each pair of mirrored pixels is computed once, so both have the same bits. */
function fillAxis(cosines: Float64Array, sines: Float64Array, n: number, step: number): void {
  const centre = (n - 1) / 2;
  for (let i = 0; i <= centre; i++) {
    const phase = (i - centre) * step;
    const c = cos(phase);
    const s = sin(phase);
    cosines[i] = c;
    sines[i] = s;
    cosines[n - 1 - i] = c;
    sines[n - 1 - i] = i === centre ? s : -s;
  }
}

function sumFolded(sum: Float64Array, folded: Folded, phases: Phases, ny: number): void {
  const { half, even, odd } = folded;
  const { cosX, sinX, cosY, sinY } = phases;
  let re = 0;
  let im = 0;
  for (let j = 0; j < ny; j++) {
    const row = j * half;
    let a = 0;
    let b = 0;
    for (let i = 0; i < half; i++) {
      a += (even[row + i] as number) * (cosX[i] as number);
      b -= (odd[row + i] as number) * (sinX[i] as number);
    }
    const c = cosY[j] as number;
    const s = sinY[j] as number;
    re += a * c + b * s;
    im += b * c - a * s;
  }
  sum[0] = re;
  sum[1] = im;
}

function requireLengths(
  { nx, ny }: PixelGrid,
  images: readonly Float64Array[],
  points: readonly Float64Array[],
  count: number,
): void {
  const image = images.find((pixels) => pixels.length !== nx * ny);
  if (image) throw new RangeError(`an image of ${image.length} pixels on a grid of ${nx} by ${ny}`);
  const list = points.find((values) => values.length !== count);
  if (list) throw new RangeError(`${list.length} values for ${count} points of the Fourier plane`);
}
