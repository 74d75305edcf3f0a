/** Student's t of a whole number of degrees of freedom. With t = sqrt(nu) tan(theta), P(|T| <= t) is a finite sum of powers
 *  of cos(theta): Abramowitz and Stegun, 26.7.3 (odd) and 26.7.4 (even). */

import { cos, sin, tan } from './elementary.ts';

/** Halvings of the angle's range, to the last digit of a double. */
const HALVINGS = 60;

/** Returns t with P(T <= t) = p. Cost: sixty sums of nu / 2 terms.
 *  @throws RangeError for p outside (0, 1) or degrees of freedom that are no whole number above 0 */
export function studentQuantile(p: number, degreesOfFreedom: number): number {
  if (!(p > 0 && p < 1 && degreesOfFreedom >= 1 && Number.isInteger(degreesOfFreedom))) {
    throw new RangeError(
      `studentQuantile: p = ${p} of ${degreesOfFreedom} degrees of freedom; needs p in (0, 1) and a whole number above 0`,
    );
  }
  const inside = Math.abs(2 * p - 1);
  let [low, high] = [0, Math.PI / 2];
  for (let k = 0; k < HALVINGS; k++) {
    const middle = (low + high) / 2;
    if (within(middle, degreesOfFreedom) < inside) low = middle;
    else high = middle;
  }
  return Math.sign(p - 0.5) * Math.sqrt(degreesOfFreedom) * tan(low);
}

/** P(|T| <= sqrt(nu) tan(theta)). */
function within(theta: number, nu: number): number {
  const [s, c] = [sin(theta), cos(theta)];
  const isOdd = nu % 2 === 1;
  let term = isOdd ? c : 1;
  let sum = 0;
  for (let k = isOdd ? 1 : 0; k <= nu - 2; k += 2) {
    sum += term;
    term *= (c * c * (k + 1)) / (k + 2);
  }
  return isOdd ? (2 / Math.PI) * (theta + s * sum) : s * sum;
}
