/** Angular gravitational radius and mass: theta_g = G M / (c^2 D).
 *  Nominal G M of the Sun: IAU 2015 resolution B3; parsec: IAU 2015 resolution B2. */

const GM_SUN = 1.3271244e20;
const SPEED_OF_LIGHT = 299792458;
const PARSEC = 3.085677581491367e16;

/** Returns the mass, in suns, whose gravitational radius is seen under an angle (radians) at a distance (pc). */
export function massInSuns(angleRadians: number, distanceParsec: number): number {
  return (angleRadians * distanceParsec * PARSEC * SPEED_OF_LIGHT * SPEED_OF_LIGHT) / GM_SUN;
}
