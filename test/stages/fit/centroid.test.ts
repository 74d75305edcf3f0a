/** The centroid as a nuisance of complex visibilities: derivatives, the shift theorem, a source off the phase centre, and
 *  the coverage of its intervals. */

import { beforeAll, describe, expect, test } from 'vitest';
import { memorySink, sourceOf } from '../../../stages/bytes.ts';
import type { Basis, SkyImage, Visibilities } from '../../../stages/data.ts';
import { compute } from '../../../stages/fit/compute.ts';
import { fit } from '../../../stages/fit/fit.ts';
import { writeBasis } from '../../../stages/formats/basis.ts';
import { readJson, readNumbers } from '../../../stages/formats/json.ts';
import { readSkyImage } from '../../../stages/formats/sky-image.ts';
import { writeVisibilities } from '../../../stages/formats/visibilities-write.ts';
import { findPlace } from '../../../stages/imaging/centroid-start.ts';
import { makeComplexTerm } from '../../../stages/imaging/complex-term.ts';
import { resized } from '../../../stages/imaging/fit-problem.ts';
import {
  basisVisibilities,
  componentsOf,
  type LinearModel,
  makeLinearModel,
  predict,
  predictUnmoved,
} from '../../../stages/imaging/linear-model.ts';
import { makeObjective } from '../../../stages/imaging/objective.ts';
import { makePositivityTerm } from '../../../stages/imaging/positivity-term.ts';
import { drawPosterior } from '../../../stages/imaging/posterior-draws.ts';
import { runFit } from '../../../stages/imaging/run-fit.ts';
import type { FitSettings } from '../../../stages/imaging/settings.ts';
import { randomStream } from '../../../stages/numerics/random.ts';
import { measureRing } from '../../../stages/numerics/ring.ts';
import { angleDifference, quantiles } from '../../../stages/numerics/statistics.ts';
import { defaultParameters } from '../default-parameters.ts';
import { blurredRingImage, imageOf, UAS } from '../numerics/ring-images.ts';
import { crescentImage, makeLibraryBasis, observe, slowVisibility, withFlux } from './synthetic-data.ts';

const [EAST, NORTH] = [17, -23];
const CRESCENT = { diameter: 42, blur: 12, b: 0.25, angle: 200 };
const SETTINGS: FitSettings = {
  data: 'complex-visibilities',
  components: 30,
  priorWidth: 2,
  fluxPrior: 0.5,
  shortest: 0.1,
  gainPriors: { usual: 0.1, stations: {} },
  minimumSnr: 2.5,
  centroid: 'free',
  positivity: 1,
  starts: 4,
  posterior: 'gaussian',
  sampler: { chains: 4, warmUp: 100, draws: 150, most: 600, rHat: 1.02, ess: 300 },
  samples: 400,
  seed: 1,
};

/** Sum of I x over the sum of I, from the definition; microarcseconds east and north. */
function centroidOf({ nx, ny, pixelRadians, pixels }: SkyImage): [number, number] {
  let [sum, x, y] = [0, 0, 0];
  pixels.forEach((value, p) => {
    sum += value;
    x += value * ((nx - 1) / 2 - (p % nx));
    y += value * (Math.floor(p / nx) - (ny - 1) / 2);
  });
  return [((x / sum) * pixelRadians) / UAS, ((y / sum) * pixelRadians) / UAS];
}

const displaced = withFlux(
  blurredRingImage({ nx: 80, pixel: 2, ...CRESCENT, east: EAST, north: NORTH }),
  0.8,
);
let basis: Basis;
let data: Visibilities;

beforeAll(() => {
  basis = makeLibraryBasis(30, 160);
  data = observe(displaced, { scans: 18, noise: 0.008 });
});

function fitted(settings: FitSettings) {
  const sinks = [memorySink(), memorySink()];
  writeVisibilities(sinks[0], data);
  writeBasis(sinks[1], basis);
  const names = ['image', 'samples', 'residuals', 'report', 'models', 'flux'] as const;
  const outputs = Object.fromEntries(names.map((name) => [name, memorySink()]));
  const stage = compute({
    inputs: { visibilities: [sourceOf(sinks[0].bytes())], basis: [sourceOf(sinks[1].bytes())] },
    parameters: { ...settings },
    outputs,
    note: () => {},
    progress: () => {},
  });
  const source = (name: string) => sourceOf(outputs[name].bytes());
  return {
    warnings: stage.warnings ?? [],
    image: readSkyImage(source('image')),
    numbers: readNumbers(source('flux')),
    // biome-ignore lint/suspicious/noExplicitAny: the report is read field by field
    report: readJson(source('report')) as any,
    // biome-ignore lint/suspicious/noExplicitAny: so are the residuals
    residuals: readJson(source('residuals')) as any,
  };
}

describe('A crescent off the phase centre', () => {
  test('is recovered with its centroid, its orientation right', () => {
    const { image, numbers, report, residuals, warnings } = fitted(SETTINGS);
    const [east, north] = centroidOf(displaced);
    for (const [name, truth] of [
      ['centroid-east', east],
      ['centroid-north', north],
    ] as const) {
      const { value, unit, low95 = NaN, high95 = NaN } = numbers.values[name];
      expect(unit).toBe('uas');
      expect(Math.abs(value - truth), name).toBeLessThan(1);
      // Signal-to-noise of 100 in all, beams of 20 uas: tenths of a microarcsecond.
      expect(high95 - low95).toBeLessThan(2);
    }
    expect(Math.abs(numbers.values.flux.value - 0.8)).toBeLessThan(0.04);
    expect(report.terms[0].reducedChiSquare).toBeGreaterThan(0.8);
    expect(report.terms[0].reducedChiSquare).toBeLessThan(1.2);
    expect(report.components).toBe(30);
    expect(report.posterior).toContain('Laplace');
    expect(warnings.filter((text) => !text.includes('starts'))).toEqual([]);
    // The image is shown with its centroid at the origin, and the ring is that of the undisplaced crescent.
    for (const offset of centroidOf(image)) expect(Math.abs(offset)).toBeLessThan(1);
    const ring = measureRing(image);
    const truth = measureRing(crescentImage({ ...CRESCENT, blur: Math.hypot(12, 10) }, 2));
    expect(Math.abs(ring.diameter / truth.diameter - 1)).toBeLessThan(0.05);
    expect(Math.abs(angleDifference(ring.positionAngleDegrees, 200))).toBeLessThan(15);
    // Model visibilities of the residuals are those of the displaced source.
    const { u, v, modelRe, modelIm } = residuals.visibilities;
    for (const r of [3, 40, 90]) {
      const [re, im] = slowVisibility(displaced, u[r], v[r]);
      expect(Math.hypot(modelRe[r] - re, modelIm[r] - im)).toBeLessThan(0.02);
    }
  });

  test('is not recovered where the centroid is held, and the warning says why', () => {
    const { image, numbers, report, warnings } = fitted({ ...SETTINGS, centroid: 'fixed' });
    expect(Object.keys(numbers.values)).toEqual(['flux']);
    expect('centroid' in report).toBe(false);
    expect(report.terms[0].reducedChiSquare).toBeGreaterThan(10);
    expect(warnings.join()).toContain('or one off the phase centre, where `centroid: fixed` holds it');
    const ring = measureRing(image);
    const good =
      ring.ring &&
      Math.abs(ring.diameter / UAS / 42 - 1) < 0.05 &&
      Math.abs(angleDifference(ring.positionAngleDegrees, 200)) < 15;
    expect(good).toBe(false);
  });

  test.each([
    [0, 0],
    [4, 3],
    [-31, 12],
    [45, 50],
  ])('is found at (%d, %d) uas by a choice of components from the data', (east, north) => {
    // The place enters by the shift theorem, on visibilities of the crescent at the origin.
    const turn = (u: number, v: number) => -2 * Math.PI * (u * east + v * north) * UAS;
    const centred = observe(withFlux(crescentImage(CRESCENT, 2), 0.8), { scans: 10, noise: 0.004, seed: 3 });
    const at = Array.from(centred.u, (u, r) => turn(u, centred.v[r]));
    const moved = {
      ...centred,
      re: centred.re.map((re, r) => re * Math.cos(at[r]) - centred.im[r] * Math.sin(at[r])),
      im: centred.im.map((im, r) => im * Math.cos(at[r]) + centred.re[r] * Math.sin(at[r])),
    };
    const { problem, best } = runFit(moved, basis, { ...SETTINGS, components: 'by-data', starts: 2 });
    const { places } = drawPosterior(problem.model, best.x, best.curvature, 50, 1);
    const [dx, dy] = centroidOf(crescentImage(CRESCENT, 2));
    const mean = (pick: 'east' | 'north') =>
      (places ?? []).reduce((sum, each) => sum + each[pick], 0) / 50 / UAS;
    expect(Math.abs(mean('east') - east - dx)).toBeLessThan(1.5);
    expect(Math.abs(mean('north') - north - dy)).toBeLessThan(1.5);
  });
});

describe('The place as a parameter', () => {
  let model: LinearModel;
  const x = Float64Array.of(0.2, -0.3, 0.25, 0.1, -0.2, 0.15, 0.05, 0.11, -0.14);

  beforeAll(() => {
    const B = basisVisibilities({ ...basis, components: basis.components.slice(0, 8) }, data.u, data.v);
    const linear = makeLinearModel(B, basis.eigenvalues, { flux: 0.7, fluxWidth: 0.5, priorWidth: 2 });
    model = { ...linear, ramp: { scale: 160 * UAS, u: data.u, v: data.v } };
  });

  test('turns the phases as a shifted image does, east and north of CONVENTIONS', () => {
    // A shift by whole pixels, 2 to the east (lower x index) and 3 to the south, summed slowly.
    const pixels = (k: number) => basis.components[0][k] * 0.3 + basis.mean[k];
    const { nx, ny, pixelRadians } = basis;
    const shifted = basis.mean.map((_, k) => {
      const [i, j] = [(k % nx) + 2, Math.floor(k / nx) + 3];
      return i < nx && j < ny ? pixels(j * nx + i) : 0;
    });
    const B = basisVisibilities(
      { ...basis, mean: basis.mean.map((_, k) => pixels(k)), components: [] },
      data.u,
      data.v,
    );
    const plain = makeLinearModel(B, basis.eigenvalues, { flux: 1, fluxWidth: 1, priorWidth: 1 });
    const ramp = { scale: pixelRadians, u: data.u, v: data.v };
    const at = predict({ ...plain, ramp }, Float64Array.of(0, 2, -3));
    for (const r of [0, 11, data.count - 1]) {
      const [re, im] = slowVisibility({ nx, ny, pixelRadians, pixels: shifted }, data.u[r], data.v[r]);
      const q2 = (data.u[r] ** 2 + data.v[r] ** 2) * basis.resolutionRadians ** 2;
      const blur = Math.exp((-(Math.PI ** 2) * q2) / (4 * Math.LN2));
      // What falls off the edge of the image is below 1e-3 of the flux.
      expect(Math.abs(at.re[r] * blur - re)).toBeLessThan(2e-3);
      expect(Math.abs(at.im[r] * blur - im)).toBeLessThan(2e-3);
    }
  });

  test('has the derivatives that differences have, beside components and positivity', () => {
    const dark = x.map((value, k) => (k < 7 ? 4 * value : value));
    const objective = makeObjective(model, [makeComplexTerm(data)], makePositivityTerm(basis, model, 3));
    expect(makePositivityTerm(basis, model, 3).cost(dark.subarray(0, 7))).toBeGreaterThan(0);
    const { cost, gradient } = objective.expand(dark);
    expect(cost).toBeCloseTo(objective.cost(dark), 6);
    for (let k = 0; k < x.length; k++) {
      const at = (h: number) => objective.cost(dark.map((value, i) => (i === k ? value + h : value)));
      const slope = (at(1e-6) - at(-1e-6)) / 2e-6;
      // Central differences: relative error of h^2 and of rounding over h.
      expect(Math.abs(gradient[k] - slope), `parameter ${k}`).toBeLessThan(
        1e-5 * (Math.abs(slope) + 1e-3 * cost),
      );
    }
  });

  test('keeps its place when components are added or cut', () => {
    expect(componentsOf(model, x)).toBe(6);
    expect([...resized(model, x, 4)]).toEqual([0.2, -0.3, 0.25, 0.1, 0.11, -0.14]);
    expect([...resized(model, x, 9)]).toEqual([0.2, -0.3, 0.25, 0.1, -0.2, 0.15, 0.05, 0, 0, 0.11, -0.14]);
  });

  test('starts at the peak of the correlation: within the finer grid of a point source anywhere in reach', () => {
    const point = { ...model, offsetRe: data.u.map(() => 1), offsetIm: data.u.map(() => 0) };
    const nothing = new Float64Array(1);
    for (const [east, north] of [
      [150, -90],
      [-3, 77],
    ]) {
      const phase = data.u.map((u, r) => -2 * Math.PI * (u * east + data.v[r] * north) * UAS);
      const seen = { ...data, re: phase.map(Math.cos), im: phase.map(Math.sin) };
      const place = findPlace(seen, predictUnmoved(point, nothing), 160 * UAS);
      // Longest baselines of 1e10 wavelengths: fringes of 20 uas, steps of 5, finer ones of 1.3.
      expect(Math.abs(place.east / UAS - east)).toBeLessThan(1.3);
      expect(Math.abs(place.north / UAS - north)).toBeLessThan(1.3);
    }
  });
});

test('The intervals of the centroid cover as often as they say', () => {
  // A Gaussian of known shape, its flux and its place drawn from the prior; bounds: central 99.9 % of the binomial.
  const SEEDS = 200;
  const [n, pixel] = [10, 10];
  const raw = imageOf(n, n, pixel, (a, b) => Math.exp(-(a * a + b * b) / 800));
  const small: Basis = {
    ...basis,
    ...{ nx: n, ny: n, pixelRadians: pixel * UAS, resolutionRadians: 0, mean: withFlux(raw, 1).pixels },
    components: [raw.pixels.map((_, p) => (p % 2 === 0 ? 0.1 : -0.1))],
    eigenvalues: Float64Array.of(1e-12),
    scores: new Float64Array(1),
    families: ['wave'],
  };
  const count = 24;
  const points = randomStream(5, 'points');
  const u = Float64Array.from({ length: count }, () => points.between(-3e9, 3e9));
  const v = Float64Array.from({ length: count }, () => points.between(-3e9, 3e9));
  const still = Array.from(u, (_, r) => slowVisibility({ ...small, pixels: small.mean }, u[r], v[r]));
  const settings = {
    ...SETTINGS,
    flux: 1.5,
    fluxPrior: 0.2,
    shortest: 0,
    components: 1,
    positivity: 0,
    starts: 1,
  };
  const hits = { east68: 0, east95: 0, north68: 0, north95: 0 };
  for (let seed = 0; seed < SEEDS; seed++) {
    const random = randomStream(seed, 'centroid coverage');
    const truth = { east: 40 * random.normal(), north: 40 * random.normal() };
    const flux = 1.5 * (1 + 0.2 * random.normal());
    const sigma = new Float64Array(count).fill(0.15);
    const turned = still.map(([re, im], r) => {
      const phase = -2 * Math.PI * (u[r] * truth.east + v[r] * truth.north) * UAS;
      return [
        flux * (re * Math.cos(phase) - im * Math.sin(phase)) + 0.15 * random.normal(),
        flux * (re * Math.sin(phase) + im * Math.cos(phase)) + 0.15 * random.normal(),
      ];
    });
    const rows: Visibilities = {
      ...data,
      ...{ count, u, v, sigma, sigmaPhase: sigma },
      station1: new Int32Array(count),
      station2: new Int32Array(count).fill(1),
      scan: Int32Array.from(u, (_, r) => r),
      re: Float64Array.from(turned, ([re]) => re),
      im: Float64Array.from(turned, ([, im]) => im),
    };
    const { problem, best } = runFit(rows, small, settings);
    const { places } = drawPosterior(problem.model, best.x, best.curvature, 399, seed);
    for (const axis of ['east', 'north'] as const) {
      const draws = (places ?? []).map((place) => place[axis] / UAS);
      const [low95, low, high, high95] = quantiles(draws, [0.025, 0.16, 0.84, 0.975]);
      if (truth[axis] >= low && truth[axis] <= high) hits[`${axis}68`]++;
      if (truth[axis] >= low95 && truth[axis] <= high95) hits[`${axis}95`]++;
    }
  }
  for (const [name, p] of Object.entries({ east68: 0.68, east95: 0.95, north68: 0.68, north95: 0.95 })) {
    const bound = 3.29 * Math.sqrt((p * (1 - p)) / SEEDS);
    expect(Math.abs(hits[name as keyof typeof hits] / SEEDS - p), name).toBeLessThanOrEqual(bound);
  }
});

test('Complex visibilities fit the centroid unless the recipe says otherwise', () => {
  expect(defaultParameters(fit).centroid).toBe('free');
  expect(fit.outputs.flux.numbers).toEqual(['flux', 'centroid-east', 'centroid-north']);
});
