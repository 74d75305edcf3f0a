/** Geometric models on invented data from closed forms: what was put in comes out, and only rings are rings. */

import { beforeAll, expect, test } from 'vitest';
import type { Basis, Visibilities } from '../../../stages/data.ts';
import { type FitProblem, fitClosures, makeTerms } from '../../../stages/imaging/fit-problem.ts';
import { compareModels } from '../../../stages/imaging/geometric/compare-models.ts';
import { selectRows } from '../../../stages/imaging/select-rows.ts';
import { observe as observeAgain } from '../../../stages/imaging/synthetic.ts';
import { centredModel, type Model, makePart } from '../../../stages/numerics/models.ts';
import { double, ellipticalGaussian, uniformDisc } from '../../../stages/numerics/named-models.ts';
import { crescentImage, observe } from '../fit/synthetic-data.ts';
import { UAS } from '../numerics/ring-images.ts';

const DEVIATIONS = new Float64Array(8).fill(0.1);
let template: Visibilities;
const basis = { nx: 40, ny: 40, pixelRadians: 4 * UAS } as Basis;

beforeAll(() => {
  const image = crescentImage({ diameter: 44, blur: 14, b: 0.2, angle: 70 });
  template = selectRows(observe(image, { scans: 8, noise: 0.005 }), 1e8, 1e11).data;
});

function compare(
  source: Model,
  seed = 1,
  terms: Parameters<typeof makeTerms>[0] = 'closure-phases-and-amplitudes',
) {
  const model = centredModel(source);
  const parts = model.parts.map((part) => ({ ...part, flux: 0.8 * part.flux }));
  const data = observeAgain(template, { ...model, parts }, { gainDeviations: DEVIATIONS, seed });
  const sets = fitClosures(data, 2.5);
  const problem = {
    data,
    sets,
    basis,
    deviations: DEVIATIONS,
    terms: makeTerms(terms, data, sets, DEVIATIONS),
    model: { flux: 0.8, ramp: null },
  } as unknown as FitProblem;
  return compareModels(problem, new Float64Array(3));
}

const ring = (diameter: number, width: number, b = 0, brightest = 0, floor = 0): Model => ({
  parts: [
    makePart('ring', { length: diameter * UAS, flux: 1 - floor, asymmetry: b, brightest }),
    makePart('disc', { length: diameter * UAS, flux: floor }),
  ],
  blur: width * UAS,
});

// Identity: the model's own parameters, within five of its standard deviations and in all within 6 %.
test('finds the ring that was put in', () => {
  const found = compare(ring(46, 12, 0.25, (150 * Math.PI) / 180, 0.05));
  expect(found.ringPreferred).toBe(true);
  expect(found.sentence).toMatch(/^The data prefer a dark centre: .* \(ring\)/);
  const fitted = found.models.find(({ model }) => model === 'ring');
  if (fitted === undefined) throw new Error('no ring among the models');
  expect(fitted.converged).toBe(true);
  for (const [name, expected] of [
    ['diameter', 46],
    ['width', 12],
    ['asymmetry', 0.25],
    ['position-angle', 150],
  ] as const) {
    const { value, deviation } = fitted.parameters[name];
    expect(Math.abs(value - expected)).toBeLessThan(5 * deviation);
    expect(Math.abs(value / expected - 1)).toBeLessThan(0.06);
    expect(deviation).toBeGreaterThan(0);
  }
});

test.each<[string, Model]>([
  ['a filled disc', { ...uniformDisc(45 * UAS), blur: 6 * UAS }],
  ['an elliptical Gaussian', ellipticalGaussian(40 * UAS, 28 * UAS, 1)],
  ['a double', { ...double(0.6, 30 * UAS, 20 * UAS), blur: 12 * UAS }],
  [
    'a disc with a bright edge',
    {
      parts: [
        makePart('disc', { length: 50 * UAS, flux: 0.8 }),
        makePart('ring', { length: 50 * UAS, flux: 0.2 }),
      ],
      blur: 5 * UAS,
    },
  ],
])('does not take %s for a ring', (_name, source) => {
  const found = compare(source);
  expect(found.ringPreferred).toBe(false);
  expect(found.sentence).toContain('do not prefer a dark centre');
});

test.each<[string, Model]>([
  ['an even ring', ring(42, 14)],
  ['a small ring', ring(32, 9, 0.2, 2)],
  ['a ring with a floor', ring(46, 12, 0.2, 1, 0.15)],
  [
    'a ring with a spot',
    {
      parts: [
        makePart('ring', { length: 44 * UAS, flux: 0.8 }),
        makePart('gaussian', { length: 10 * UAS, flux: 0.2, x: 18 * UAS, y: 12 * UAS }),
      ],
      blur: 10 * UAS,
    },
  ],
])('takes %s for one', (_name, source) => {
  expect(compare(source).ringPreferred).toBe(true);
});

test('works with closures alone', () => {
  expect(compare(ring(44, 12, 0.2, 1), 2, 'closure-phases-and-log-closure-amplitudes').ringPreferred).toBe(
    true,
  );
});
