/** The whole fit on invented data: a crescent behind unknown station phases and gains. */

import { beforeAll, expect, test } from 'vitest';
import { memorySink, sourceOf } from '../../../stages/bytes.ts';
import type { Basis, Visibilities } from '../../../stages/data.ts';
import { compute } from '../../../stages/fit/compute.ts';
import { makeReport } from '../../../stages/fit/report.ts';
import { writeBasis } from '../../../stages/formats/basis.ts';
import { readNumbers } from '../../../stages/formats/json.ts';
import { readPosterior } from '../../../stages/formats/posterior.ts';
import { readSkyImage } from '../../../stages/formats/sky-image.ts';
import { writeVisibilities } from '../../../stages/formats/visibilities-write.ts';
import { imageAt } from '../../../stages/imaging/linear-model.ts';
import { measureDraws } from '../../../stages/imaging/measure-draws.ts';
import { drawPosterior } from '../../../stages/imaging/posterior-draws.ts';
import { makeRingNumbers } from '../../../stages/imaging/ring-numbers.ts';
import { type FitResult, runFit } from '../../../stages/imaging/run-fit.ts';
import { longestBaseline } from '../../../stages/imaging/select-rows.ts';
import { type FitSettings, readSettings } from '../../../stages/imaging/settings.ts';
import { measureRing } from '../../../stages/numerics/ring.ts';
import { angleDifference } from '../../../stages/numerics/statistics.ts';
import { UAS } from '../numerics/ring-images.ts';
import { crescentImage, makeLibraryBasis, observe, withFlux } from './synthetic-data.ts';

const SETTINGS: FitSettings = {
  data: 'closure-phases-and-amplitudes',
  components: 25,
  priorWidth: 2,
  fluxPrior: 0.5,
  shortest: 0.1,
  gainPriors: { usual: 0.1, stations: {} },
  minimumSnr: 2.5,
  positivity: 1,
  starts: 4,
  posterior: 'gaussian',
  sampler: { chains: 4, warmUp: 100, draws: 150, most: 600, rHat: 1.02, ess: 300 },
  samples: 100,
  seed: 1,
};
const CRESCENT = { diameter: 42, blur: 12, b: 0.25, angle: 200 };
const TRUTH = withFlux(crescentImage(CRESCENT, 2), 0.8);
/** The truth at the basis' resolution: 10 uas more of blur. */
const BLURRED = withFlux(crescentImage({ ...CRESCENT, blur: Math.hypot(12, 10) }, 2), 0.8);

let basis: Basis;
let good: Visibilities;

beforeAll(() => {
  basis = makeLibraryBasis(30, 160);
  good = observe(TRUTH, { gains: 0.1, stationPhases: true, scans: 18, noise: 0.004, extendedFlux: 0.4 });
});

function numbersOf({ problem, best }: FitResult) {
  const posterior = drawPosterior(problem.model, best.x, best.curvature, SETTINGS.samples, 1);
  return makeRingNumbers(measureDraws(basis, posterior), {}).values;
}

function reportOf(result: FitResult, settings: FitSettings) {
  const { problem, best } = result;
  const posterior = drawPosterior(problem.model, best.x, best.curvature, 200, 1);
  return makeReport(result, settings, posterior);
}

test('recovers diameter and orientation behind unknown phases and gains of 10 %', () => {
  const result = runFit(good, basis, SETTINGS);
  const report = reportOf(result, SETTINGS);
  const numbers = numbersOf(result);
  const truth = measureRing(BLURRED);
  expect(result.best.converged).toBe(true);
  expect(Math.abs(numbers.diameter.value / (truth.diameter / UAS) - 1)).toBeLessThan(0.05);
  expect(Math.abs(numbers['thin-ring-diameter'].value / 42 - 1)).toBeLessThan(0.05);
  expect(Math.abs(angleDifference(numbers['position-angle'].value, 200))).toBeLessThan(15);
  expect(Math.abs(numbers.asymmetry.value - 0.25)).toBeLessThan(0.06);
  expect(Math.abs(report.flux.priorMean / 0.8 - 1)).toBeLessThan(0.25);
  for (const term of report.terms) expect(term.reducedChiSquare).toBeLessThan(1.5);
  expect(report.warnings.filter((text) => !text.includes('starts'))).toEqual([]);
});

test.each([1.33, 0.67])('finds and bears a station whose gain is off by a factor of %f', (factor) => {
  const options = { gains: 0.1, stationPhases: true, scans: 18, noise: 0.004, badGains: { Cedar: factor } };
  const result = runFit(observe(TRUTH, options), basis, SETTINGS);
  const numbers = numbersOf(result);
  const report = reportOf(result, SETTINGS);
  expect(report.gains.widened.map(({ station }) => station)).toEqual(['Cedar']);
  expect(report.warnings.join()).toContain('station Cedar lies far off: median log gain');
  const cedar = report.gains.stations.find(({ station }) => station === 'Cedar');
  expect(Math.abs((cedar?.median ?? 0) - Math.log(factor))).toBeLessThan(0.12);
  expect(Math.abs(numbers.diameter.value / (measureRing(BLURRED).diameter / UAS) - 1)).toBeLessThan(0.05);
  expect(Math.abs(angleDifference(numbers['position-angle'].value, 200))).toBeLessThan(15);
});

test('takes the prior that the recipe names for a bad station', () => {
  const options = { gains: 0.1, stationPhases: true, scans: 18, noise: 0.004, badGains: { Cedar: 1.33 } };
  const settings = { ...SETTINGS, gainPriors: { usual: 0.1, stations: { Cedar: 0.5 } } };
  const result = runFit(observe(TRUTH, options), basis, settings);
  expect(result.widenings).toEqual([]);
  expect(Math.abs(numbersOf(result).diameter.value / (measureRing(BLURRED).diameter / UAS) - 1)).toBeLessThan(
    0.05,
  );
});

test('chooses the number of components by held-out scans', () => {
  const { choice, best } = runFit(good, basis, { ...SETTINGS, components: 'by-data' });
  expect(choice?.curve.map(({ components }) => components)).toEqual([10, 15, 20, 25, 30]);
  expect(choice?.folds).toBe(5);
  expect(best.x.length).toBe(1 + (choice?.components ?? 0));
  // Ten components cannot hold this crescent: the scans held out say so clearly.
  const ten = choice?.curve[0];
  expect(ten?.aboveBest ?? 0).toBeGreaterThan(2 * (ten?.standardError ?? 0));
});

test('warns when too few components are asked for', () => {
  const settings = { ...SETTINGS, components: 6 };
  const report = reportOf(runFit(good, basis, settings), settings);
  expect(report.warnings.join()).toMatch(
    /reduced chi-square of the closure phases is \d+\.\d\d: too few components/,
  );
});

test('warns when closures alone imply more flux than there is', () => {
  const settings: FitSettings = {
    ...SETTINGS,
    data: 'closure-phases-and-log-closure-amplitudes',
    flux: 3,
    fluxPrior: 0.1,
  };
  const report = reportOf(runFit(good, basis, settings), settings);
  expect(report.flux.totalMeasured ?? 0).toBeGreaterThan(1);
  expect(report.warnings.join()).toContain('exceeds the');
});

test('fits closures alone with a flux prior', () => {
  const settings: FitSettings = { ...SETTINGS, data: 'closure-phases-and-log-closure-amplitudes', flux: 0.8 };
  const result = runFit(good, basis, settings);
  const report = reportOf(result, settings);
  expect(report.terms.map(({ term }) => term)).toEqual(['closure phases', 'log closure amplitudes']);
  for (const term of report.terms) expect(term.reducedChiSquare).toBeLessThan(1.5);
  // No number of a ring is asked for: closures leave a pedestal free, which fills the centre of most draws.
  const pixels = imageAt(result.problem.model, basis, result.best.x);
  expect(Math.abs(angleDifference(measureRing({ ...basis, pixels }).positionAngleDegrees, 200))).toBeLessThan(
    20,
  );
});

test('leaves out baselines that are too short or too long, and says so', () => {
  const result = runFit(good, basis, SETTINGS);
  const short = good.u.filter((u, r) => Math.hypot(u, good.v[r]) < 1e8).length;
  expect(short).toBeGreaterThan(0);
  expect(result.selection.tooShort).toBe(short);
  expect(result.selection.data.count).toBe(good.count - short);
  // exp(-(pi w q)^2 / (4 ln 2)) = 0.02 for w = 10 uas.
  const limit = longestBaseline(10 * UAS);
  expect(Math.exp(-((Math.PI * 10 * UAS * limit) ** 2) / (4 * Math.LN2))).toBeCloseTo(0.02, 12);
  const settings = { ...SETTINGS, components: 5, starts: 1 };
  const coarse = { ...basis, resolutionRadians: 30 * UAS };
  const report = reportOf(runFit(good, coarse, settings), settings);
  expect(report.rows.tooLong).toBeGreaterThan(0);
  expect(report.warnings.join()).toContain('rows were left out: their baselines see finer structure');
});

test('writes its six outputs, twice the same bytes', () => {
  const [visibilities, basisBytes] = [memorySink(), memorySink()];
  writeVisibilities(visibilities, good);
  writeBasis(basisBytes, basis);
  const names = ['image', 'samples', 'residuals', 'report', 'models', 'flux'] as const;
  const once = () => {
    const outputs = Object.fromEntries(names.map((name) => [name, memorySink()]));
    compute({
      inputs: {
        visibilities: [sourceOf(visibilities.bytes(), 'visibilities')],
        basis: [sourceOf(basisBytes.bytes(), 'basis')],
      },
      parameters: { ...SETTINGS, starts: 2 },
      outputs,
      note: () => {},
      progress: (fraction) => expect(fraction >= 0 && fraction <= 1).toBe(true),
    });
    return outputs;
  };
  const [first, second] = [once(), once()];
  for (const name of names) expect(Buffer.compare(first[name].bytes(), second[name].bytes()), name).toBe(0);
  const image = readSkyImage(sourceOf(first.image.bytes()));
  const flux = readNumbers(sourceOf(first.flux.bytes())).values.flux;
  const posterior = readPosterior(sourceOf(first.samples.bytes()));
  expect(posterior.count).toBe(100);
  expect(posterior.components).toBe(25);
  expect(flux.unit).toBe('Jy');
  expect(image.pixels.reduce((a, b) => a + b) / flux.value).toBeCloseTo(1, 1);
});

test('says what is wrong with its parameters and data', () => {
  const change = (parameters: object) => () => readSettings({ ...SETTINGS, ...parameters }, good, 30);
  expect(change({ components: 31 })).toThrow(
    'parameter components: too-few-components: expected at most 30, which the basis has, got 31. Ask for fewer, or build the basis with more.',
  );
  expect(change({ gainPriors: { usual: 0.1, stations: { Oak: 0.5 } } })).toThrow(
    'parameter gainPriors.stations: unknown-station: expected names among Alder, Aspen, Birch, Cedar, Elder, Hazel, Larch, Rowan, got Oak. Write the name as the data do.',
  );
  expect(change({ data: 'closure-phases-and-log-closure-amplitudes' })).toThrow(
    'parameter flux: flux-needed: expected the compact flux, because closures do not see it, got no value. State the flux, such as `flux: 0.6 Jy`, or take amplitudes or complex visibilities among the data.',
  );
  const broken = { ...good, sigma: good.sigma.map((value, r) => (r === 3 ? 0 : value)) };
  expect(() => runFit(broken, basis, SETTINGS)).toThrow(
    /^input visibilities, row 4: bad-row: expected finite numbers and errors above 0, got /,
  );
  expect(() => runFit(good, basis, { ...SETTINGS, shortest: 19 })).toThrow(
    /^input visibilities: no-data: expected baselines from 19000000000 to \d+\.?\d* wavelengths, got \d+ rows, none of them between\. Lower the parameter `shortest`/,
  );
});
