/** Baselines as the source sees them: (u, v, w) by rotation of the Earth.
 *  Thompson, Moran & Swenson, 3rd ed., eq. 4.1:
 *    u =        sin H · X +        cos H · Y
 *    v = −sin δ cos H · X + sin δ sin H · Y + cos δ · Z
 *    w =  cos δ cos H · X − cos δ sin H · Y + sin δ · Z
 *  X towards hour angle 0 on the equator, Y towards hour angle −6 h, Z to the pole. With ITRF coordinates H is the
 *  hour angle at Greenwich: sidereal time of Greenwich less right ascension. */

import { cos, sin } from './elementary.ts';

export type Triple = readonly [number, number, number];

/** The rotation for one hour angle (at Greenwich) and declination, radians: a function from a vector in ITRF to
 *  (u, v, w) in the unit of the vector, u to the east, v to the north, w to the source. */
export function uvwRotation(
  hourAngle: number,
  declination: number,
): (xyz: Triple) => [number, number, number] {
  const sinH = sin(hourAngle);
  const cosH = cos(hourAngle);
  const sinD = sin(declination);
  const cosD = cos(declination);
  return ([x, y, z]) => [
    sinH * x + cosH * y,
    -sinD * cosH * x + sinD * sinH * y + cosD * z,
    cosD * cosH * x - cosD * sinH * y + sinD * z,
  ];
}
