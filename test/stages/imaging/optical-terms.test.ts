/** Squared visibilities and triple products: against slow sums and differences, and in a whole fit. */

import { beforeAll, expect, test } from 'vitest';
import type { Basis, TripleProducts, Visibilities } from '../../../stages/data.ts';
import { holdOutBaselines, leaveOutStations } from '../../../stages/fit/left-out.ts';
import { makeReport } from '../../../stages/fit/report.ts';
import { makeResiduals } from '../../../stages/fit/residuals.ts';
import { makeTerms } from '../../../stages/imaging/fit-problem.ts';
import { compareModels } from '../../../stages/imaging/geometric/compare-models.ts';
import {
  basisVisibilities,
  imageAt,
  makeLinearModel,
  predict,
} from '../../../stages/imaging/linear-model.ts';
import { chosenTriples } from '../../../stages/imaging/optical-terms.ts';
import { pointsOf } from '../../../stages/imaging/points.ts';
import { drawPosterior, withStatedFlux } from '../../../stages/imaging/posterior-draws.ts';
import { posteriorVariants } from '../../../stages/imaging/posterior-variants.ts';
import { refitTo } from '../../../stages/imaging/refit.ts';
import { runFit } from '../../../stages/imaging/run-fit.ts';
import { samplePosterior } from '../../../stages/imaging/sampler.ts';
import { selectRows, wantedData } from '../../../stages/imaging/select-rows.ts';
import type { FitSettings } from '../../../stages/imaging/settings.ts';
import { makeExpansion } from '../../../stages/imaging/term.ts';
import { measureRing } from '../../../stages/numerics/ring.ts';
import { angleDifference, mean, standardDeviation } from '../../../stages/numerics/statistics.ts';
import { observeOptically } from '../fit/optical-data.ts';
import { crescentImage, makeLibraryBasis, observe, withFlux } from '../fit/synthetic-data.ts';

const SETTINGS: FitSettings = {
  data: ['squared-visibilities', 'triple-phases'],
  components: 20,
  priorWidth: 2,
  flux: 1,
  fluxPrior: 0.5,
  shortest: 0.1,
  gainPriors: { usual: 0.1, stations: {} },
  minimumSnr: 2.5,
  positivity: 1,
  starts: 4,
  posterior: 'gaussian',
  sampler: { chains: 4, warmUp: 80, draws: 100, most: 200, rHat: 1.05, ess: 100 },
  samples: 100,
  seed: 1,
};
const CRESCENT = { diameter: 42, blur: 12, b: 0.25, angle: 200 };

let basis: Basis;
let optical: Visibilities;

beforeAll(() => {
  basis = makeLibraryBasis(20, 120);
  const template = observe(crescentImage(CRESCENT), { scans: 8 });
  optical = observeOptically(template, withFlux(crescentImage(CRESCENT, 2), 3.7));
});

test.each([['squared-visibilities'], ['triple-phases'], ['triple-amplitudes']] as const)(
  'has the slopes of %s by visibilities and by parameters as differences do',
  (name) => {
    const { data } = selectRows(wantedData(optical, [name]), 1e8, 1e11);
    const { u, v } = pointsOf(data);
    const model = makeLinearModel(basisVisibilities(basis, u, v), basis.eigenvalues, {
      flux: 0.7,
      fluxWidth: 0.5,
      priorWidth: 2,
    });
    const x = Float64Array.of(0.2, -0.3, 0.25, 0.1, 0.4);
    const at = predict(model, x);
    const [term] = makeTerms([name], data, [], new Float64Array(8));
    if (term === undefined) throw new Error('no term');
    const out = { re: new Float64Array(u.length), im: new Float64Array(u.length) };
    const cost = term.adjoint(at, out);
    expect(cost).toBeCloseTo(term.cost(at), 8);
    for (const part of ['re', 'im'] as const) {
      // Every ninth point, and the origin, where the total flux stands.
      for (const r of [...Array(Math.ceil(u.length / 9)).keys()].map((k) => 9 * k).concat(u.length - 1)) {
        const moved = (h: number) => {
          const values = Float64Array.from(at[part]);
          values[r] += h;
          return term.cost({ ...at, [part]: values });
        };
        const slope = (moved(1e-6) - moved(-1e-6)) / 2e-6;
        expect(Math.abs(out[part][r] - slope)).toBeLessThan(1e-5 * Math.abs(slope) + 1e-6 * cost);
      }
    }
    const expansion = makeExpansion(x.length);
    expect(term.expand(at, model, expansion)).toBeCloseTo(cost, 8);
    for (let k = 0; k < x.length; k++) {
      const moved = (h: number) =>
        term.cost(
          predict(
            model,
            x.map((value, i) => (i === k ? value + h : value)),
          ),
        );
      const slope = (moved(1e-5) - moved(-1e-5)) / 2e-5;
      expect(Math.abs(expansion.gradient[k] - slope)).toBeLessThan(1e-5 * Math.abs(slope) + 1e-6 * cost);
    }
  },
);

// Slow sums (optical-data.ts) of the truth itself: the residuals of noise alone, 1 for each within four of its errors.
test('sees in the truth nothing but the noise', () => {
  const { data } = selectRows(optical, 1e8, 1e11);
  const truth = crescentImage(CRESCENT, 2);
  const one = { ...basis, ...truth, mean: truth.pixels, components: [], resolutionRadians: 0 };
  const { u, v } = pointsOf(data);
  const B = basisVisibilities(one, u, v);
  const terms = makeTerms(
    ['squared-visibilities', 'triple-phases', 'triple-amplitudes'],
    data,
    [],
    new Float64Array(8),
  );
  for (const term of terms) {
    expect(Math.abs(term.chiSquare(B) / term.count - 1)).toBeLessThan(4 * Math.sqrt(2 / term.count));
  }
});

// Identity: normalised products do not change with the flux.
test('does not see the flux', () => {
  const { data } = selectRows(optical, 1e8, 1e11);
  const { u, v } = pointsOf(data);
  const B = basisVisibilities({ ...basis, components: [] }, u, v);
  const brighter = { re: B.re.map((value) => 1.7 * value), im: B.im.map((value) => 1.7 * value) };
  for (const name of ['squared-visibilities', 'triple-phases', 'triple-amplitudes'] as const) {
    const [term] = makeTerms([name], data, [], new Float64Array(8));
    expect((term?.chiSquare(brighter) ?? 0) / (term?.chiSquare(B) ?? 1)).toBeCloseTo(1, 9);
  }
});

// Direct: the points of what stays, computed anew.
test('keeps the right points when a station is left out', () => {
  const { problem, best } = runFit(optical, basis, { ...SETTINGS, components: 6, starts: 1 });
  const settings = { ...SETTINGS, components: 6 };
  const refit = refitTo(problem, best.x, settings, (stations) => !stations.includes(4));
  if (refit === null) throw new Error('no fit');
  const { data, model } = refit.problem;
  expect(data.squared?.station1.includes(4) || data.squared?.station2.includes(4)).toBe(false);
  expect(data.triples?.count).toBeLessThan(problem.data.triples?.count ?? 0);
  const { u, v } = pointsOf(data);
  const again = makeLinearModel(basisVisibilities(basis, u, v), basis.eigenvalues, {
    flux: 1,
    fluxWidth: model.scales[0] as number,
    priorWidth: SETTINGS.priorWidth,
  });
  const [kept, computed] = [predict(model, best.x), predict(again, best.x)];
  expect(kept.re.length).toBe(u.length);
  for (let r = 0; r < u.length; r++) {
    expect(kept.re[r]).toBeCloseTo(computed.re[r] as number, 12);
    expect(kept.im[r]).toBeCloseTo(computed.im[r] as number, 12);
  }
});

// Thompson, Moran and Swenson, 3rd ed., section 10.3: (N-1)(N-2)/2 of the N(N-1)(N-2)/6 triangles are independent.
test('takes the independent triple products of a scan, the most precise first', () => {
  const triangles = [
    [0, 1, 2],
    [0, 1, 3],
    [0, 2, 3],
    [1, 2, 3],
  ];
  const column = (k: number) => Int32Array.from(triangles, (triangle) => triangle[k] as number);
  const triples = {
    count: 4,
    station1: column(0),
    station2: column(1),
    station3: column(2),
    scan: new Int32Array(4),
    sigmaPhase: Float64Array.of(0.4, 0.1, 0.2, 0.3),
    sigmaAmplitude: Float64Array.of(0.1, Number.POSITIVE_INFINITY, 0.2, 0.3),
  } as unknown as TripleProducts;
  expect(chosenTriples(triples, 'phase', 1)).toEqual({ chosen: [1, 2, 3], noisy: 0, dependent: 1 });
  expect(chosenTriples(triples, 'phase', 0.25)).toEqual({ chosen: [1, 2], noisy: 2, dependent: 0 });
  expect(chosenTriples(triples, 'amplitude', 9)).toEqual({ chosen: [0, 2, 3], noisy: 1, dependent: 0 });
});

test('recovers a crescent from squared visibilities and triple phases', () => {
  const result = runFit(optical, basis, SETTINGS);
  const { problem, best, at, gains } = result;
  const pixels = imageAt(problem.model, basis, best.x);
  const found = measureRing({ ...basis, pixels });
  const truth = measureRing(withFlux(crescentImage({ ...CRESCENT, blur: Math.hypot(12, 10) }, 2), 1));
  expect(best.converged).toBe(true);
  expect(Math.abs(found.diameter / truth.diameter - 1)).toBeLessThan(0.05);
  expect(Math.abs(angleDifference(found.positionAngleDegrees, 200))).toBeLessThan(15);
  const report = makeReport(result, SETTINGS, drawPosterior(problem.model, best.x, best.curvature, 50, 1));
  expect(report.terms.map(({ term }) => term)).toEqual(['squared visibilities', 'triple phases']);
  for (const term of report.terms) expect(term.reducedChiSquare).toBeLessThan(1.5);
  expect(report.cuts.map(({ term }) => term)).toEqual(['triple-phases']);
  expect(report.rows.squaredVisibilities).toBe(problem.data.squared?.count);
  const { squaredVisibilities, tripleProducts } = makeResiduals(SETTINGS.data, problem.data, [], at, gains);
  expect(squaredVisibilities?.model.length).toBe(problem.data.squared?.count);
  const off = Array.from(
    squaredVisibilities?.model ?? [],
    (model, m) => model - (squaredVisibilities?.value[m] ?? 0),
  );
  expect(Math.sqrt(off.reduce((sum, value) => sum + value * value, 0) / off.length) / 0.01).toBeLessThan(1.3);
  expect(tripleProducts?.modelDegrees.length).toBe(problem.data.triples?.count);
  // Normalised data hold no flux: the image has what was stated, and its draws spread as stated.
  expect(Math.abs(pixels.reduce((a, b) => a + b) - 1)).toBeLessThan(2e-3);
  const draws = withStatedFlux(drawPosterior(problem.model, best.x, best.curvature, 2000, 1), 0.2, 1);
  expect(Math.abs(mean(draws.flux) - 1)).toBeLessThan(4 * (0.2 / Math.sqrt(2000)));
  expect(Math.abs(standardDeviation(draws.flux) / 0.2 - 1)).toBeLessThan(4 / Math.sqrt(4000));
});

test('bears everything that a fit looks at besides', () => {
  const settings = { ...SETTINGS, starts: 1 };
  const result = runFit(optical, basis, settings);
  const { problem, best, gains } = result;
  const { posterior, report } = samplePosterior(problem, best, gains, settings.sampler, {
    count: 50,
    seed: 1,
  });
  expect(posterior.flux.every((value) => Math.abs(value - 1) < 0.01)).toBe(true);
  expect(report.gains).toBe(0);
  expect(report.rHat).toBeLessThan(1.05);
  const leftOut = leaveOutStations(result, settings);
  expect(leftOut.length).toBe(8);
  const heldOut = holdOutBaselines(result, settings);
  // All data together 1.0; unseen ones have the image's errors besides.
  expect(heldOut?.rms).toBeLessThan(1.5);
  const models = compareModels(problem, best.x);
  expect(models.ringPreferred).toBe(true);
  expect(posteriorVariants(result, 1).map(({ role }) => role)).toEqual(['gains fixed']);
  const full = makeReport(result, settings, posterior, { sampler: report, leftOut, heldOut });
  expect(full.flux.measured).toBe(false);
  expect(full.stations[0]?.terms.map(({ term }) => term)).toEqual(['squared visibilities', 'triple phases']);
  expect(() => JSON.stringify(full)).not.toThrow();
});

test('names what the data lack, and rows that are no measurement', () => {
  const only = { ...optical, triples: undefined } as unknown as Visibilities;
  expect(() => runFit(only, basis, SETTINGS)).toThrow(
    'parameter data: no-data: expected data terms that the input holds; triple-phases need triple products, got none of them. Name terms that the data have.',
  );
  const squared = optical.squared as NonNullable<Visibilities['squared']>;
  const broken = { ...squared, sigma: squared.sigma.map((value, r) => (r === 2 ? -1 : value)) };
  expect(() => runFit({ ...optical, squared: broken }, basis, SETTINGS)).toThrow(
    /^input visibilities, squared visibility 3: bad-row: expected finite numbers and errors above 0, got u .* with an error of -1\. Drop what is flagged or without weight\.$/,
  );
});
