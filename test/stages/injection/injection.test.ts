/** The method's bias: recovered where it is known, and taken out of a measurement. */

import { expect, test } from 'vitest';
import { memorySink, sourceOf } from '../../../stages/bytes.ts';
import type { Basis } from '../../../stages/data.ts';
import { compute as computeFit } from '../../../stages/fit/compute.ts';
import { fit } from '../../../stages/fit/fit.ts';
import { writeBasis } from '../../../stages/formats/basis.ts';
import { readJson } from '../../../stages/formats/json.ts';
import { writeVisibilities } from '../../../stages/formats/visibilities-write.ts';
import { injectedRings } from '../../../stages/imaging/injected-rings.ts';
import {
  type BiasOfQuantity,
  biasOf,
  correctedDraws,
  correctionAt,
} from '../../../stages/imaging/method-bias.ts';
import { observe as observeAgain } from '../../../stages/imaging/synthetic.ts';
import { imageAtResolution, QUANTITIES, type Trial } from '../../../stages/imaging/trial.ts';
import { visibleRings } from '../../../stages/imaging/visible-rings.ts';
import { compute } from '../../../stages/injection/compute.ts';
import type { Model } from '../../../stages/numerics/models.ts';
import { ellipticalGaussian } from '../../../stages/numerics/named-models.ts';
import { type RandomStream, randomStream } from '../../../stages/numerics/random.ts';
import { measureRing } from '../../../stages/numerics/ring.ts';
import { mean, normalQuantile, quantiles, standardDeviation } from '../../../stages/numerics/statistics.ts';
import { defaultParameters } from '../default-parameters.ts';
import { crescentImage, makeLibraryBasis, observe, withFlux } from '../fit/synthetic-data.ts';
import { UAS } from '../numerics/ring-images.ts';

/** Trials whose measurements are off by a known line, with errors of the posterior and a scatter beyond. */
function knownTrials(count: number, offset: number, slope: number, scatter: number, error: number): Trial[] {
  const random = randomStream(4, 'trials');
  return Array.from({ length: count }, () => {
    const value = random.between(35, 45);
    const off = offset + slope * (value - 40) + scatter * random.normal() + error * random.normal();
    const all = <T>(make: (name: string) => T) =>
      Object.fromEntries(QUANTITIES.map((name) => [name, make(name)]));
    return {
      truth: all(() => value - off),
      measured: all(() => ({ value, deviation: error })),
      ringFraction: 1,
    } as unknown as Trial;
  });
}

const diameterOf = (trials: readonly Trial[]): BiasOfQuantity => {
  const bias = biasOf(trials);
  if (bias === null) throw new Error('too few trials');
  return bias.diameter;
};

/** Trials with errors of 0.5 about -0.8, whose posteriors claim another width. */
function claimedTrials(count: number, random: RandomStream, factor: number): Trial[] {
  return Array.from({ length: count }, () => {
    const value = random.between(38, 42);
    const truth = value + 0.8 + 0.5 * random.normal();
    const all = <T>(make: () => T) => Object.fromEntries(QUANTITIES.map((name) => [name, make()]));
    return {
      truth: all(() => truth),
      measured: all(() => ({ value, deviation: 0.5 * factor })),
      ringFraction: 1,
    } as unknown as Trial;
  });
}

test('finds offset, slope and scatter that were put in', () => {
  const { offset, slope, scatter, centre, covariance } = diameterOf(knownTrials(400, -0.8, 0.05, 0.3, 0.4));
  const atForty = offset + slope * (40 - centre);
  expect(Math.abs(atForty + 0.8)).toBeLessThan(5 * Math.sqrt(covariance[0]));
  expect(Math.abs(slope - 0.05)).toBeLessThan(5 * Math.sqrt(covariance[1]));
  // All of it, sqrt(0.3^2 + 0.4^2) = 0.5; of 400 known to 0.5 / sqrt(800) = 0.018.
  expect(Math.abs(scatter - 0.5)).toBeLessThan(0.09);
  // Standard error of the mean of 400 errors of 0.5.
  expect(Math.sqrt(covariance[0])).toBeCloseTo(0.5 / 20, 2);
});

// By hand from Gelman et al., section 14.2, with errors of 1 and -1 at one value: offset 0, S = 4 of four trials, v = 4 / 3; the
// offset's variance is that over four. A posterior ten times as wide as those of the trials: (3 + 100) / 4 of it.
test('weighs the errors of trials and the width of the posterior as by hand', () => {
  const off = (error: number) => ({
    ...knownTrials(1, 0, 0, 0, 0)[0],
    truth: Object.fromEntries(QUANTITIES.map((name) => [name, 40 - error])),
    measured: Object.fromEntries(QUANTITIES.map((name) => [name, { value: 40, deviation: 0.5 }])),
  });
  const bias = diameterOf([1, -1, 1, -1].map(off) as unknown as Trial[]);
  expect(bias.squares).toBeCloseTo(4, 10);
  const at = correctionAt(bias, 40, 0.5);
  expect(at.shift).toBeCloseTo(0, 12);
  expect(at.scatter).toBeCloseTo(Math.sqrt(4 / 3), 10);
  expect(at.degreesOfFreedom).toBe(3);
  expect(at.ofLine).toBeCloseTo(Math.sqrt(1 / 3), 3);
  expect(correctionAt(bias, 40, 5).scatter).toBeCloseTo(Math.sqrt((4 / 3) * (103 / 4)), 10);
});

test('knows less of few trials, and nothing of three', () => {
  const [many, few] = [200, 6].map((count) => diameterOf(knownTrials(count, 1, 0, 0.3, 0.5)));
  expect(correctionAt(few, 40, 0.5).ofLine).toBeGreaterThan(2 * correctionAt(many, 40, 0.5).ofLine);
  expect(biasOf(knownTrials(3, 1, 0, 0, 0.5))).toBeNull();
});

// Identity: whatever width the posteriors claim, intervals of corrected values hold the truth as often as they say.
test.each([0.5, 1, 2])(
  'holds the truth as often as it says where posteriors are %d times as wide as the error',
  (factor) => {
    const random = randomStream(11, 'coverage');
    const inside = { 68: 0, 95: 0 };
    const rounds = 600;
    for (let k = 0; k < rounds; k++) {
      const [first, ...others] = claimedTrials(13, random, factor);
      const measured = (first.measured as NonNullable<Trial['measured']>).diameter.value;
      const draws = Array.from(
        { length: 60 },
        (_, i) => measured + 0.5 * factor * normalQuantile((i + 0.5) / 60),
      );
      const corrected = correctedDraws(draws, diameterOf(others), random);
      const [low95, low, high, high95] = quantiles(corrected, [0.025, 0.16, 0.84, 0.975]);
      const truth = (first.truth as NonNullable<Trial['truth']>).diameter;
      if (truth > low && truth < high) inside[68]++;
      if (truth > low95 && truth < high95) inside[95]++;
    }
    // Binomial: 600 within three deviations, 0.06 and 0.03.
    expect(inside[68] / rounds).toBeGreaterThan(0.66 - 0.06);
    expect(inside[68] / rounds).toBeLessThan(0.7 + 0.06);
    expect(inside[95] / rounds).toBeGreaterThan(0.95 - 0.03);
  },
);

// Identity: noise of the stated size, a correlation of 1 with what was sent.
test('observes a source again with its noise, gains and station phases', () => {
  const template = observe(withFlux(crescentImage({ diameter: 44, blur: 14, b: 0.2, angle: 70 }), 0.8), {
    scans: 10,
  });
  const source = ellipticalGaussian(10 * UAS);
  const still = observeAgain(template, source, { gainDeviations: new Float64Array(8), seed: 3 });
  const amplitude = (k: number) => Math.hypot(still.re[k], still.im[k]);
  const expected = (k: number) =>
    Math.exp((-(Math.PI * Math.PI) / (4 * Math.LN2)) * (10 * UAS) ** 2 * (still.u[k] ** 2 + still.v[k] ** 2));
  const off = Array.from({ length: still.count }, (_, k) => (amplitude(k) - expected(k)) / still.sigma[k]);
  expect(Math.abs(standardDeviation(off) - 1)).toBeLessThan(4 / Math.sqrt(2 * still.count));
  const loud = observeAgain(template, source, { gainDeviations: new Float64Array(8).fill(0.1), seed: 3 });
  const ratios = Array.from({ length: loud.count }, (_, k) =>
    Math.log(Math.hypot(loud.re[k], loud.im[k]) / expected(k)),
  );
  // Two gains of 10 % on every baseline.
  expect(Math.abs(standardDeviation(ratios) - 0.1 * Math.SQRT2)).toBeLessThan(0.03);
  expect(Math.abs(mean(ratios))).toBeLessThan(0.05);
});

test('injects only what is a ring at the resolution, from small to large', () => {
  const grid = { nx: 48, ny: 48, pixelRadians: 3 * UAS, resolutionRadians: 12 * UAS } as Basis;
  const about = { diameter: 42 * UAS, width: 14 * UAS, asymmetry: 0.2, floor: 0.05 };
  const isRing = (source: Model) => measureRing(imageAtResolution(source, grid)).ring;
  // The case: some of the first draws are none.
  const first = injectedRings(about, 1, 12, 5).filter(isRing).length;
  expect(first).toBeLessThan(12);
  const chosen = visibleRings(grid, { about, flux: 1, count: 12, seed: 5 });
  expect(chosen.length).toBeGreaterThan(first);
  expect(chosen.every(isRing)).toBe(true);
  const sizes = chosen.map(({ parts }) => parts[0].length);
  expect(sizes).toEqual([...sizes].sort((a, b) => a - b));
  const blob = { about: { ...about, diameter: 10 * UAS }, flux: 1, count: 2, seed: 5 };
  expect(visibleRings(grid, blob)).toEqual([]);
});

test('injects about the ring of a fit, and writes the same bytes twice', async () => {
  const basis = makeLibraryBasis(16, 160);
  const data = observe(withFlux(crescentImage({ diameter: 50, blur: 9, b: 0.2, angle: 70 }), 0.8), {
    scans: 8,
    gains: 0.05,
    stationPhases: true,
    noise: 0.005,
  });
  const [visibilities, basisBytes] = [memorySink(), memorySink()];
  writeVisibilities(visibilities, data);
  writeBasis(basisBytes, basis);
  const quiet = { note: () => {}, progress: () => {} };
  const inputs = { visibilities: [sourceOf(visibilities.bytes())], basis: [sourceOf(basisBytes.bytes())] };
  const names = ['image', 'samples', 'residuals', 'report', 'models', 'flux'];
  const outputs = Object.fromEntries(names.map((name) => [name, memorySink()]));
  const parameters = { ...defaultParameters(fit), components: 16, posterior: 'gaussian' };
  await computeFit({ inputs, parameters, outputs, ...quiet });
  const once = async () => {
    const bias = memorySink();
    await compute({
      inputs: {
        ...inputs,
        image: [sourceOf(outputs.image.bytes())],
        report: [sourceOf(outputs.report.bytes())],
      },
      parameters: { count: 6, starts: 1, seed: 1 },
      outputs: { bias },
      ...quiet,
    });
    return bias.bytes();
  };
  const bytes = await once();
  expect(Buffer.from(await once()).equals(Buffer.from(bytes))).toBe(true);
  const found = readJson(sourceOf(bytes)) as {
    injected: number;
    used: number;
    bias: Record<string, { offset: number }>;
  };
  // Six that come out, or two rounds of six.
  expect(found.used === 6 || found.injected === 12).toBe(true);
  expect(found.used).toBeGreaterThanOrEqual(4);
  // A crude basis and eight scans: an eighth of the diameter.
  expect(Math.abs(found.bias.diameter?.offset ?? 99)).toBeLessThan(50 / 8);
});
