/** Measures the ring in an image: ridge, width, first Fourier mode, centre; and says whether there is a ring.
 *
 *  Rays run from the centre at position angle chi (north through east): x = r sin chi, y = r cos chi. The ridge is
 *  where the brightness along a ray is largest. Definitions, with means over equally spaced position angles:
 *    centre              where the ridge radii have no first Fourier mode; there their scatter is stationary
 *    diameter            2 mean(ridge radius)
 *    width               mean FWHM along rays, over the background, of the rays that have both half-maxima
 *    asymmetry           |sum I e^{i chi}| / sum I, I the brightness on the ridge; position angle: its argument
 *    central depression  mean brightness within a quarter of the ridge radius over the mean brightness on the ridge:
 *                        0 is black, 1 no depression
 *    roundness           (1-e)/(1+e), e the second Fourier mode of the ridge radii over their mean: for a slightly
 *                        elliptical ridge its short axis over its long one
 *  Pixel order and axes: CONVENTIONS (x index rises to the west). Lengths are radians in and out. */

import { thinRingDiameter } from './blurred-ring.ts';
import { atan2 } from './elementary.ts';
import {
  average,
  brightnessCentroid,
  correlate,
  findCentre,
  makeRays,
  RAY_STEP,
  type Rays,
  type Ridge,
  ray,
  reachFrom,
} from './ridge.ts';
import { signChange } from './sign-change.ts';
import { makeSplineImage, type SplineImage } from './spline-image.ts';

export interface RingImage {
  readonly nx: number;
  readonly ny: number;
  readonly pixelRadians: number;
  /** length nx*ny, x fastest. */
  readonly pixels: Float64Array;
}

export interface RingOptions {
  /** Number of rays. Default 120. */
  readonly angles?: number;
  /** Radius of the disc called centre, in ridge radii. Default 0.25. */
  readonly centreFraction?: number;
}

export interface RingMeasurement {
  /** False when one of the conditions fails; `reasons` says which, in sentences. */
  readonly ring: boolean;
  readonly reasons: readonly string[];
  /** Offsets of the centre from the image's origin, radians. */
  readonly centreEast: number;
  readonly centreNorth: number;
  readonly diameter: number;
  /** Null when no ray has both half-maxima. */
  readonly width: number | null;
  readonly asymmetry: number;
  /** Degrees in [0, 360), north through east. */
  readonly positionAngleDegrees: number;
  readonly centralDepression: number;
  readonly roundness: number;
  /** Diameter of a thin ring that, blurred by a Gaussian, has this ridge and width; null where none has. */
  readonly thinRingDiameter: number | null;
  /** Standard deviation of the ridge radii over their mean. */
  readonly radiusScatter: number;
  /** Fractions of rays without half-maximum on the inner and on the outer side. */
  readonly missingInner: number;
  readonly missingOuter: number;
  /** Median brightness where the rays end, at least 0; half-maxima are taken above it. */
  readonly background: number;
}

/** Limits of what is called a ring, from measurements on discs, Gaussians, doubles and rings (common practice):
 *  both half-maxima at most position angles, little scatter of the radius, a dark centre. */
export const RING_LIMITS = { missing: 0.5, radiusScatter: 0.1, centralDepression: 0.3 } as const;

const DEFAULT_ANGLES = 120;
const DEFAULT_CENTRE_FRACTION = 0.25;
/** Of half a pixel, to which half-maxima are found. */
const LEVEL_TOLERANCE = 1e-8;

/** Returns the measures of the ring in an image, whether or not it is one. Cost about 20 ray fans; 1 to 2 ms for
 *  64 by 64 pixels. @throws RangeError on a wrong shape, a pixel that is not finite, or an image without brightness. */
export function measureRing(image: RingImage, options: RingOptions = {}): RingMeasurement {
  requireImage(image);
  const rays = makeRays(options.angles ?? DEFAULT_ANGLES);
  const spline = makeSplineImage(image.pixels, image.nx, image.ny);
  const centre = findCentre(spline, brightnessCentroid(image.nx, image.ny, image.pixels), rays);
  const [column, row, ridge] = [centre.column, centre.row, centre.ridge];
  const reach = reachFrom(spline, column, row);
  const background = edgeBackground(spline, column, row, reach, rays);
  const halves = halfWidths(spline, column, row, reach, ridge, background, rays);
  const mode = fourierMode(ridge.brightness, rays);
  const centreRadius = (options.centreFraction ?? DEFAULT_CENTRE_FRACTION) * ridge.mean;
  const pixel = image.pixelRadians;
  const diameter = 2 * ridge.mean * pixel;
  const width = halves.width === null ? null : halves.width * pixel;
  const measured = {
    centreEast: ((image.nx - 1) / 2 - column) * pixel,
    centreNorth: (row - (image.ny - 1) / 2) * pixel,
    diameter,
    width,
    asymmetry: mode.amplitude,
    positionAngleDegrees: mode.positionAngleDegrees,
    centralDepression: centralBrightness(spline, column, row, centreRadius, rays) / average(ridge.brightness),
    roundness: roundness(ridge, rays),
    thinRingDiameter: width === null ? null : thinRingDiameter(diameter, width),
    radiusScatter: ridge.mean > 0 ? ridge.scatter / ridge.mean : 1,
    missingInner: halves.missingInner,
    missingOuter: halves.missingOuter,
    background,
  };
  const reasons = whyNoRing(measured);
  return { ring: reasons.length === 0, reasons, ...measured };
}

function requireImage({ nx, ny, pixels, pixelRadians }: RingImage): void {
  if (!(nx >= 8 && ny >= 8 && pixels.length === nx * ny && pixelRadians > 0)) {
    throw new RangeError(
      `measureRing: ${pixels.length} pixels of ${pixelRadians} rad do not make an image of ${nx} by ${ny}, at least 8 by 8`,
    );
  }
  let total = 0;
  for (const value of pixels) {
    if (!Number.isFinite(value)) throw new RangeError('measureRing: a pixel is not a finite number');
    if (value > 0) total += value;
  }
  if (!(total > 0)) throw new RangeError('measureRing: no pixel is brighter than zero');
}

function edgeBackground(spline: SplineImage, column: number, row: number, reach: number, rays: Rays): number {
  const values = Float64Array.from(rays.sines, (_, k) => ray(spline, column, row, rays, k)(reach)).sort();
  const n = values.length;
  return Math.max(0, (values[(n - 1) >> 1] + values[n >> 1]) / 2);
}

function halfWidths(
  spline: SplineImage,
  column: number,
  row: number,
  reach: number,
  ridge: Ridge,
  background: number,
  rays: Rays,
) {
  const count = ridge.radii.length;
  let sum = 0;
  let both = 0;
  let noInner = 0;
  let noOuter = 0;
  for (let k = 0; k < count; k++) {
    const along = ray(spline, column, row, rays, k);
    const peak = ridge.radii[k];
    const half = background + (ridge.brightness[k] - background) / 2;
    const inner = crossing(along, half, peak, -RAY_STEP, 0);
    const outer = crossing(along, half, peak, RAY_STEP, reach);
    if (inner === null) noInner++;
    if (outer === null) noOuter++;
    if (inner !== null && outer !== null) {
      sum += outer - inner;
      both++;
    }
  }
  return {
    width: both > 0 ? sum / both : null,
    missingInner: noInner / count,
    missingOuter: noOuter / count,
  };
}

/** First radius from `from` on, in steps towards `end`, where the brightness falls below a level; null if none. */
function crossing(
  along: (radius: number) => number,
  level: number,
  from: number,
  step: number,
  end: number,
): number | null {
  let above = from;
  while (above !== end) {
    const next = step > 0 ? Math.min(end, above + step) : Math.max(end, above + step);
    if (along(next) < level) {
      const [start, length] = [above, next - above];
      return (
        start + length * signChange((part) => along(start + length * part) - level, 0, 1, LEVEL_TOLERANCE)
      );
    }
    above = next;
  }
  return null;
}

/** Mean brightness within a radius: midpoint rule with equal areas, eight circles. */
function centralBrightness(
  spline: SplineImage,
  column: number,
  row: number,
  radius: number,
  rays: Rays,
): number {
  const circles = 8;
  let sum = 0;
  for (let c = 0; c < circles; c++) {
    const r = radius * Math.sqrt((c + 0.5) / circles);
    for (let k = 0; k < rays.sines.length; k++) sum += ray(spline, column, row, rays, k)(r);
  }
  return sum / (circles * rays.sines.length);
}

function fourierMode(brightness: Float64Array, rays: Rays) {
  const mean = average(brightness);
  const east = correlate(brightness, rays.sines) / mean;
  const north = correlate(brightness, rays.cosines) / mean;
  const degrees = (atan2(east, north) * 180) / Math.PI;
  return {
    amplitude: Math.sqrt(east * east + north * north),
    positionAngleDegrees: degrees < 0 ? degrees + 360 : degrees,
  };
}

function roundness(ridge: Ridge, { sines, cosines }: Rays): number {
  if (!(ridge.mean > 0)) return 1;
  let even = 0;
  let odd = 0;
  for (let k = 0; k < sines.length; k++) {
    const s = sines[k];
    const c = cosines[k];
    even += ridge.radii[k] * (c * c - s * s);
    odd += ridge.radii[k] * 2 * s * c;
  }
  const e = (2 * Math.sqrt(even * even + odd * odd)) / (sines.length * ridge.mean);
  return Math.max(0, (1 - e) / (1 + e));
}

function whyNoRing(measured: Omit<RingMeasurement, 'ring' | 'reasons'>): string[] {
  const reasons: string[] = [];
  const percent = (fraction: number) => `${(100 * fraction).toFixed(0)} %`;
  if (!(measured.missingInner < RING_LIMITS.missing)) {
    reasons.push(`no inner half-maximum on ${percent(measured.missingInner)} of the rays`);
  }
  if (!(measured.missingOuter < RING_LIMITS.missing)) {
    reasons.push(`no outer half-maximum on ${percent(measured.missingOuter)} of the rays`);
  }
  if (!(measured.radiusScatter < RING_LIMITS.radiusScatter)) {
    reasons.push(`the ridge radius scatters by ${percent(measured.radiusScatter)}`);
  }
  if (!(measured.centralDepression < RING_LIMITS.centralDepression)) {
    reasons.push(`the centre has ${percent(measured.centralDepression)} of the ridge's brightness`);
  }
  return reasons;
}
