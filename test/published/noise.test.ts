/** Noise of visibilities against published and outside values. */

import { describe, expect, test } from 'vitest';
import {
  coherence,
  debiasedSquare,
  radiometerSigma,
  riceFourthMoment,
  riceMean,
  riceSecondMoment,
  systemEquivalentFlux,
} from '../../stages/numerics/noise.ts';

describe('The radiometer equation (Thompson, Moran & Swenson, 3rd ed., section 6.2)', () => {
  // Arithmetic done outside: 120 K on a dish of 15 m with efficiency 0.6, 2 GHz, 10 s, 0.88 for two bits.
  test('gives the equivalent flux density of a system', () => {
    expect(systemEquivalentFlux(120, 106.02875205865551) / 3125.150051909436).toBeCloseTo(1, 12);
  });

  test('gives the noise of a pair of equal and of unequal stations', () => {
    const sefd = 3125.150051909436;
    expect(radiometerSigma(sefd, sefd, 2e9, 10, 0.88) / 0.01775653438584907).toBeCloseTo(1, 12);
    expect(radiometerSigma(sefd, 4000, 2e9, 10, 0.88) / 0.020088743108477143).toBeCloseTo(1, 12);
  });
});

test.each([
  // exp(−σ²/2), the characteristic function of a Gaussian, computed outside.
  [0.1, 0.9950124791926823],
  [0.3, 0.955997481833099],
  [0.5, 0.882496902584595],
  [1.0, 0.6065306597126334],
])('Phase noise of %d rad leaves %d of the amplitude', (sigma, left) => {
  expect(Math.abs(coherence(sigma) - left)).toBeLessThan(1e-14);
});

describe('Rice moments (Rice 1944), sigma 1 per component', () => {
  // Amplitude, mean, second and fourth moment; the mean in closed form and by quadrature of the density, outside.
  test.each([
    [0.0, 1.2533141373155, 2.0, 8.0],
    [0.5, 1.330447340610703, 2.25, 10.0625],
    [1.0, 1.548572460551145, 3.0, 17.0],
    [2.0, 2.272383428068743, 6.0, 56.0],
    [3.0, 3.172577287900718, 11.0, 161.0],
    [5.0, 5.101069639492125, 27.0, 833.0],
    [10.0, 10.05012693667742, 102.0, 10808.0],
  ])('of amplitude %d', (amplitude, mean, second, fourth) => {
    expect(Math.abs(riceMean(amplitude, 1) / mean - 1)).toBeLessThan(1e-12);
    expect(Math.abs(riceSecondMoment(amplitude, 1) - second)).toBeLessThan(1e-12);
    expect(Math.abs(riceFourthMoment(amplitude, 1) - fourth)).toBeLessThan(1e-9);
    expect(debiasedSquare(Math.sqrt(second), 1)).toBeCloseTo(amplitude * amplitude, 12);
  });

  test('scale with sigma', () => {
    expect(riceMean(6, 2)).toBeCloseTo(2 * 3.172577287900718, 12);
  });

  test('of a strong signal approach |V| (1 + sigma²/2|V|²) (ibid., section 9.3)', () => {
    expect(Math.abs(riceMean(10, 1) - 10.05)).toBeLessThan(2e-4);
    // Next term 1/(8|V|³): 1e-10 at 1000.
    expect(Math.abs(riceMean(1000, 1) - 1000.0005)).toBeLessThan(1e-9);
  });
});
