/** Places on the Earth (WGS84) and the elevation of a source above them.
 *  Geodetic to geocentric: IOGP Guidance Note 7-2, section 4.1.1 (operation method EPSG 9602). */

import { asin, atan2, cos, sin } from './elementary.ts';

const A = 6378137;
const FLATTENING = 1 / 298.257223563;
const E2 = FLATTENING * (2 - FLATTENING);

export interface Geodetic {
  /** Radians, east positive. */
  readonly longitude: number;
  /** Radians, north positive. */
  readonly latitude: number;
  /** Metres above the ellipsoid. */
  readonly height: number;
}

/** Geocentric position, metres: X to longitude 0, Y to longitude 90° east, Z to the north pole. */
export function geocentric(place: Geodetic): [number, number, number] {
  const sinLatitude = sin(place.latitude);
  const N = A / Math.sqrt(1 - E2 * sinLatitude * sinLatitude);
  const fromAxis = (N + place.height) * cos(place.latitude);
  return [
    fromAxis * cos(place.longitude),
    fromAxis * sin(place.longitude),
    (N * (1 - E2) + place.height) * sinLatitude,
  ];
}

/** Geodetic place of a geocentric position in metres, by fixed-point iteration on tan(latitude): the error shrinks
 *  by E2 or better at each step, so 12 steps reach rounding from the ground to any orbit; not for the Earth's core. */
export function geodetic(xyz: readonly [number, number, number]): Geodetic {
  const [x, y, z] = xyz;
  const fromAxis = Math.sqrt(x * x + y * y);
  let latitude = atan2(z, fromAxis * (1 - E2));
  for (let step = 0; step < 12; step++) {
    const sinLatitude = sin(latitude);
    const N = A / Math.sqrt(1 - E2 * sinLatitude * sinLatitude);
    latitude = atan2(z + E2 * N * sinLatitude, fromAxis);
  }
  const sinLatitude = sin(latitude);
  const curvature = Math.sqrt(1 - E2 * sinLatitude * sinLatitude);
  // Free of the division by cos or sin that fails at the poles or the equator.
  const height = fromAxis * cos(latitude) + z * sinLatitude - A * curvature;
  return { longitude: atan2(y, x), latitude, height };
}

/** Elevation of a source, radians: sin h = sin φ sin δ + cos φ cos δ cos H (Meeus, Astronomical Algorithms, 2nd ed.,
 *  eq. 13.6). @param hourAngle local, radians. */
export function elevation(latitude: number, declination: number, hourAngle: number): number {
  const sine = sin(latitude) * sin(declination) + cos(latitude) * cos(declination) * cos(hourAngle);
  return asin(Math.max(-1, Math.min(1, sine)));
}
