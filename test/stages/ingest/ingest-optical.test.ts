/** OIFITS with squared visibilities and triple products only: they go into a fit as they stand, and the
 *  image that is fitted has the ring. The source and its very large array are invented. */

import { expect, test } from 'vitest';
import { imageAt } from '../../../stages/imaging/linear-model.ts';
import { runFit } from '../../../stages/imaging/run-fit.ts';
import type { FitSettings } from '../../../stages/imaging/settings.ts';
import { visibilitiesOfModel } from '../../../stages/numerics/models.ts';
import { measureRing } from '../../../stages/numerics/ring.ts';
import { makeLibraryBasis } from '../fit/synthetic-data.ts';
import { UAS } from '../numerics/ring-images.ts';
import { bytesOf, opticalFile, RING, WAVES } from '../optical-synthetic.ts';
import { problemOf, runIngest } from './run-ingest.ts';

/** Exposures, wavelengths; pairs and triples of six stations. */
const [PAIRS, TRIPLES] = [15, 20];

// Identity: what was written comes out again, at the wavelength of its channel, in the order of times and wavelengths.
test('have the squared visibilities and triple products of the file, each time and wavelength a scan', () => {
  const { visibilities, report, stage } = runIngest(bytesOf(opticalFile(3)));
  const { count, squared, triples, stations } = visibilities;
  expect(count).toBe(0);
  expect(stations.map(({ name }) => name)).toEqual(['S1', 'S2', 'S3', 'S4', 'S5', 'S6']);
  expect(squared?.count).toBe(3 * 2 * PAIRS);
  expect(triples?.count).toBe(3 * 2 * TRIPLES);
  expect(report.optical).toEqual({
    moments: 6,
    squaredVisibilities: 3 * 2 * PAIRS,
    tripleProducts: 3 * 2 * TRIPLES,
    triplePhases: 3 * 2 * TRIPLES,
    tripleAmplitudes: 3 * 2 * TRIPLES,
  });
  expect(stage.warnings?.join(' ')).toContain('fit `squared-visibilities`, `triple-phases`');
  const written: { squared: number[]; u: number[]; stations: number[] }[] = [];
  opticalFile(3, (tables) => written.push(tables));
  const [{ squared: values, u, stations: pairs }] = written;
  const { station1, station2, value, sigma, scan } = squared as NonNullable<typeof squared>;
  for (let k = 0; k < value.length; k++) {
    const [exposure, channel] = [scan[k] >> 1, scan[k] % 2];
    const row = exposure * PAIRS + (k % PAIRS);
    expect([station1[k] + 1, station2[k] + 1]).toEqual(pairs.slice(2 * row, 2 * row + 2));
    expect(value[k]).toBe(values[2 * row + channel]);
    expect(sigma[k]).toBe(0.005);
    // Wavelengths in the file have single precision.
    expect((squared?.u[k] as number) / (u[row] / Math.fround(WAVES[channel]))).toBeCloseTo(1, 12);
  }
  expect(value.some((each) => each < 0)).toBe(true);
});

test('have triple products whose three sides close, with errors in radians', () => {
  const { triples } = runIngest(bytesOf(opticalFile(2))).visibilities;
  const { count, u1, v1, u2, v2, phase, sigmaPhase, amplitude, sigmaAmplitude } = triples as NonNullable<
    typeof triples
  >;
  for (let t = 0; t < count; t++) {
    const [re, im] = [new Float64Array(3), new Float64Array(3)];
    const [u, v] = [
      Float64Array.of(u1[t], u2[t], u1[t] + u2[t]),
      Float64Array.of(v1[t], v2[t], v1[t] + v2[t]),
    ];
    visibilitiesOfModel(re, im, RING, u, v);
    const angle = (k: number) => Math.atan2(im[k], re[k]);
    const off = phase[t] - (angle(0) + angle(1) - angle(2));
    // The noise of 1 deg, five times: one of two million is beyond.
    expect((Math.abs(Math.atan2(Math.sin(off), Math.cos(off))) * 180) / Math.PI).toBeLessThan(5);
    expect(sigmaPhase[t]).toBeCloseTo(Math.PI / 180, 12);
    expect([amplitude[t], sigmaAmplitude[t]]).toEqual([0.1, 0.1]);
  }
});

test('count what is flagged, and leave stations, channels and times out', () => {
  const flagged = runIngest(bytesOf(opticalFile(2, ({ flags }) => flags.fill(1, 0, 4))));
  expect(flagged.report.samples.dropped['flagged in the file']).toBe(4);
  expect(flagged.visibilities.squared?.count).toBe(2 * 2 * PAIRS - 4);
  const without = runIngest(bytesOf(opticalFile(2)), { leaveOut: ['S6'] });
  expect(without.visibilities.stations.map(({ name }) => name)).toEqual(['S1', 'S2', 'S3', 'S4', 'S5']);
  // Five pairs and ten triples hold S6, in two exposures of two channels.
  expect(without.report.samples.dropped['station left out']).toBe(2 * 2 * (5 + 10));
  const first = runIngest(bytesOf(opticalFile(2)), { channels: [2], toMjd: 60000.005 });
  expect(first.visibilities.squared?.count).toBe(PAIRS);
  expect(first.visibilities.wavelengthMetres).toBe(Math.fround(WAVES[1]));
  expect(problemOf(bytesOf(opticalFile(1)), { channels: [3] }).message).toContain('numbers from 1 to 2');
  expect(problemOf(bytesOf(opticalFile(1)), { leaveOut: ['S7'] }).message).toContain('S7');
});

test('keep a phase without an amplitude and an amplitude without a phase, and drop what has neither', () => {
  const { visibilities, report } = runIngest(
    bytesOf(
      opticalFile(1, ({ t3 }) => {
        t3.amplitudeErrors[0] = Number.NaN;
        t3.phaseErrors[1] = 0;
        t3.amplitudeErrors[2] = Number.NaN;
        t3.phaseErrors[2] = Number.NaN;
      }),
    ),
  );
  const { triples } = visibilities;
  expect(triples?.count).toBe(2 * TRIPLES - 1);
  expect(report.optical).toMatchObject({ triplePhases: 2 * TRIPLES - 2, tripleAmplitudes: 2 * TRIPLES - 2 });
  expect(
    [...(triples?.sigmaAmplitude ?? [])].filter((error) => error === Number.POSITIVE_INFINITY),
  ).toHaveLength(1);
  expect([...(triples?.sigmaPhase ?? [])].filter((error) => error === Number.POSITIVE_INFINITY)).toHaveLength(
    1,
  );
  expect(report.samples.dropped['weight not a number']).toBe(1);
});

test('can be fitted: the ring comes out', () => {
  const { visibilities } = runIngest(bytesOf(opticalFile(8)));
  const basis = makeLibraryBasis(30, 160);
  const settings: FitSettings = {
    data: ['squared-visibilities', 'triple-phases'],
    components: 30,
    priorWidth: 2,
    flux: 1,
    fluxPrior: 0.01,
    shortest: 0.1,
    gainPriors: { usual: 0.001, stations: {} },
    minimumSnr: 2.5,
    positivity: 1,
    starts: 3,
    posterior: 'gaussian',
    sampler: { chains: 4, warmUp: 100, draws: 150, most: 600, rHat: 1.02, ess: 200 },
    samples: 10,
    seed: 1,
  };
  const { problem, best } = runFit(visibilities, basis, settings);
  const pixels = imageAt(problem.model, basis, best.x);
  const { ring, diameter } = measureRing({ ...basis, pixels });
  expect(ring).toBe(true);
  // The ridge of a ring of 48 uas blurred by 11 and the basis's 10 uas is 46.3 uas (Bessel functions); the method is good to a twentieth.
  expect(Math.abs(diameter / UAS / 46.3 - 1)).toBeLessThan(0.05);
});
