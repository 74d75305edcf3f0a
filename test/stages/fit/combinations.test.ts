/** Data terms in combination, what the cuts count, stations left out and baselines held out. */

import { beforeAll, expect, test } from 'vitest';
import type { Basis, Visibilities } from '../../../stages/data.ts';
import { holdOutBaselines, leaveOutStations } from '../../../stages/fit/left-out.ts';
import { makeReport } from '../../../stages/fit/report.ts';
import { DATA_TERMS, type DataTerm, requireCombination } from '../../../stages/imaging/data-terms.ts';
import { modesOf } from '../../../stages/imaging/modes.ts';
import { drawPosterior } from '../../../stages/imaging/posterior-draws.ts';
import { type FitResult, runFit } from '../../../stages/imaging/run-fit.ts';
import type { FitSettings } from '../../../stages/imaging/settings.ts';
import { crescentImage, makeLibraryBasis, observe, withFlux } from './synthetic-data.ts';

const SETTINGS: FitSettings = {
  data: ['closure-phases', 'amplitudes'],
  components: 12,
  priorWidth: 2,
  fluxPrior: 0.5,
  shortest: 0.1,
  gainPriors: { usual: 0.1, stations: {} },
  minimumSnr: 2.5,
  positivity: 1,
  starts: 2,
  posterior: 'gaussian',
  sampler: { chains: 4, warmUp: 80, draws: 100, most: 200, rHat: 1.05, ess: 100 },
  samples: 100,
  seed: 1,
};
const TRUTH = withFlux(crescentImage({ diameter: 44, blur: 16, b: 0.2, angle: 70 }), 0.8);

let basis: Basis;
let data: Visibilities;
let result: FitResult;

beforeAll(() => {
  basis = makeLibraryBasis(12, 80);
  data = observe(TRUTH, { scans: 10, gains: 0.05, stationPhases: true, noise: 0.02 });
  result = runFit(data, basis, SETTINGS);
});

function reportOf(fit: FitResult, settings: FitSettings, checks: Parameters<typeof makeReport>[3] = {}) {
  const { model } = fit.problem;
  return makeReport(fit, settings, drawPosterior(model, fit.best.x, fit.best.curvature, 50, 1), checks);
}

test('takes a word and the list that it stands for as the same', () => {
  const word = runFit(data, basis, { ...SETTINGS, data: 'closure-phases-and-amplitudes' });
  expect([...word.best.x]).toEqual([...result.best.x]);
});

// By hand: of the seven terms four take amplitudes alone, two phases alone, one both.
test('admits every combination that counts a measurement once, and no other', () => {
  const admits = (terms: readonly DataTerm[]) => {
    try {
      requireCombination(terms);
      return true;
    } catch {
      return false;
    }
  };
  const pairs = DATA_TERMS.flatMap((first, k) =>
    DATA_TERMS.slice(k).map((second) => [first, second] as const),
  );
  const admitted = pairs.filter((pair) => admits(pair)).map((pair) => pair.join(' + '));
  expect(admitted.sort()).toEqual([
    'amplitudes + closure-phases',
    'amplitudes + triple-phases',
    'closure-phases + log-closure-amplitudes',
    'closure-phases + squared-visibilities',
    'closure-phases + triple-amplitudes',
    'log-closure-amplitudes + triple-phases',
    'squared-visibilities + triple-phases',
    'triple-phases + triple-amplitudes',
  ]);
  expect(DATA_TERMS.every((term) => admits([term]))).toBe(true);
  expect(() => requireCombination(['complex-visibilities', 'amplitudes'])).toThrow(
    'parameter data: counted-twice: expected one term at most that takes the amplitudes of baselines, got complex-visibilities and amplitudes. Leave one of them out: both hold the same measurements, which would count twice.',
  );
});

test('warns that amplitudes alone do not know which way is up', () => {
  const settings: FitSettings = { ...SETTINGS, data: ['amplitudes'] };
  const report = reportOf(runFit(data, basis, settings), settings);
  expect(report.terms.map(({ term }) => term)).toEqual(['amplitudes with gains']);
  expect(report.warnings.join()).toContain('the image turned by 180 degrees fits them as well');
});

test('counts what the cuts at low signal-to-noise take out', () => {
  const snr = (r: number) => Math.hypot(data.re[r], data.im[r]) / data.sigma[r];
  const rows = [...result.problem.data.u.keys()].map((k) => {
    const { re, im, sigma } = result.problem.data;
    return Math.hypot(re[k] as number, im[k] as number) / (sigma[k] as number);
  });
  expect(snr(0)).toBeGreaterThan(0);
  const [phases, amplitudes] = reportOf(result, SETTINGS).cuts;
  expect(phases).toMatchObject({ term: 'closure-phases', rows: rows.filter((value) => value < 2.5).length });
  expect(phases?.rows).toBeGreaterThan(0);
  expect(amplitudes).toMatchObject({ term: 'amplitudes', rows: rows.filter((value) => value < 4).length });
  expect(phases?.closures).toBeLessThan(phases?.ofClosures ?? 0);
  // (N-1)(N-2)/2 of the stations of each scan when none is cut.
  const scans = new Map<number, Set<number>>();
  const { scan, station1, station2 } = result.problem.data;
  scan.forEach((number, r) => {
    const present = scans.get(number) ?? new Set();
    scans.set(number, present.add(station1[r] as number).add(station2[r] as number));
  });
  const most = [...scans.values()].reduce((sum, { size }) => sum + ((size - 1) * (size - 2)) / 2, 0);
  expect(phases?.ofClosures ?? 0).toBeLessThanOrEqual(most);
  const hard: FitSettings = { ...SETTINGS, minimumSnr: 30 };
  expect(reportOf(runFit(data, basis, hard), hard).warnings.join()).toMatch(
    /of \d+ closure phases only \d+ are left: visibilities below a signal-to-noise of 30 stay out/,
  );
});

// Identity: a station's shares of chi-square over its degrees of freedom are those of the noise, 1.
test('reports reduced chi-square by station and term', () => {
  const { stations, terms } = reportOf(result, SETTINGS);
  expect(stations.length).toBe(8);
  for (const { terms: own } of stations) {
    expect(own.map(({ term }) => term)).toEqual(['closure phases', 'amplitudes with gains']);
    for (const { measurements, reducedChiSquare } of own) {
      if (measurements > 20)
        expect(Math.abs(reducedChiSquare - 1)).toBeLessThan(6 * Math.sqrt(2 / measurements));
    }
  }
  expect(terms[1]?.measurements).toBe(result.problem.data.count);
  // Every amplitude is of two stations: their mean is the term's.
  const own = stations.flatMap(({ terms: each }) => each[1] ?? []);
  const total = own.reduce((sum, { measurements }) => sum + measurements, 0);
  const mean = own.reduce((sum, each) => sum + each.measurements * each.reducedChiSquare, 0) / total;
  expect(mean).toBeCloseTo(terms[1]?.reducedChiSquare ?? 0, 9);
});

test('finds the station that holds the flux up, and foresees held-out baselines', () => {
  const leftOut = leaveOutStations(result, SETTINGS);
  expect(leftOut.map(({ station }) => station)).toEqual(result.problem.data.stations.map(({ name }) => name));
  for (const { fluxShiftDeviations, chiSquarePerMeasurement } of leftOut) {
    expect(Math.abs(fluxShiftDeviations)).toBeLessThan(4);
    expect(chiSquarePerMeasurement).toBeLessThan(1.3);
  }
  const heldOut = holdOutBaselines(result, SETTINGS);
  expect(heldOut?.folds).toBe(5);
  // Unseen by the fit: 1 but for the errors of the image itself.
  expect(heldOut?.rms).toBeGreaterThan(0.85);
  expect(heldOut?.rms).toBeLessThan(1.5);
  expect(reportOf(result, SETTINGS, { leftOut, heldOut }).warnings.join()).not.toContain('without station');
});

// 60 degrees off in every scan, or three times too bright, which no gain of a station takes up.
test.each([
  ['phase', ['Elder', 'Larch'], 0.5, Math.sqrt(3) / 2, 2],
  // Without the gains that the others tell it would be 2.
  ['amplitude', ['Alder', 'Cedar'], 3, 0, 3],
] as const)('points at the baseline whose %s does not close', (_, baseline, c, s, least) => {
  const [first, second] = baseline.map((name) => data.stations.findIndex((each) => each.name === name));
  const isBad = (r: number) => data.station1[r] === first && data.station2[r] === second;
  const faulty = {
    ...data,
    re: data.re.map((re, r) => (isBad(r) ? c * re - s * data.im[r] : re)),
    im: data.im.map((im, r) => (isBad(r) ? s * data.re[r] + c * im : im)),
  };
  const heldOut = holdOutBaselines(runFit(faulty, basis, SETTINGS), SETTINGS);
  const worst = [...(heldOut?.baselines ?? [])].sort((a, b) => b.rms - a.rms)[0];
  expect(worst?.stations).toEqual(baseline);
  expect(worst?.rms).toBeGreaterThan(least);
});

// By hand: H = diag(4, 1); (0.1, 0) is 0.2 off and the same place, (2, 0) is 4 off.
test('counts the starts that end in each minimum', () => {
  const at = (cost: number, ...x: number[]) => ({
    x: Float64Array.from(x),
    cost,
    curvature: Float64Array.of(4, 0, 0, 1),
    steps: 1,
    converged: true,
  });
  expect(modesOf([at(5, 2, 0), at(1, 0, 0), at(1.01, 0.1, 0), at(5.2, 2, 0.1)])).toEqual([
    { cost: 1, above: 0, distance: 0, starts: [1, 2] },
    { cost: 5, above: 4, distance: 4, starts: [0, 3] },
  ]);
  const found = { ...result, modes: modesOf([at(5, 2, 0), at(1, 0, 0), at(5.2, 2, 0.1)]) };
  const starts = Array.from({ length: 3 }, () => ({ start: 'any', cost: 1, steps: 1, converged: true }));
  expect(reportOf({ ...found, starts }, SETTINGS).warnings.join()).toContain(
    '2 of 3 starts ended in a minimum above the best; 1 of these minima was found more than once, the best of them 4.0 above',
  );
});
