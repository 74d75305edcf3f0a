/** Convolution of an image with a circular Gaussian, as sums over rows and columns. Flux that leaves the field is
 *  lost. */

import type { SkyImage } from '../data.ts';
import { exp } from '../numerics/elementary.ts';

/** Standard deviations to which the kernel reaches; beyond lie 2e-9 of it. */
const REACH = 6;

/** The image convolved with a Gaussian of a FWHM in radians, the image itself when that is 0. The kernel is sampled at
 *  the pixels and sums to 1: good to 1e-6 from a FWHM of 2 pixels on. */
export function convolved(image: SkyImage, fwhm: number): SkyImage {
  if (!(fwhm > 0)) return image;
  const { nx, ny, pixelRadians } = image;
  const kernel = makeKernel(fwhm / pixelRadians / Math.sqrt(8 * Math.LN2));
  const rows = alongAxis(image.pixels, kernel, ny, nx, nx, 1);
  return { nx, ny, pixelRadians, pixels: alongAxis(rows, kernel, nx, ny, 1, nx) };
}

/** One half of the kernel, kernel[0] its middle; standard deviation in pixels. */
function makeKernel(sigma: number): Float64Array {
  const half = Float64Array.from({ length: Math.ceil(REACH * sigma) + 1 }, (_, d) =>
    exp((-d * d) / (2 * sigma * sigma)),
  );
  let sum = half[0];
  for (let d = 1; d < half.length; d++) sum += 2 * half[d];
  return half.map((value) => value / sum);
}

/** Convolves `lines` lines of `length` values; lineStep and step are the distances from line to line and along one. */
function alongAxis(
  pixels: Float64Array,
  kernel: Float64Array,
  lines: number,
  length: number,
  lineStep: number,
  step: number,
): Float64Array {
  const out = new Float64Array(pixels.length);
  for (let line = 0; line < lines; line++) {
    const start = line * lineStep;
    for (let i = 0; i < length; i++) {
      let sum = kernel[0] * pixels[start + i * step];
      for (let d = 1; d < kernel.length; d++) {
        if (i - d >= 0) sum += kernel[d] * pixels[start + (i - d) * step];
        if (i + d < length) sum += kernel[d] * pixels[start + (i + d) * step];
      }
      out[start + i * step] = sum;
    }
  }
  return out;
}
