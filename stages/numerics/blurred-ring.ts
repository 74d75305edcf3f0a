/** A thin ring blurred by a circular Gaussian: what its ridge and width say about the ring before blurring.
 *
 *  Radial brightness of a ring of radius r0 blurred with standard deviation s, up to a factor:
 *    I(r) = exp(-(r - r0)^2 / 2 s^2) e^{-z} I0(z),   z = r r0 / s^2
 *  The ridge lies inside r0; to second order its diameter is smaller than d by w^2/(4 ln2 d), w the FWHM of the blur.
 *  The relation is free of scale, so one number, width over ridge diameter, gives blur over diameter. */

import { exp } from './elementary.ts';
import { signChange } from './sign-change.ts';

/** FWHM of a Gaussian in standard deviations, 2 sqrt(2 ln 2). */
export const FWHM_PER_SIGMA = 2.354820045030949;
const LN2 = Math.LN2;
/** Above this argument the asymptotic series of the Bessel functions is exact to 1e-15; below, the power series. */
const ASYMPTOTIC_FROM = 40;
const MOST_TERMS = 200;
/** A division takes as long as several multiplications. */
const RECIPROCALS = Float64Array.from({ length: MOST_TERMS + 1 }, (_, k) => 1 / k);
/** Width over ridge diameter at which the inner half-maximum is about to vanish: no inversion beyond. */
const LARGEST_RATIO = 0.66;
/** Below this ratio the second-order form errs by less than 1e-4 of the correction. */
const SMALLEST_RATIO = 0.02;
/** Of a bracket. */
const TOLERANCE = 1e-13;

/** Returns e^{-z} I0(z) and e^{-z} I1(z) for z >= 0 (Abramowitz and Stegun 9.6.10, 9.7.1). */
export function scaledBesselI(z: number): [number, number] {
  return z < ASYMPTOTIC_FROM ? powerSeries(z) : [asymptotic(z, 0), asymptotic(z, 4)];
}

function powerSeries(z: number): [number, number] {
  const quarter = (z * z) / 4;
  let term = 1;
  let i0 = 1;
  let i1 = 1;
  for (let k = 1; k < MOST_TERMS; k++) {
    term *= quarter * RECIPROCALS[k] * RECIPROCALS[k];
    i0 += term;
    i1 += term * RECIPROCALS[k + 1];
    if (term < 1e-17 * i0) break;
  }
  const scale = exp(-z);
  return [i0 * scale, (z / 2) * i1 * scale];
}

/** @param mu 4 n^2 of the order n */
function asymptotic(z: number, mu: number): number {
  let term = 1;
  let sum = 1;
  for (let k = 1; k < 30; k++) {
    const odd = 2 * k - 1;
    term *= -(mu - odd * odd) / (k * 8 * z);
    sum += term;
    if (Math.abs(term) < 1e-17) break;
  }
  return sum / Math.sqrt(2 * Math.PI * z);
}

export interface BlurredRing {
  readonly ridgeRadius: number;
  /** Full width at half maximum along a ray; null when the centre is above half of the ridge. */
  readonly width: number | null;
}

/** Returns ridge radius and radial width of a ring of radius `radius` blurred with FWHM `blur`, in their unit. */
export function blurredRing(radius: number, blur: number): BlurredRing {
  const s = blur / FWHM_PER_SIGMA;
  const brightness = (r: number) => {
    const [i0] = scaledBesselI((r * radius) / (s * s));
    return exp(-((r - radius) * (r - radius)) / (2 * s * s)) * i0;
  };
  // The ridge solves r = r0 I1(z)/I0(z); the function below falls through zero there.
  const slope = (r: number) => {
    const [i0, i1] = scaledBesselI((r * radius) / (s * s));
    return (radius * i1) / i0 - r;
  };
  const ridgeRadius = radius * radius > 2 * s * s ? signChange(slope, radius * 1e-6, radius, TOLERANCE) : 0;
  const half = brightness(ridgeRadius) / 2;
  if (brightness(0) >= half) return { ridgeRadius, width: null };
  const inner = signChange((r) => half - brightness(r), 0, ridgeRadius, TOLERANCE);
  const outer = signChange((r) => brightness(r) - half, ridgeRadius, radius + 4 * s, TOLERANCE);
  return { ridgeRadius, width: outer - inner };
}

/** Returns the diameter of the thin ring whose blurred image has this ridge diameter and radial width (same unit),
 *  on the assumption that the whole width is Gaussian blur; null where ridge and width belong to no such ring. */
export function thinRingDiameter(ridgeDiameter: number, width: number): number | null {
  const ratio = width / ridgeDiameter;
  if (!(ratio >= 0 && ratio <= LARGEST_RATIO)) return null;
  if (ratio < SMALLEST_RATIO) return ridgeDiameter + (width * width) / (4 * LN2 * ridgeDiameter);
  const excess = (blur: number) => {
    const seen = blurredRing(0.5, blur);
    return seen.width === null ? -1 : ratio - seen.width / (2 * seen.ridgeRadius);
  };
  const blur = signChange(excess, ratio / 4, ratio, TOLERANCE);
  const seen = blurredRing(0.5, blur);
  return seen.width === null ? null : ridgeDiameter / (2 * seen.ridgeRadius);
}
