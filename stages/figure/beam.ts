/** The beam: the elliptical Gaussian that has the curvature of the dirty beam at its peak, all visibilities weighted
 *  alike. With M the second moments of (u, v),
 *    B(x) = mean cos 2π(u·x) = 1 − 2π² xᵀ M x + …   and   exp(−4 ln 2 x²/θ²) = 1 − 4 ln 2 x²/θ² + …,
 *  so along an eigenvector of M with eigenvalue m the FWHM is θ = sqrt(2 ln 2 / m) / π. */

import { atan2, ln } from '../numerics/elementary.ts';

export interface Beam {
  /** FWHM, radians. */
  readonly major: number;
  readonly minor: number;
  /** Of the major axis, north through east, degrees in [0, 180). */
  readonly positionAngleDegrees: number;
}

/** Returns the beam of a set of (u, v) points, wavelengths; null when they lie on a line or there are none. */
export function beamOf(u: Float64Array, v: Float64Array): Beam | null {
  let [uu, uv, vv] = [0, 0, 0];
  for (let k = 0; k < u.length; k++) {
    uu += u[k] * u[k];
    uv += u[k] * v[k];
    vv += v[k] * v[k];
  }
  const n = u.length;
  const middle = (uu + vv) / (2 * n);
  const half = (uu - vv) / (2 * n);
  const spread = Math.sqrt(half * half + (uv / n) * (uv / n));
  if (!(middle - spread > 1e-9 * middle)) return null;
  const fwhm = (m: number) => Math.sqrt((2 * ln(2)) / m) / Math.PI;
  // The (u, v) points reach furthest along the angle t from the u axis; the beam is longest across it.
  const t = atan2(2 * uv, uu - vv) / 2;
  const degrees = (-t * 180) / Math.PI; // direction (−sin t, cos t): east −sin t, north cos t
  return {
    major: fwhm(middle - spread),
    minor: fwhm(middle + spread),
    positionAngleDegrees: ((degrees % 180) + 180) % 180,
  };
}
