/** The posterior of a linear Gaussian problem (Bishop, Pattern Recognition and Machine Learning, eqs. 3.50 and 3.51;
 *  recomputed with numpy), the mean amplitude under noise (Rice 1944; recomputed with mpmath), and the mass from the
 *  photon capture diameter (Misner, Thorne and Wheeler, section 25.6; invented masses, recomputed with mpmath). */

import { expect, test } from 'vitest';
import { massInSuns } from '../../stages/imaging/gravitational-radius.ts';
import type { LinearModel } from '../../stages/imaging/linear-model.ts';
import { drawPosterior } from '../../stages/imaging/posterior-draws.ts';
import { riceMean } from '../../stages/imaging/rice.ts';
import { gaussNewton } from '../../stages/numerics/gauss-newton.ts';
import { invertSymmetric } from '../../stages/numerics/linear.ts';
import { mean, standardDeviation } from '../../stages/numerics/statistics.ts';

test('finds mean and covariance of the published linear posterior', () => {
  const y = [1, 2.2, 2.9, 4.1];
  const sigma = 0.2;
  const cost = (x: Float64Array) =>
    y.reduce((sum, value, k) => sum + ((x[0] + k * x[1] - value) / sigma) ** 2, (x[0] ** 2 + x[1] ** 2) / 4) /
    2;
  const found = gaussNewton(
    {
      cost,
      expand(x) {
        const gradient = Float64Array.of(x[0] / 4, x[1] / 4);
        const curvature = Float64Array.of(1 / 4, 0, 0, 1 / 4);
        y.forEach((value, k) => {
          const r = (x[0] + k * x[1] - value) / sigma;
          gradient[0] += r / sigma;
          gradient[1] += (r * k) / sigma;
          [1, k, k, k * k].forEach((product, at) => {
            curvature[at] += product / (sigma * sigma);
          });
        });
        return { cost: cost(x), gradient, curvature };
      },
    },
    new Float64Array(2),
  );
  const covariance = invertSymmetric(found.curvature, 2) ?? [];
  const published = [0.027769931764461037, -0.01189290439591479, -0.01189290439591479, 0.007948424437936384];
  expect(Math.abs(found.x[0] - 1.0456836190108092)).toBeLessThan(1e-12);
  expect(Math.abs(found.x[1] - 1.0011347812944433)).toBeLessThan(1e-12);
  published.forEach((value, k) => {
    expect(Math.abs(covariance[k] - value)).toBeLessThan(1e-12);
  });
  // Draws: the mean within 4 standard errors, the variance within 5 % (20,000 draws: 1 % standard error).
  const model = { flux: 0, scales: Float64Array.of(1, 1) } as unknown as LinearModel;
  const draws = drawPosterior(model, found.x, found.curvature, 20000, 1);
  expect(Math.abs(mean(draws.flux) - 1.0456836190108092)).toBeLessThan(4 * Math.sqrt(published[0] / 20000));
  expect(Math.abs(standardDeviation(draws.flux) ** 2 / published[0] - 1)).toBeLessThan(0.05);
  expect(Math.abs(standardDeviation(draws.coefficients) ** 2 / published[3] - 1)).toBeLessThan(0.05);
  const centre = mean(draws.flux);
  const product = draws.flux.map((value, s) => (value - centre) * draws.coefficients[s]);
  expect(Math.abs(mean(product) / published[1] - 1)).toBeLessThan(0.05);
});

test.each([
  [0, 1.2533141373155],
  [0.5, 1.330447340610703],
  [1, 1.548572460551145],
  [2, 2.272383428068743],
  [3, 3.172577287900718],
  [5, 5.101069639492125],
  [10, 10.05012693667742],
])('gives the mean of an amplitude at signal-to-noise %f', (nu, published) => {
  expect(Math.abs(riceMean(nu)[0] / published - 1)).toBeLessThan(1e-12);
});

test('joins the near and the far form of the mean amplitude, and its derivative', () => {
  const [near, far] = [riceMean(12), riceMean(12 + 1e-9)];
  expect(Math.abs(far[0] - near[0] - 1e-9)).toBeLessThan(4e-11);
  expect(Math.abs(far[1] - near[1])).toBeLessThan(1e-10);
  for (const nu of [0.3, 1, 4, 11, 13, 80]) {
    const slope = (riceMean(nu + 1e-5)[0] - riceMean(nu - 1e-5)[0]) / 2e-5;
    expect(Math.abs(riceMean(nu)[1] - slope)).toBeLessThan(1e-9);
  }
});

test.each([
  [2e9, 1e7, 20.51571652187541],
  [5e6, 9000, 56.98810144965392],
  [1e8, 1e6, 10.2578582609377],
])('gives %f suns at %f pc from a diameter of %f uas', (mass, distance, diameter) => {
  const angle = (diameter / 10.392304845413264) * 4.84813681109536e-12;
  expect(Math.abs(massInSuns(angle, distance) / mass - 1)).toBeLessThan(1e-12);
});
