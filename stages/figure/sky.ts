/** What the drawings of the sky share: units, the image of one draw, brightness, blurring, azimuthal averages. */

import type { Posterior, SkyImage } from '../data.ts';
import { cos, exp, ln, sin } from '../numerics/elementary.ts';
import { makeSplineImage, splineValue } from '../numerics/spline-image.ts';

/** Radians per microarcsecond. */
export const MICROARCSEC = Math.PI / 180 / 3600 / 1e6;

/** A place on the sky: offset from the image's origin, radians. */
export interface Place {
  readonly east: number;
  readonly north: number;
}

/** Returns the angle in the unit that suits its size, and the unit's name and size in radians. */
export function angleUnit(radians: number): { readonly name: string; readonly radians: number } {
  const units = [
    { name: '″', radians: MICROARCSEC * 1e6 },
    { name: 'mas', radians: MICROARCSEC * 1e3 },
    { name: 'µas', radians: MICROARCSEC },
  ];
  return units.find((unit) => radians >= 2 * unit.radians) ?? units[2];
}

/** Returns numbers of `wanted` draws, evenly spaced over all. */
export function evenDraws(posterior: Posterior, wanted: number): number[] {
  const count = Math.min(wanted, posterior.count);
  return Array.from({ length: count }, (_, k) => Math.floor((k * posterior.count) / count));
}

/** Returns the image convolved with a circular Gaussian of a given FWHM in radians; brightness beyond the edge is
 *  nothing. Separable direct sums out to five standard deviations: cost O(pixels width). */
export function blurred(image: SkyImage, fwhmRadians: number): SkyImage {
  const { nx, ny, pixelRadians } = image;
  const sigma = fwhmRadians / pixelRadians / Math.sqrt(8 * ln(2));
  const reach = Math.ceil(5 * sigma);
  const kernel = Float64Array.from({ length: 2 * reach + 1 }, (_, k) => {
    const s = (k - reach) / sigma;
    return exp(-0.5 * s * s);
  });
  let sum = 0;
  for (const weight of kernel) sum += weight;
  for (let k = 0; k < kernel.length; k++) kernel[k] /= sum;
  const wide = convolveLines(image.pixels, kernel, reach, nx, ny, 1, nx);
  return { nx, ny, pixelRadians, pixels: convolveLines(wide, kernel, reach, ny, nx, nx, 1) };
}

function convolveLines(
  pixels: Float64Array,
  kernel: Float64Array,
  reach: number,
  length: number,
  lines: number,
  step: number,
  lineStep: number,
): Float64Array {
  const out = new Float64Array(pixels.length);
  for (let line = 0; line < lines; line++) {
    for (let i = 0; i < length; i++) {
      let sum = 0;
      const last = Math.min(length - 1, i + reach);
      for (let j = Math.max(0, i - reach); j <= last; j++) {
        sum += kernel[j - i + reach] * pixels[line * lineStep + j * step];
      }
      out[line * lineStep + i * step] = sum;
    }
  }
  return out;
}

/** Returns the centroid of the positive brightness; the origin for an image without any. */
export function centroid({ nx, ny, pixelRadians, pixels }: SkyImage): Place {
  let [sum, east, north] = [0, 0, 0];
  for (let j = 0; j < ny; j++) {
    for (let i = 0; i < nx; i++) {
      const value = Math.max(0, pixels[j * nx + i]);
      sum += value;
      east += value * ((nx - 1) / 2 - i) * pixelRadians;
      north += value * (j - (ny - 1) / 2) * pixelRadians;
    }
  }
  return sum > 0 ? { east: east / sum, north: north / sum } : { east: 0, north: 0 };
}

/** Returns the mean over position angle at each radius about a place, by spline interpolation at 120 angles. Linear in
 *  the image, so the profile of a draw is the same combination of profiles as its image. Units of the image.
 *  @param radii  radians; every circle must lie inside the image */
export function radialProfile(image: SkyImage, centre: Place, radii: Float64Array): Float64Array {
  const angles = 120;
  const spline = makeSplineImage(image.pixels, image.nx, image.ny);
  const column = (image.nx - 1) / 2 - centre.east / image.pixelRadians;
  const row = (image.ny - 1) / 2 + centre.north / image.pixelRadians;
  const sines = Array.from({ length: angles }, (_, k) => sin((2 * Math.PI * k) / angles));
  const cosines = Array.from({ length: angles }, (_, k) => cos((2 * Math.PI * k) / angles));
  return radii.map((radius) => {
    const r = radius / image.pixelRadians;
    let sum = 0;
    for (let k = 0; k < angles; k++) sum += splineValue(spline, column - r * sines[k], row + r * cosines[k]);
    return sum / angles;
  });
}

/** Returns the radii from 0 to the nearest edge of the image from a place, in steps of a quarter of a pixel, radians. */
export function profileRadii(image: SkyImage, centre: Place, most: number): Float64Array {
  const halfWidth = ((image.nx - 1) / 2) * image.pixelRadians - Math.abs(centre.east);
  const halfHeight = ((image.ny - 1) / 2) * image.pixelRadians - Math.abs(centre.north);
  const reach = Math.min(halfWidth, halfHeight, most);
  const step = image.pixelRadians / 4;
  return Float64Array.from({ length: Math.max(2, Math.floor(reach / step) + 1) }, (_, k) => k * step);
}
