/** The kind `combine`: the mean of sets that agree and of sets that do not. */

import { expect, test } from 'vitest';
import { memorySink, sourceOf } from '../../../stages/bytes.ts';
import { combineSets, stepTo } from '../../../stages/combine/combine-sets.ts';
import { compute } from '../../../stages/combine/compute.ts';
import type { NumberValue } from '../../../stages/data.ts';
import { readNumbers, writeNumbers } from '../../../stages/formats/json.ts';
import { randomStream } from '../../../stages/numerics/random.ts';

// By hand from DerSimonian and Laird 1986: weights 4 and 4, Q = 2, tau^2 = (2 - 1) / (8 - 32/8) = 1/4, weights 2 and 2.
// Probability of a chi-square above 2 with one degree of freedom: Abramowitz and Stegun, table 26.7, 0.15730.
test('combines two sets as by hand', () => {
  const found = combineSets([
    { value: 1, deviation: 0.5 },
    { value: 2, deviation: 0.5 },
  ]);
  expect(found).toMatchObject({
    value: 1.5,
    deviation: 0.5,
    between: 0.5,
    chiSquare: 2,
    degreesOfFreedom: 1,
  });
  expect(found.probability).toBeCloseTo(0.1573, 4);
  expect(found.sets.map(({ weight }) => weight)).toEqual([0.5, 0.5]);
  // Hartung and Knapp 2001: q = (2/4 + 2/4) / 1 = 1, variance 1 / 4; quantile of one degree of freedom: tan(0.34 pi).
  expect(found.deviationByScatter).toBeCloseTo(0.5, 14);
  expect(stepTo(0.84, found)).toBeCloseTo(0.5 * Math.tan(0.34 * Math.PI), 12);
});

// statsmodels 0.15.0, combine_effects(value, variance, method_re='chi2', use_t=False): tau2, q, sd_eff_w_re, mean_effect_re,
// weights_rel_re. The data are the worked example of its guide to meta-analysis (from memory).
test('gives what an independent package gives', () => {
  const values = [61.0, 61.4, 62.21, 62.3, 62.34, 62.6, 62.7, 62.84, 65.9];
  const variances = [0.2025, 1.21, 0.09, 0.2025, 0.3844, 0.5625, 0.0676, 0.0225, 1.8225];
  const found = combineSets(values.map((value, k) => ({ value, deviation: Math.sqrt(variances[k]) })));
  expect(found.between * found.between).toBeCloseTo(0.2880492469740799, 10);
  // There a difference of two sums of 3e5: good to 1e-10.
  expect(found.chiSquare).toBeCloseTo(24.80189774185419, 8);
  expect(found.value).toBeCloseTo(62.39013860445034, 10);
  expect(found.deviation).toBeCloseTo(0.24574966804039602, 10);
  expect(found.sets[7].weight).toBeCloseTo(0.19447125, 7);
  // The same with use_t=True: sd_eff_w_re_hksj and the interval of 95 % of `random effect wls`, by Hartung and Knapp.
  expect(found.deviationByScatter).toBeCloseTo(0.29477605699884035, 10);
  expect(found.value + stepTo(0.025, found)).toBeCloseTo(61.710383798051836, 9);
  expect(found.value + stepTo(0.975, found)).toBeCloseTo(63.06989341084885, 9);
});

// By hand: equal sets have no variance between them, and weights 100 and 25.
test('is the plain weighted mean where sets agree', () => {
  const found = combineSets([
    { value: 40, deviation: 0.1 },
    { value: 40.1, deviation: 0.2 },
  ]);
  expect(found.between).toBe(0);
  expect(found.value).toBeCloseTo(40.02, 10);
  expect(found.deviation).toBeCloseTo(1 / Math.sqrt(125), 12);
});

// Identity: sets drawn with a known variance between them; the result covers the truth as often as it says, few or many.
test('covers the truth where sets scatter, however few they are', () => {
  const random = randomStream(8, 'sets');
  const trials = 1000;
  for (const count of [2, 4, 12]) {
    const inside = { 68: 0, 95: 0 };
    for (let k = 0; k < trials; k++) {
      const sets = Array.from({ length: count }, () => ({
        value: 42 + random.normal() + 0.5 * random.normal(),
        deviation: 0.5,
      }));
      const found = combineSets(sets);
      const off = Math.abs(found.value - 42);
      if (off < stepTo(0.84, found)) inside[68]++;
      if (off < stepTo(0.975, found)) inside[95]++;
    }
    // Student's t is exact for equal errors; the interval of sets that agree adds a few hundredths. Binomial, four deviations.
    expect(inside[68] / trials, `${count} sets`).toBeGreaterThan(0.68 - 0.06);
    expect(inside[68] / trials, `${count} sets`).toBeLessThan(0.71 + 0.06);
    expect(inside[95] / trials, `${count} sets`).toBeGreaterThan(0.95 - 0.028);
  }
});

const number = (value: number, half: number, unit: string): NumberValue => ({
  value,
  unit,
  low: value - half,
  high: value + half,
  low95: value - 2 * half,
  high95: value + 2 * half,
  definition: 'invented',
});

function combined(names: readonly string[], documents: readonly Record<string, NumberValue>[]) {
  const sources = documents.map((values, k) => {
    const sink = memorySink();
    writeNumbers(sink, { values, remarks: ['invented data'] });
    return sourceOf(sink.bytes(), `set ${k + 1}`);
  });
  const outputs = { numbers: memorySink(), report: memorySink() };
  const report = compute({
    inputs: { numbers: sources },
    parameters: { names },
    outputs,
    note: () => {},
    progress: () => {},
  });
  return { report, numbers: readNumbers(sourceOf(outputs.numbers.bytes())) };
}

test('takes angles round the circle, and warns of sets that disagree', () => {
  const { numbers, report } = combined(
    ['position-angle', 'diameter'],
    [
      { 'position-angle': number(355, 8, 'deg'), diameter: number(40, 0.2, 'uas') },
      { 'position-angle': number(7, 8, 'deg'), diameter: number(42, 0.2, 'uas') },
    ],
  );
  expect(numbers.values['position-angle'].value).toBeCloseTo(1, 6);
  expect(numbers.values.diameter.value).toBeCloseTo(41, 6);
  expect((numbers.values.diameter.high ?? 0) - 41).toBeGreaterThan(0.9);
  expect(numbers.remarks).toEqual([
    expect.stringContaining('count their sets as independent'),
    'invented data',
  ]);
  expect(report.warnings).toEqual([
    expect.stringMatching(/^diameter: the sets disagree beyond their errors/),
  ]);
});

// By hand: weights 1 and 1/900 about the mean direction; the first set's 355 rules, and no angle is below 0.
test('gives an angle in [0, 360), and an interval as wide as that of the set that rules', () => {
  const { numbers } = combined(
    ['position-angle'],
    [{ 'position-angle': number(355, 1, 'deg') }, { 'position-angle': number(7, 30, 'deg') }],
  );
  const { value, low, high } = numbers.values['position-angle'];
  expect(value).toBeCloseTo(355 + 12 / 901, 8);
  expect(((high ?? 0) - (low ?? 0)) / 2).toBeCloseTo(1 / Math.sqrt(1 + 1 / 900), 8);
});

test('refuses what cannot be combined', () => {
  const one = { diameter: number(40, 1, 'uas') };
  expect(() => combined(['diameter'], [one])).toThrow('two documents or more');
  expect(() => combined(['width'], [one, one])).toThrow(
    'set 1, width: cannot-combine: expected a number of that name, got diameter',
  );
  expect(() => combined(['diameter'], [one, { diameter: number(40, 1, 'mas') }])).toThrow(
    'expected the unit uas, as in set 1, got mas',
  );
  const { low: _, ...bare } = number(40, 1, 'uas');
  expect(() => combined(['diameter'], [one, { diameter: bare }])).toThrow(
    'expected a number with a 68 % interval',
  );
});
