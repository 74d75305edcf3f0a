/** The kind `features`: numbers from draws whose rings are known, and what is no ring. */

import { expect, test } from 'vitest';
import { memorySink, sourceOf } from '../../../stages/bytes.ts';
import type { Basis, Posterior } from '../../../stages/data.ts';
import { compute } from '../../../stages/features/compute.ts';
import { writeBasis } from '../../../stages/formats/basis.ts';
import { readJson, readNumbers } from '../../../stages/formats/json.ts';
import { writePosterior } from '../../../stages/formats/posterior.ts';
import { writeSkyImage } from '../../../stages/formats/sky-image.ts';
import { errorParts, partsRemark } from '../../../stages/imaging/error-parts.ts';
import { measureDraws } from '../../../stages/imaging/measure-draws.ts';
import type { BiasOfQuantity, MethodBias } from '../../../stages/imaging/method-bias.ts';
import { makeRingNumbers, widthViolated } from '../../../stages/imaging/ring-numbers.ts';
import { ringVerdict } from '../../../stages/imaging/ring-verdict.ts';
import { blurredRingImage, imageOf, UAS } from '../numerics/ring-images.ts';

const GRID = { nx: 64, pixel: 2.5 };

function unit(pixels: Float64Array): Float64Array {
  const total = pixels.reduce((a, b) => a + b);
  return pixels.map((value) => value / total);
}

/** A basis whose mean is one image and whose only component leads to another: coefficient = flux * t mixes them. */
function between(from: Float64Array, to: Float64Array): Basis {
  const [mean, other] = [unit(from), unit(to)];
  return {
    ...GRID,
    ny: GRID.nx,
    pixelRadians: GRID.pixel * UAS,
    resolutionRadians: 0,
    mean,
    components: [other.map((value, p) => value - mean[p])],
    eigenvalues: Float64Array.of(1),
    totalVariance: 1,
    scores: new Float64Array(1),
    families: ['ring'],
  };
}

function draws(mixing: readonly number[], flux = 0.7): Posterior {
  return {
    count: mixing.length,
    components: 1,
    flux: new Float64Array(mixing.length).fill(flux),
    coefficients: Float64Array.from(mixing, (t) => t * flux),
  };
}

const ring = (options: object) =>
  blurredRingImage({ ...GRID, diameter: 42, blur: 10, b: 0.2, angle: 40, ...options }).pixels;
const gaussian = imageOf(64, 64, 2.5, (x, y) => Math.exp(-(x * x + y * y) / 500)).pixels;

test('gives the published numbers of a blurred ring when every draw is that ring', () => {
  const posterior = draws(new Array(20).fill(0));
  const { values, remarks } = makeRingNumbers(measureDraws(between(ring({}), gaussian), posterior), {});
  // ring.blurred_features: ridge and radial FWHM of a thin ring of 42 uas blurred by 10 uas (mpmath).
  expect(Math.abs(values.diameter.value - 41.1131569885504)).toBeLessThan(0.01);
  expect(Math.abs(values.width.value - 10.1146330335936)).toBeLessThan(0.03);
  expect(Math.abs(values['thin-ring-diameter'].value - 42)).toBeLessThan(0.02);
  expect(Math.abs(values.asymmetry.value - 0.2)).toBeLessThan(0.003);
  expect(Math.abs(values['position-angle'].value - 40)).toBeLessThan(0.3);
  expect(values['central-depression'].value).toBeLessThan(0.01);
  expect(values.roundness.value).toBeGreaterThan(0.99);
  expect(values['ring-fraction'].value).toBe(1);
  expect(values.diameter.low).toBe(values.diameter.high95);
  expect(remarks.join(' ')).toContain('It is no picture of a horizon and no proof of one.');
  expect(remarks.join(' ')).toContain("do not hold the method's own bias");
  expect(Object.values(values).map(({ unit: u }) => u)).toEqual(['uas', 'uas', '', 'deg', '', '', 'uas', '']);
});

test('averages position angles across north', () => {
  const posterior = draws([0, 0, 0, 1, 1, 1]);
  const basis = between(ring({ angle: 350 }), ring({ angle: 20 }));
  const { values } = makeRingNumbers(measureDraws(basis, posterior), {});
  const found = values['position-angle'];
  expect(Math.abs(found.value - 5)).toBeLessThan(0.3);
  expect(Math.abs((found.low95 ?? 0) + 10)).toBeLessThan(0.5);
  expect(Math.abs((found.high95 ?? 0) - 20)).toBeLessThan(0.5);
});

test('gives no numbers when most draws have no ring', () => {
  const posterior = draws([0, 1, 1, 1, 1]);
  const measured = measureDraws(between(ring({}), gaussian), posterior);
  const { values, remarks } = makeRingNumbers(measured, { alpha: 10 });
  expect(Object.keys(values)).toEqual(['ring-fraction']);
  expect(values['ring-fraction'].value).toBe(0.2);
  expect(remarks).toEqual(['No ring: 1 of 5 draws have one, so no number of a ring is given.']);
  expect(measured.reasons['no inner half-maximum']).toBe(4);
});

test('gives the angular gravitational radius, the mass, and what they assume', () => {
  const posterior = draws(new Array(4).fill(0));
  const measured = measureDraws(between(ring({}), gaussian), posterior);
  const { values, remarks } = makeRingNumbers(measured, { alpha: 10.392304845413264, distance: 1e7 });
  // shadow.examples: 2e9 suns at 1e7 pc have a diameter of 20.51571652187541 uas (mpmath).
  expect(values['gravitational-radius'].value).toBeCloseTo(values.diameter.value / 10.392304845413264, 10);
  expect(values.mass.value / (2e9 * (values.diameter.value / 20.51571652187541))).toBeCloseTo(1, 10);
  expect(values.mass.unit).toBe('solMass');
  expect(remarks.join(' ')).toContain('assumes that the ring');
  const alone = makeRingNumbers(measured, { distance: 1e7 });
  expect(alone.values.mass).toBeUndefined();
  expect(alone.remarks).toContain('A distance without alpha gives no mass: state alpha too.');
});

test('warns when the uncertainty of the diameter is not below the width', () => {
  const wide = draws([0, 0, 0, 1, 1, 1]);
  const basis = between(ring({ diameter: 30, blur: 6, b: 0 }), ring({ diameter: 60, blur: 6, b: 0 }));
  const numbers = makeRingNumbers(measureDraws(basis, wide), {});
  expect(widthViolated(numbers)).toMatch(
    /^the diameter's 95 % interval of ±1[45]\.\d uas is not below the ring's width of \d\.\d uas: the posterior holds different images$/,
  );
  const narrow = makeRingNumbers(measureDraws(basis, draws([0, 0, 0])), {});
  expect(widthViolated(narrow)).toBeNull();
});

test('reads files, writes numbers and report, and says `no ring` in both', () => {
  const run = (mixing: readonly number[]) => {
    const [basis, samples, image] = [memorySink(), memorySink(), memorySink()];
    const made = between(ring({}), gaussian);
    writeBasis(basis, made);
    writePosterior(samples, draws(mixing));
    writeSkyImage(image, { ...made, pixels: made.mean });
    const outputs = { ring: memorySink(), report: memorySink() };
    const source = (sink: { bytes(): Uint8Array }, name: string) => [sourceOf(sink.bytes(), name)];
    const report = compute({
      inputs: {
        basis: source(basis, 'basis'),
        samples: source(samples, 'samples'),
        image: source(image, 'image'),
      },
      parameters: {},
      outputs,
      note: () => {},
      progress: () => {},
    });
    return {
      warnings: 'warnings' in report ? report.warnings : [],
      numbers: readNumbers(sourceOf(outputs.ring.bytes())),
      report: readJson(sourceOf(outputs.report.bytes())) as { verdict: string; image: { diameter: number } },
    };
  };
  const found = run([0, 0, 0, 0]);
  expect(found.warnings).toEqual([]);
  expect(found.report.verdict).toBe('ring');
  expect(Math.abs(found.report.image.diameter - 41.1131569885504)).toBeLessThan(0.01);
  const none = run([1, 1, 1, 1]);
  expect(none.warnings).toEqual(['no ring: only 0 % of the draws have one']);
  expect(none.report.verdict).toBe('no ring');
  expect(none.numbers.values.diameter).toBeUndefined();
});

test('refuses samples of another basis', () => {
  const basis = between(ring({}), gaussian);
  const other = { ...draws([0, 0]), components: 2, coefficients: new Float64Array(4) };
  expect(() => measureDraws(basis, other)).toThrow(
    'input samples: wrong-shape: expected at most 1 coefficients a draw, the components of the basis, got 2. Give the basis with which the fit was made.',
  );
  expect(() => measureDraws(basis, draws([0]))).toThrow(
    'input samples: too-few-draws: expected at least two draws, got 1. Raise the parameter `samples` of the fit.',
  );
});

/** A bias that is the same for every size, of 1,000 rings. */
function steadyBias(offset: number, scatter: number): MethodBias {
  const trials = 1000;
  const none: BiasOfQuantity = {
    offset: 0,
    slope: 0,
    centre: 40,
    covariance: [0, 0, 0],
    squares: 0,
    byOwnSpread: false,
    spread: 1,
    scatter: 0,
    trials,
  };
  const ofDiameter = { ...none, offset, scatter, squares: (trials - 1) * scatter * scatter };
  return {
    diameter: ofDiameter,
    width: none,
    asymmetry: none,
    'position-angle': { ...none, centre: 0 },
    'central-depression': none,
  };
}

// Identity: a known bias comes out of the value, and the interval is as wide as the errors of the injected rings.
test("corrects for the method's bias and folds its error in", () => {
  const posterior = draws(new Array(100).fill(0));
  const measured = measureDraws(between(ring({}), gaussian), posterior);
  const { values, remarks } = makeRingNumbers(measured, {}, { bias: steadyBias(-0.8, 0.5) });
  const raw = values['diameter-uncorrected'].value;
  // Of 800 values the median is known to 0.5 * 1.25 / sqrt(800) = 0.02, the ends of the interval to 0.03.
  expect(Math.abs(values.diameter.value - raw - 0.8)).toBeLessThan(0.08);
  const half = ((values.diameter.high ?? 0) - (values.diameter.low ?? 0)) / 2;
  expect(Math.abs(half - 0.5 * 0.994)).toBeLessThan(0.08);
  expect(remarks.join(' ')).toContain('measured on 1000 rings injected into the same coverage');
  expect(remarks.join(' ')).not.toContain("do not hold the method's own bias");
});

test('has no ring where a model without a dark centre explains the data', () => {
  const measured = measureDraws(between(ring({}), gaussian), draws(new Array(10).fill(0)));
  const models = {
    ringPreferred: false,
    centre: 0.9,
    sentence: 'The data do not prefer a dark centre: invented.',
  };
  const { values, remarks } = makeRingNumbers(measured, {}, { models });
  expect(Object.keys(values)).toEqual(['ring-fraction']);
  expect(remarks.join()).toContain('No ring: The data do not prefer a dark centre');
});

test('is undecided where most draws have no ring and a model with a dark centre explains the data', () => {
  const measured = measureDraws(between(ring({}), gaussian), draws([0, 1, 1, 1, 1]));
  const models = { ringPreferred: true, centre: 0.05, sentence: 'The data prefer a ring: invented.' };
  const { values, remarks } = makeRingNumbers(measured, {}, { models });
  expect(Object.keys(values)).toEqual(['ring-fraction']);
  expect(remarks).toEqual([
    'Undecided: 1 of 5 draws have one, though of geometric models one with a dark centre is preferred: The data prefer a ring: invented. No number of a ring is given, since the draws that have one are the clearest.',
  ]);
  expect(ringVerdict(0.2, { ...models, centre: 0.34 })).toBe('no ring');
  expect(ringVerdict(0.02, models)).toBe('no ring');
  expect(ringVerdict(0.2, null)).toBe('no ring');
  expect(ringVerdict(0.9, { ...models, ringPreferred: false })).toBe('no ring');
  expect(ringVerdict(0.5, models)).toBe('ring');
});

// ring.gravitational (check-values, section 8): M = 5e6 suns at 9000 pc (invented) has theta_g = 5.483682618760565 uas.
test('carries the errors of alpha and distance', () => {
  const measured = measureDraws(between(ring({}), gaussian), draws(new Array(200).fill(0)));
  const diameter = makeRingNumbers(measured, {}).values.diameter.value;
  const alpha = diameter / 5.483682618760565;
  const { values } = makeRingNumbers(measured, {
    alpha,
    alphaError: 0.05 * alpha,
    distance: 9000,
    distanceError: 900,
  });
  expect(values['gravitational-radius'].value).toBeCloseTo(5.483682618760565, 0);
  const half = (name: string) =>
    ((values[name].high ?? 0) - (values[name].low ?? 0)) / 2 / values[name].value;
  expect(Math.abs(half('gravitational-radius') - 0.05)).toBeLessThan(0.015);
  // 5 % and 10 % in quadrature.
  expect(Math.abs(half('mass') - Math.hypot(0.05, 0.1))).toBeLessThan(0.03);
  expect(Math.abs(values.mass.value / 5e6 - 1)).toBeLessThan(0.03);
});

test('tells the parts of the error of the diameter', () => {
  const basis = between(ring({ diameter: 40 }), ring({ diameter: 44 }));
  const mixed = measureDraws(basis, draws([0, 0.2, 0.4, 0.6, 0.8, 1]));
  const variants = [
    { role: 'gains fixed' as const, posterior: draws([0.4, 0.45, 0.5, 0.55, 0.6]) },
    { role: 'components' as const, posterior: draws([0.9, 0.9]) },
  ];
  const others = [{ basis, posterior: draws([0.1, 0.1]) }];
  const parts = errorParts(mixed, { basis, variants, others, bias: steadyBias(0, 0.3).diameter });
  expect(Object.keys(parts)).toEqual(['noise', 'calibration', 'components', 'library', 'method']);
  expect(parts.noise).toBeLessThan(parts.calibration ?? 0);
  // Besides 1,000 rings the posterior itself counts for one.
  expect(Math.abs((parts.method ?? 0) - 0.3)).toBeLessThan(0.01);
  expect(parts.components).toBeGreaterThan(0.3);
  const { values } = makeRingNumbers(mixed, {}, { parts });
  expect(values['diameter-error-noise'].unit).toBe('uas');
  expect(partsRemark(parts)).toMatch(
    /that of the components is \d\.\d\d uas; that of the library is \d\.\d\d uas\.$/,
  );
  expect(partsRemark({})).toContain('was not looked at; the second is not known');
});
