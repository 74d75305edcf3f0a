/** Amplitudes with drawn noise against their moments. */

import { expect, test } from 'vitest';
import { coherence, debiasedSquare, riceMean } from '../../../stages/numerics/noise.ts';
import { randomStream } from '../../../stages/numerics/random.ts';

test('Drawn amplitudes have the mean that Rice gives and no bias once debiased', () => {
  const stream = randomStream(3, 'noise test');
  const [amplitude, sigma, draws] = [0.6, 0.4, 40_000];
  let sum = 0;
  let squares = 0;
  for (let k = 0; k < draws; k++) {
    const measured = Math.hypot(amplitude + sigma * stream.normal(), sigma * stream.normal());
    sum += measured;
    squares += debiasedSquare(measured, sigma);
  }
  // Five standard errors: 0.36/200 for the mean, 0.6/200 for the square.
  expect(Math.abs(sum / draws - riceMean(amplitude, sigma))).toBeLessThan(0.009);
  expect(Math.abs(squares / draws - amplitude * amplitude)).toBeLessThan(0.015);
});

test('Averaged phasors keep what the coherence says, however many they are', () => {
  const stream = randomStream(4, 'phase noise');
  let sum = 0;
  for (let k = 0; k < 40_000; k++) sum += Math.cos(0.5 * stream.normal());
  expect(Math.abs(sum / 40_000 - coherence(0.5))).toBeLessThan(0.003);
});

test('The mean is the same on both sides of the change of series', () => {
  const y = (value: number) => Math.sqrt(2 * value);
  expect(riceMean(y(50 - 1e-12), 1)).toBeCloseTo(riceMean(y(50), 1), 11);
});
