/** The sampler of a fit: gradients against differences, the linear case against its closed form, targets that are missed. */

import { beforeAll, expect, test } from 'vitest';
import type { Basis, Visibilities } from '../../../stages/data.ts';
import { makeAmplitudeTerm } from '../../../stages/imaging/amplitude-term.ts';
import { makeClosurePhaseTerm, makeLogClosureAmplitudeTerm } from '../../../stages/imaging/closure-terms.ts';
import { makeComplexTerm } from '../../../stages/imaging/complex-term.ts';
import { fitClosures } from '../../../stages/imaging/fit-problem.ts';
import {
  basisVisibilities,
  type LinearModel,
  makeLinearModel,
  predict,
} from '../../../stages/imaging/linear-model.ts';
import { makePositivityTerm } from '../../../stages/imaging/positivity-term.ts';
import { posteriorVariants } from '../../../stages/imaging/posterior-variants.ts';
import { runFit } from '../../../stages/imaging/run-fit.ts';
import { samplePosterior } from '../../../stages/imaging/sampler.ts';
import { selectRows } from '../../../stages/imaging/select-rows.ts';
import type { FitSettings } from '../../../stages/imaging/settings.ts';
import { makeStraightening } from '../../../stages/imaging/straightening.ts';
import type { Term } from '../../../stages/imaging/term.ts';
import { cholesky, invertCholesky } from '../../../stages/numerics/linear.ts';
import { mean, standardDeviation } from '../../../stages/numerics/statistics.ts';
import { crescentImage, makeLibraryBasis, observe, withFlux } from '../fit/synthetic-data.ts';

const SETTINGS: FitSettings = {
  data: 'closure-phases-and-amplitudes',
  components: 8,
  priorWidth: 2,
  fluxPrior: 0.5,
  shortest: 0.1,
  gainPriors: { usual: 0.1, stations: {} },
  minimumSnr: 2.5,
  positivity: 1,
  starts: 2,
  posterior: 'sampled',
  sampler: { chains: 4, warmUp: 80, draws: 100, most: 200, rHat: 1.05, ess: 100 },
  samples: 200,
  seed: 1,
};

let basis: Basis;
let all: Visibilities;

beforeAll(() => {
  basis = makeLibraryBasis(8, 60);
  const truth = withFlux(crescentImage({ diameter: 44, blur: 14, b: 0.2, angle: 70 }), 0.8);
  all = observe(truth, { scans: 12, gains: 0.05, stationPhases: true, noise: 0.005 });
});

test.each<[string, (data: Visibilities) => Term]>([
  ['complex visibilities', (data) => makeComplexTerm(data)],
  ['closure phases', (data) => makeClosurePhaseTerm(data, fitClosures(data, 2.5))],
  ['log closure amplitudes', (data) => makeLogClosureAmplitudeTerm(data, fitClosures(data, 2.5))],
  ['amplitudes with gains', (data) => makeAmplitudeTerm(data, new Float64Array(8).fill(0.1))],
])('gives the slopes of %s by every visibility as differences do', (_name, make) => {
  const { data } = selectRows(all, 1e8, 1e11);
  const B = basisVisibilities(basis, data.u, data.v);
  const model = makeLinearModel(B, basis.eigenvalues, { flux: 0.7, fluxWidth: 0.5, priorWidth: 2 });
  const at = predict(model, Float64Array.of(0.2, -0.3, 0.25, 0.1));
  const term = make(data);
  const out = { re: new Float64Array(data.count), im: new Float64Array(data.count) };
  const cost = term.adjoint(at, out);
  expect(cost).toBeCloseTo(term.cost(at), 8);
  for (const part of ['re', 'im'] as const) {
    for (let r = 0; r < data.count; r += 7) {
      const moved = (h: number) => {
        const values = Float64Array.from(at[part]);
        values[r] += h;
        return term.cost({ ...at, [part]: values });
      };
      const h = 1e-6;
      const slope = (moved(h) - moved(-h)) / (2 * h);
      expect(Math.abs(out[part][r] - slope)).toBeLessThan(1e-5 * Math.abs(slope) + 1e-6 * cost);
    }
  }
});

test('gives the slopes of amplitudes by explicit gains, and of positivity, as differences do', () => {
  const { data } = selectRows(all, 1e8, 1e11);
  const B = basisVisibilities(basis, data.u, data.v);
  const model = makeLinearModel(B, basis.eigenvalues, { flux: 0.7, fluxWidth: 0.5, priorWidth: 2 });
  const x = Float64Array.of(0.2, -1.3, 1.25, 0.9, -2, 1);
  const at = predict(model, x);
  const explicit = makeAmplitudeTerm(data, new Float64Array(8).fill(0.1)).explicit();
  const h = Float64Array.from({ length: explicit.count }, (_, k) => ((k % 5) - 2) / 3);
  const scratch = () => ({ re: new Float64Array(data.count), im: new Float64Array(data.count) });
  const slopes = new Float64Array(h.length);
  explicit.adjoint(at, h, scratch(), slopes);
  const costAt = (k: number, step: number) => {
    const moved = Float64Array.from(h);
    moved[k] += step;
    return explicit.adjoint(at, moved, scratch(), new Float64Array(h.length));
  };
  for (let k = 0; k < h.length; k += 5) {
    const slope = (costAt(k, 1e-5) - costAt(k, -1e-5)) / 2e-5;
    expect(Math.abs(slopes[k] - slope)).toBeLessThan(1e-5 * Math.abs(slope) + 1e-4);
  }
  const positivity = makePositivityTerm(basis, model, 1);
  const gradient = new Float64Array(x.length);
  expect(positivity.adjoint(x, gradient)).toBeCloseTo(positivity.cost(x), 9);
  expect(positivity.cost(x)).toBeGreaterThan(0.1);
  for (let k = 0; k < x.length; k++) {
    const moved = (step: number) => positivity.cost(x.map((value, i) => (i === k ? value + step : value)));
    const slope = (moved(1e-5) - moved(-1e-5)) / 2e-5;
    expect(Math.abs(gradient[k] - slope)).toBeLessThan(1e-5 * Math.abs(slope) + 1e-4);
  }
});

// Bishop, Pattern Recognition and Machine Learning, eqs. 3.50 and 3.51: with a linear model the posterior is a Gaussian
// about the optimum whose covariance is the inverse of the curvature.
test('samples the closed form where the model is linear', () => {
  const settings: FitSettings = {
    ...SETTINGS,
    data: 'complex-visibilities',
    centroid: 'fixed',
    positivity: 0,
    flux: 0.8,
  };
  const { problem, best, gains } = runFit(
    observe(withFlux(crescentImage({ diameter: 44, blur: 14, b: 0.2, angle: 70 }), 0.8), {
      scans: 4,
      noise: 0.05,
    }),
    basis,
    settings,
  );
  const n = best.x.length;
  const L = cholesky(best.curvature, n) as Float64Array;
  const covariance = invertCholesky(L, n);
  const sampler = { ...SETTINGS.sampler, draws: 800, most: 800 };
  const { posterior, report } = samplePosterior(problem, best, gains, sampler, { count: 3200, seed: 5 });
  expect(report.met).toBe(true);
  const flux = problem.model.flux + problem.model.scales[0] * best.x[0];
  const deviation = problem.model.scales[0] * Math.sqrt(covariance[0]);
  expect(Math.abs(mean(posterior.flux) - flux)).toBeLessThan(
    4 * report.flux.mcseMean * problem.model.scales[0],
  );
  expect(Math.abs(standardDeviation(posterior.flux) / deviation - 1)).toBeLessThan(0.06);
  for (let k = 0; k < posterior.components; k++) {
    const values = Float64Array.from(
      { length: 3200 },
      (_, s) => posterior.coefficients[s * posterior.components + k],
    );
    const expected = problem.model.scales[k + 1] * Math.sqrt(covariance[(k + 1) * n + k + 1]);
    expect(Math.abs(standardDeviation(values) / expected - 1)).toBeLessThan(0.08);
  }
});

test('says whether its targets are met, and goes on until they are or the limit is reached', () => {
  const { problem, best, gains } = runFit(all, basis, SETTINGS);
  const run = (ess: number) =>
    samplePosterior(problem, best, gains, { ...SETTINGS.sampler, ess }, { count: 100, seed: 2 }).report;
  const easy = run(50);
  expect(easy).toMatchObject({ met: true, draws: 400, divergences: 0 });
  expect(easy.rHat).toBeLessThan(1.05);
  expect(run(1e6)).toMatchObject({ met: false, draws: 800 });
});

test('has narrower errors while the gains are held', () => {
  const result = runFit(all, basis, SETTINGS);
  const [fixed] = posteriorVariants(result, 1);
  const { posterior } = samplePosterior(result.problem, result.best, result.gains, SETTINGS.sampler, {
    count: 200,
    seed: 1,
  });
  expect(fixed?.role).toBe('gains fixed');
  expect(standardDeviation(fixed?.posterior.flux ?? [])).toBeLessThan(
    0.7 * standardDeviation(posterior.flux),
  );
});

// Identity: the energy of straight coordinates by differences; and the valley F e^{2g} = constant is straight.
test('straightens the valley of flux and gains, with the slopes that differences have', () => {
  const model = { flux: 0.8, scales: Float64Array.of(0.4) } as unknown as LinearModel;
  const scales = Float64Array.of(0.1, 0.3, 0.5);
  const best = Float64Array.of(0.3);
  const { apply, pullBack } = makeStraightening(model, best, scales);
  const top = 0.8 + 0.4 * 0.3;
  // Any energy of x and h, with its slopes.
  const weights = [0.7, -1.1, 0.4];
  const energyAt = (x: number, coordinates: readonly number[]) => {
    const h = Float64Array.from(coordinates);
    apply(Float64Array.of(x), h);
    const sum = h.reduce((total, value, i) => total + (weights[i] as number) * value, 0);
    return { energy: (sum * sum) / 2 + Math.sin(x), sum, h };
  };
  for (const x of [-2.2, -1.9, -1, 0.3, 1.5]) {
    const coordinates = [0.2, -0.4, 1.3];
    const { sum } = energyAt(x, coordinates);
    const slopeX = Float64Array.of(Math.cos(x));
    pullBack(
      Float64Array.of(x),
      slopeX,
      Float64Array.from(weights, (weight) => sum * weight),
    );
    const difference =
      (energyAt(x + 1e-6, coordinates).energy - energyAt(x - 1e-6, coordinates).energy) / 2e-6;
    expect(Math.abs((slopeX[0] as number) - difference)).toBeLessThan(1e-6 * (1 + Math.abs(difference)));
  }
  // Along g = -ln(F/F*)/2 the coordinates change in proportion to the flux.
  const bend = (x: number) => {
    const flux = 0.8 + 0.4 * x;
    const g = -Math.log(flux / top) / 2;
    const zero = energyAt(x, [0, 0, 0]).h[0] as number;
    return { coordinate: g / 0.1 - zero, straight: -(flux / top - 1) / 2 / 0.1 };
  };
  for (const x of [-0.8, 0, 1, 2]) expect(bend(x).coordinate).toBeCloseTo(bend(x).straight, 9);
});
