/** The data terms: derivatives against differences, invariance under gains and phases of stations, bias at low
 *  signal-to-noise. */

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
import { makeObjective } from '../../../stages/imaging/objective.ts';
import { makePositivityTerm } from '../../../stages/imaging/positivity-term.ts';
import { selectRows } from '../../../stages/imaging/select-rows.ts';
import { makeExpansion, mirror, type Term } from '../../../stages/imaging/term.ts';
import { randomStream } from '../../../stages/numerics/random.ts';
import { crescentImage, makeLibraryBasis, observe, slowVisibility, withFlux } from './synthetic-data.ts';

let basis: Basis;
let data: Visibilities;
let model: LinearModel;
let x: Float64Array;

beforeAll(() => {
  basis = makeLibraryBasis(6, 60);
  const truth = withFlux(crescentImage({ diameter: 44, blur: 14, b: 0.2, angle: 70 }), 0.8);
  data = selectRows(observe(truth, { scans: 6, gains: 0.05, stationPhases: true }), 1e8, 1e11).data;
  const B = basisVisibilities(basis, data.u, data.v);
  model = makeLinearModel(B, basis.eigenvalues, { flux: 0.7, fluxWidth: 0.5, priorWidth: 2 });
  x = Float64Array.of(0.2, -0.3, 0.25, 0.1, -0.2, 0.15, 0.05);
});

const terms: [string, () => Term][] = [
  ['complex visibilities', () => makeComplexTerm(data)],
  ['closure phases', () => makeClosurePhaseTerm(data, fitClosures(data, 2.5))],
  ['log closure amplitudes', () => makeLogClosureAmplitudeTerm(data, fitClosures(data, 2.5))],
  ['amplitudes with gains', () => makeAmplitudeTerm(data, new Float64Array(8).fill(0.1))],
];

test.each(terms)('gives the gradient of %s as differences do', (_name, make) => {
  const term = make();
  const out = makeExpansion(x.length);
  const cost = term.expand(predict(model, x), model, out);
  expect(cost).toBeCloseTo(term.cost(predict(model, x)), 9);
  const at = (k: number, h: number) => {
    const moved = Float64Array.from(x);
    moved[k] += h;
    return term.cost(predict(model, moved));
  };
  for (let k = 0; k < x.length; k++) {
    const slope = (at(k, 1e-5) - at(k, -1e-5)) / 2e-5;
    // Central differences: relative error of h^2 and of rounding over h.
    expect(Math.abs(out.gradient[k] - slope)).toBeLessThan(1e-5 * (Math.abs(slope) + 1e-4 * cost));
  }
});

test('gives the curvature of complex visibilities exactly, and the gains the Schur complement', () => {
  const term = makeComplexTerm(data);
  const [a, b] = [makeExpansion(x.length), makeExpansion(x.length)];
  term.expand(predict(model, x), model, a);
  term.expand(
    predict(
      model,
      x.map((value) => value + 0.5),
    ),
    model,
    b,
  );
  mirror(a);
  b.gradient.forEach((value, i) => {
    let expected = a.gradient[i];
    for (let j = 0; j < x.length; j++) expected += 0.5 * a.curvature[i * x.length + j];
    expect(Math.abs(value / expected - 1)).toBeLessThan(1e-9);
  });
  // Free gains take information away; gains held at 1 leave all of it.
  const diagonal = (tau: number) => {
    const out = makeExpansion(x.length);
    makeAmplitudeTerm(data, new Float64Array(8).fill(tau)).expand(predict(model, x), model, out);
    return out.curvature[0];
  };
  expect(diagonal(0.1)).toBeLessThan(0.5 * diagonal(1e-4));
  expect(diagonal(0.1)).toBeGreaterThan(diagonal(1));
});

test('has the predicted visibilities that a slow sum over the image has, the blur taken out', () => {
  const at = predict(model, x);
  const pixels = basis.mean.map(
    (value, p) =>
      value * 0.7 * (1 + 0.5 * x[0]) +
      basis.components.reduce(
        (sum, c, k) => sum + c[p] * x[k + 1] * 0.7 * 2 * Math.sqrt(basis.eigenvalues[k]),
        0,
      ),
  );
  for (const r of [0, 7, data.count - 1]) {
    const [re, im] = slowVisibility({ ...basis, pixels }, data.u[r], data.v[r]);
    // Transform of the basis' Gaussian of 10 uas: Bracewell, ch. 6.
    const q2 = (data.u[r] ** 2 + data.v[r] ** 2) * basis.resolutionRadians ** 2;
    const blur = Math.exp((-(Math.PI ** 2) * q2) / (4 * Math.LN2));
    expect(at.re[r]).toBeCloseTo(re / blur, 10);
    expect(at.im[r]).toBeCloseTo(im / blur, 10);
  }
});

test('does not see phases of stations in closures, nor gains in closures', () => {
  const random = randomStream(5, 'turn');
  const turns = Array.from({ length: 8 }, () => [random.between(-3, 3), random.between(0.5, 2)]);
  const gain = (r: number) => turns[data.station1[r]][1] * turns[data.station2[r]][1];
  const turn = (r: number) => turns[data.station1[r]][0] - turns[data.station2[r]][0];
  const re = data.re.map(
    (value, r) => gain(r) * (value * Math.cos(turn(r)) - data.im[r] * Math.sin(turn(r))),
  );
  const im = data.im.map(
    (value, r) => gain(r) * (value * Math.cos(turn(r)) + data.re[r] * Math.sin(turn(r))),
  );
  const turned = { ...data, re, im, sigma: data.sigma.map((value, r) => value * gain(r)) };
  for (const make of [makeClosurePhaseTerm, makeLogClosureAmplitudeTerm]) {
    const before = make(data, fitClosures(data, 2.5)).chiSquare(predict(model, x));
    const after = make(turned, fitClosures(turned, 2.5)).chiSquare(predict(model, x));
    expect(Math.abs(after / before - 1)).toBeLessThan(1e-9);
  }
});

test('finds gains that were put in', () => {
  const at = predict(model, x);
  const g = [0.1, 0.05, -0.2, 0, 0.15, -0.1, 0.3, -0.05];
  const re = at.re.map((value, r) => value * Math.exp(g[data.station1[r]] + g[data.station2[r]]));
  const im = at.im.map((value, r) => value * Math.exp(g[data.station1[r]] + g[data.station2[r]]));
  const exact = { ...data, re, im, sigma: data.sigma.map(() => 1e-5) };
  const term = makeAmplitudeTerm(exact, new Float64Array(8).fill(1));
  for (const scan of term.gains(at).filter(({ stations }) => stations.length >= 4)) {
    scan.stations.forEach((station, place) => {
      expect(Math.abs(scan.logGains[place] - g[station])).toBeLessThan(1e-3);
    });
  }
});

test.each([1, 2, 3])('fits amplitudes at signal-to-noise %d without bias', (snr) => {
  // A flux alone, gains known, 2000 amplitudes under noise: the estimate within 4 standard errors of the truth.
  const rows = 2000;
  const random = randomStream(snr, 'low');
  const filled = (value: number) => new Float64Array(rows).fill(value);
  const point: Visibilities = {
    ...data,
    count: rows,
    station1: new Int32Array(rows),
    station2: new Int32Array(rows).fill(1),
    scan: Int32Array.from({ length: rows }, (_, r) => r),
    u: filled(0),
    v: filled(0),
    re: filled(0).map(() => 1 + random.normal() / snr),
    im: filled(0).map(() => random.normal() / snr),
    sigma: filled(1 / snr),
    sigmaPhase: filled(1),
  };
  const B = { columns: 1, re: filled(1), im: filled(0) };
  const flat = makeLinearModel(B, new Float64Array(0), { flux: 1, fluxWidth: 1, priorWidth: 1 });
  const term = makeAmplitudeTerm(point, new Float64Array(8).fill(1e-3));
  const objective = makeObjective(flat, [term], null);
  let y = new Float64Array(1);
  for (let step = 0; step < 30; step++) {
    const { gradient, curvature } = objective.expand(y);
    y = y.map((value) => value - gradient[0] / curvature[0]);
  }
  const { curvature } = objective.expand(y);
  expect(Math.abs(y[0])).toBeLessThan(4 / Math.sqrt(curvature[0]));
});

test('charges negative pixels only, with the right gradient', () => {
  const term = makePositivityTerm(basis, model, 3);
  expect(term.cost(new Float64Array(7))).toBe(0);
  const dark = x.map((value) => 4 * value);
  const out = makeExpansion(7);
  const cost = term.expand(dark, out);
  expect(cost).toBeGreaterThan(0);
  expect(makePositivityTerm(basis, model, 6).cost(dark) / cost).toBeCloseTo(2, 9);
  for (let k = 0; k < 7; k++) {
    const at = (h: number) => term.cost(dark.map((value, i) => (i === k ? value + h : value)));
    const slope = (at(1e-5) - at(-1e-5)) / 2e-5;
    expect(Math.abs(out.gradient[k] - slope)).toBeLessThan(1e-5 * (Math.abs(slope) + 1e-3 * cost));
  }
});
