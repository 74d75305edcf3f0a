/** Thermal noise of a visibility and what it does to amplitudes.
 *  `sigma` is the standard deviation of one real component throughout (CONVENTIONS). */

import { exp } from './elementary.ts';

/** J/K, exact (SI of 2019). */
const BOLTZMANN = 1.380649e-23;
const JANSKY = 1e-26;

/** System equivalent flux density, Jy: 2 k T / A (Thompson, Moran & Swenson, 3rd ed., chapter 1).
 *  @param temperature     system temperature, K
 *  @param effectiveArea   m² */
export function systemEquivalentFlux(temperature: number, effectiveArea: number): number {
  return (2 * BOLTZMANN * temperature) / effectiveArea / JANSKY;
}

/** Noise of one real component of a visibility, Jy, by the radiometer equation: sqrt(S1 S2 / (2 B t)) / efficiency
 *  (Thompson, Moran & Swenson, 3rd ed., section 6.2).
 *  @param sefd1, sefd2  Jy
 *  @param bandwidth     Hz
 *  @param seconds       integration time
 *  @param efficiency    of quantisation: 0.88 with two bits, 0.64 with one (ibid., chapter 8) */
export function radiometerSigma(
  sefd1: number,
  sefd2: number,
  bandwidth: number,
  seconds: number,
  efficiency: number,
): number {
  return Math.sqrt((sefd1 * sefd2) / (2 * bandwidth * seconds)) / efficiency;
}

/** What is left of an amplitude averaged over Gaussian phase noise of the given standard deviation, radians:
 *  exp(−σ²/2), the characteristic function. */
export function coherence(phaseRadians: number): number {
  return exp((-phaseRadians * phaseRadians) / 2);
}

/** Mean of |V + n| (Rice 1944, Bell Syst. Tech. J. 23, 282): sigma sqrt(π/2) 1F1(−1/2; 1; −|V|²/2 sigma²). */
export function riceMean(amplitude: number, sigma: number): number {
  const y = (amplitude * amplitude) / (2 * sigma * sigma);
  // The series is summed after Kummer's transformation, where all terms are positive; from 50 on the asymptotic one
  // has terms below 1e-20.
  return sigma * Math.sqrt(Math.PI / 2) * (y < 50 ? kummerSeries(y) : kummerAsymptotic(y));
}

/** Mean of |V + n|²: |V|² + 2 sigma². */
export function riceSecondMoment(amplitude: number, sigma: number): number {
  return amplitude * amplitude + 2 * sigma * sigma;
}

/** Mean of |V + n|⁴: |V|⁴ + 8 |V|² sigma² + 8 sigma⁴. */
export function riceFourthMoment(amplitude: number, sigma: number): number {
  const a2 = amplitude * amplitude;
  const s2 = sigma * sigma;
  return a2 * a2 + 8 * a2 * s2 + 8 * s2 * s2;
}

/** Unbiased estimate of |V|² from a measured amplitude: Z² − 2 sigma². Negative when noise had it so. */
export function debiasedSquare(measured: number, sigma: number): number {
  return measured * measured - 2 * sigma * sigma;
}

/** 1F1(−1/2; 1; −y) = exp(−y) 1F1(3/2; 1; y) for moderate y. */
function kummerSeries(y: number): number {
  let term = 1;
  let sum = 1;
  for (let k = 0; term > 1e-18 * sum; k++) {
    term *= ((1.5 + k) * y) / ((k + 1) * (k + 1));
    sum += term;
  }
  return exp(-y) * sum;
}

/** 1F1(−1/2; 1; −y) ~ 2 sqrt(y/π) Σ ((−1/2)_k)² / (k! y^k) for large y. */
function kummerAsymptotic(y: number): number {
  let term = 1;
  let sum = 1;
  for (let k = 0; k < 20 && term > 1e-18 * sum; k++) {
    term *= ((k - 0.5) * (k - 0.5)) / ((k + 1) * y);
    sum += term;
  }
  return 2 * Math.sqrt(y / Math.PI) * sum;
}
