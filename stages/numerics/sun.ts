/** Where the Sun stands, to 0.01 degrees: Meeus, Astronomical Algorithms, 2nd ed., chapter 25 (low accuracy). Time is
 *  taken as UTC in place of dynamical time: a minute of it moves the Sun by 0.0007 degrees. */

import { asin, atan2, cos, sin } from './elementary.ts';

const DEGREE = Math.PI / 180;
const J2000_MJD = 51544.5;

export interface Direction {
  /** Radians, right ascension in [0, 2π), of date. */
  readonly ra: number;
  readonly dec: number;
}

/** Apparent place of the Sun. */
export function sunAt(mjd: number): Direction {
  const T = (mjd - J2000_MJD) / 36525;
  const L0 = 280.46646 + (36000.76983 + 0.0003032 * T) * T;
  const M = (357.52911 + (35999.05029 - 0.0001537 * T) * T) * DEGREE;
  const C =
    (1.914602 - (0.004817 + 0.000014 * T) * T) * sin(M) +
    (0.019993 - 0.000101 * T) * sin(2 * M) +
    0.000289 * sin(3 * M);
  const omega = (125.04 - 1934.136 * T) * DEGREE;
  const lambda = (L0 + C - 0.00569 - 0.00478 * sin(omega)) * DEGREE;
  const obliquity =
    (23.4392911 - (0.0130042 + (1.64e-7 - 5.036e-7 * T) * T) * T + 0.00256 * cos(omega)) * DEGREE;
  const ra = atan2(cos(obliquity) * sin(lambda), cos(lambda));
  return { ra: ra < 0 ? ra + 2 * Math.PI : ra, dec: asin(sin(obliquity) * sin(lambda)) };
}

/** The angle between two directions, radians (half-angle form, good near 0 and π). */
export function separation(a: Direction, b: Direction): number {
  const [dd, dr] = [sin((a.dec - b.dec) / 2), sin((a.ra - b.ra) / 2)];
  const h = dd * dd + cos(a.dec) * cos(b.dec) * dr * dr;
  return 2 * asin(Math.min(1, Math.sqrt(h)));
}
