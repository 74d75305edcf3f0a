/** The kind `recovery-summary`: coverage, ranks and targets from observations whose errors are known. */

import { expect, test } from 'vitest';
import { memorySink, sourceOf } from '../../../stages/bytes.ts';
import { readNumbers, writeJson } from '../../../stages/formats/json.ts';
import { randomStream } from '../../../stages/numerics/random.ts';
import { compute } from '../../../stages/recovery-summary/compute.ts';
import {
  judge,
  proportionOf,
  type SuiteTrial,
  summarise,
  uniformityOf,
} from '../../../stages/recovery-summary/summarise.ts';

const QUANTITIES = ['diameter', 'width', 'asymmetry', 'position-angle', 'central-depression'];

/** A ring of 40 that came out wrong by an error, with an interval of so many deviations of 1. */
function trialOf(family: string, error: number, half: number): SuiteTrial {
  const corrected = 40 + error;
  const quantity = {
    truth: 40,
    measured: corrected,
    spread: 2,
    corrected,
    low: corrected - half,
    high: corrected + half,
    low95: corrected - 1.96 * half,
    high95: corrected + 1.96 * half,
    rank: 0.5,
  };
  return {
    family,
    isRing: true,
    verdict: 'ring',
    hasTruth: true,
    quantities: Object.fromEntries(QUANTITIES.map((name) => [name, quantity])),
  };
}

// Wilson 1927: of n trials half of which hit, the bounds of z = 1 lie z / (2 sqrt(n + z^2)) from a half.
test('bounds a proportion by Wilson', () => {
  const { value, low, high } = proportionOf(5, 10);
  expect(value).toBe(0.5);
  expect(high - 0.5).toBeCloseTo(1 / (2 * Math.sqrt(11)), 12);
  expect(0.5 - low).toBeCloseTo(1 / (2 * Math.sqrt(11)), 12);
  expect(proportionOf(0, 10).low).toBeCloseTo(0, 12);
});

// By hand: 20 and 0 where 10 are expected make 20; Abramowitz and Stegun, table 26.7: above 20 with nine degrees, 0.01791.
test('tells ranks that are not even', () => {
  const even = Array.from({ length: 100 }, (_, k) => (k + 0.5) / 100);
  expect(uniformityOf(even)).toMatchObject({ chiSquare: 0, probability: 1 });
  const uneven = uniformityOf(even.map((rank) => (rank >= 0.1 && rank < 0.2 ? rank - 0.1 : rank)));
  expect(uneven?.chiSquare).toBeCloseTo(20, 12);
  expect(uneven?.probability).toBeCloseTo(0.01791, 5);
  expect(uniformityOf(even.slice(0, 40))).toBeNull();
});

// Identity: normal errors of 1 lie within 1 in 68.3 %, within 1.96 in 95 %; within 2 in 95.4 %, which is too many for 68 %.
test('finds intervals that are right, and those that are too wide', () => {
  const random = randomStream(3, 'errors');
  const trials = Array.from({ length: 400 }, () => random.normal()).flatMap((error) => [
    trialOf('ring-40-8', error, 1),
    trialOf('symmetric-ring', error, 2),
  ]);
  const summary = summarise([{ trials, pulls: [] }]);
  const [right, wide] = summary.families.map(({ quantities }) => quantities.diameter);
  expect(summary.families.map(({ family }) => family)).toEqual(['ring-40', 'symmetric-ring']);
  // Binomial: three deviations of 400.
  expect(Math.abs(right.coverage68.value - 0.683)).toBeLessThan(0.07);
  expect(Math.abs(right.coverage95.value - 0.95)).toBeLessThan(0.033);
  expect(Math.abs(right.inHalves - 1)).toBeLessThan(3 / Math.sqrt(800));
  expect(wide.inHalves).toBeCloseTo(right.inHalves / 2, 10);
  const missed = judge(summary, 0.02, 8).filter(({ met }) => met === false);
  expect(missed.map(({ target }) => target)).toEqual(['symmetric-ring: 68 % intervals hold 60 to 76 %']);
  expect(judge(summary, 0.02, 900).every(({ met }) => met === null)).toBe(true);
});

test('reads suites, and says of each target that is missed that it is', () => {
  const suite = (half: number) => {
    const sink = memorySink();
    const trials = Array.from({ length: 10 }, (_, k) => trialOf('crescent-90', k / 9 - 0.5, half));
    writeJson(sink, { noise: 1, components: 40, injected: 8, trials, pulls: [] });
    return sourceOf(sink.bytes(), 'trials');
  };
  const run = (half: number) => {
    const outputs = { numbers: memorySink(), report: memorySink() };
    const parameters = { biasTarget: 0.02, least: 8 };
    const inputs = { trials: [suite(half), suite(half)] };
    const report = compute({ inputs, parameters, outputs, note: () => {}, progress: () => {} });
    return { report, numbers: readNumbers(sourceOf(outputs.numbers.bytes())) };
  };
  // Errors of -9/18, -7/18 ... 9/18: seven tenths would need 7/18; within 6/18 are six of ten.
  const right = run(6 / 18);
  expect(right.numbers.values['coverage-68-crescent'].value).toBeCloseTo(0.6, 12);
  expect(right.report.warnings).toEqual([]);
  expect(right.numbers.remarks[1]).toBe('Every target is met.');
  // Wilson, by hand: (0.2 + 1/40 -+ sqrt(0.16/20 + 1/1600)) / 1.05.
  const narrow = run(2 / 18);
  expect(narrow.report.warnings).toEqual([
    'target missed: crescent: 68 % intervals hold 60 to 76 %; found 20.0 % of 20, bounds 12.6 % and 30.3 %',
    expect.stringMatching(/^target missed: crescent: 95 % intervals hold at least 90 %; found 40\.0 % of 20/),
  ]);
});
