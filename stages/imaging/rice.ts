/** Mean of an amplitude under noise: for Z = |nu + n| with unit standard deviation of each part of n (Rice 1944, Bell
 *  Syst. Tech. J. 23, 282; Thompson, Moran and Swenson, 3rd ed., section 9.3),
 *    E[Z]     = sqrt(pi/2) e^-y ((1 + 2y) I0(y) + 2y I1(y)),   y = nu^2/4
 *    dE/d nu  = sqrt(pi/2) (nu/2) e^-y (I0(y) + I1(y))
 *    d2E/dnu2 = E - (nu + 1/nu) dE/dnu,   so that d(nu dE/dnu)/d ln nu = nu^2 (E - nu dE/dnu)
 *  (the last from Kummer's equation: Abramowitz and Stegun 13.1.1). With it amplitudes need no debiasing and no cut at low signal-to-noise. */

import { scaledBesselI } from '../numerics/blurred-ring.ts';

const ROOT_HALF_PI = Math.sqrt(Math.PI / 2);
/** From here the series in 1/nu^2 below has a relative error under 3e-12. */
const ASYMPTOTIC_FROM = 12;
/** E[Z] = nu sum_k SERIES[k] / nu^(2k), SERIES[k] = ((-1/2)_k)^2 2^k / k! (Abramowitz and Stegun 13.5.1). */
const SERIES = [1, 1 / 2, 1 / 8, 3 / 16, 75 / 128, 735 / 256];

/** Returns E[Z] and its derivative at nu >= 0. */
export function riceMean(nu: number): [number, number] {
  if (nu > ASYMPTOTIC_FROM) return farMean(nu);
  const y = (nu * nu) / 4;
  const [i0, i1] = scaledBesselI(y);
  return [ROOT_HALF_PI * ((1 + 2 * y) * i0 + 2 * y * i1), ROOT_HALF_PI * (nu / 2) * (i0 + i1)];
}

function farMean(nu: number): [number, number] {
  const square = 1 / (nu * nu);
  let mean = 0;
  let slope = 0;
  for (let k = SERIES.length - 1; k >= 0; k--) {
    mean = mean * square + SERIES[k];
    slope = slope * square + (1 - 2 * k) * SERIES[k];
  }
  return [nu * mean, slope];
}
