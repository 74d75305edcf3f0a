/** Faults planted in invented observations: the right check is out of limits and names the station or baseline. And without
 *  a fault the checks are quiet. */

import { expect, test } from 'vitest';
import { memorySink, sourceOf } from '../../stages/bytes.ts';
import { calibrationCheck } from '../../stages/calibration-check/calibration-check.ts';
import { fit } from '../../stages/fit/fit.ts';
import { writeBasis } from '../../stages/formats/basis.ts';
import { ingest } from '../../stages/ingest/ingest.ts';
import type { Finding } from '../../stages/kind.ts';
import { simulate } from '../../stages/simulate/simulate.ts';
import { makeLibraryBasis } from '../stages/fit/synthetic-data.ts';
import { runKind } from '../stages/simulate-task.ts';

const station = (name: string, longitude: number, latitude: number) => ({
  name,
  longitude: `${longitude} deg`,
  latitude: `${latitude} deg`,
  height: '1000 m',
  sefd: '5000 Jy',
  gainError: 0.1,
  elevationLimit: '10 deg',
});
const ARRAY = {
  target: { name: 'Lantern nucleus', ra: '180 deg', dec: '18 deg' },
  band: { frequency: '230 GHz', bandwidth: '2 GHz' },
  stations: [
    station('WICK-A', 20.5, -27.5),
    station('WICK-B', 20.51, -27.51),
    station('FLINT-A', -66.5, -28),
    station('FLINT-B', -66.52, -28.01),
    station('TALLOW', 36, 37.6),
    station('EMBER', -18.5, 64.8),
    station('GLIM', -48, 66.5),
    station('BEACON', -14, 28.6),
  ],
  start: '2031-03-10T20:30:00Z',
  duration: '10 h',
  record: '1 min',
  scan: '5 min',
  interval: '30 min',
  truth: {
    flux: '0.8 Jy',
    diameter: '46 uas',
    width: '14 uas',
    asymmetry: 0.2,
    positionAngle: '150 deg',
    field: '160 uas',
    pixels: 64,
  },
};
const basis = memorySink();
writeBasis(basis, makeLibraryBasis(40, 200));

/** Everything that the checks before a fit, and with `withFit` after one, find. */
async function findings(more: Record<string, unknown>, withFit: boolean): Promise<Finding[]> {
  const observed = await runKind(simulate, { ...ARRAY, seed: 7, ...more });
  const ingested = await runKind(ingest, {}, { data: [observed.outputs.data] });
  if (ingested.report.stop !== undefined) return [...(ingested.report.findings ?? [])];
  const { visibilities, report } = ingested.outputs;
  const mark = { outOfLimits: 'mark' };
  const before = await runKind(calibrationCheck, mark, { visibilities: [visibilities], report: [report] });
  const found = [...(ingested.report.findings ?? []), ...(before.report.findings ?? [])];
  if (!withFit) return found;
  const fitted = await runKind(
    fit,
    { components: 35, posterior: 'gaussian', samples: 10 },
    { visibilities: [before.outputs.visibilities], basis: [sourceOf(basis.bytes())] },
  );
  const after = await runKind(calibrationCheck, mark, {
    visibilities: [visibilities],
    fitReport: [fitted.outputs.report],
    residuals: [fitted.outputs.residuals],
  });
  return [...found, ...(after.report.findings ?? [])];
}

const FAULTS: readonly (readonly [string, Record<string, unknown>, string, RegExp, boolean])[] = [
  [
    'the gain of one station drops by half for an hour',
    { faults: [{ fault: 'gain-drop', station: 'BEACON', from: '4 h', duration: '1 h', value: 0.5 }] },
    'gainsOverTime',
    /BEACON, 0\.\d+ low/,
    true,
  ],
  [
    'a phase of 10 deg on one baseline does not close',
    { faults: [{ fault: 'non-closing-phase', station: 'TALLOW', other: 'BEACON', value: 10 }] },
    'baselinePhases',
    /TALLOW–BEACON/,
    true,
  ],
  [
    'the noise is understated by a factor of 2',
    { noiseFactor: 2 },
    'statedNoise',
    /over the stated noise/,
    false,
  ],
  [
    'two stations stand exchanged in the table',
    { faults: [{ fault: 'stations-swapped', station: 'EMBER', other: 'BEACON' }] },
    'u and v against station positions',
    /EMBER and BEACON are exchanged/,
    false,
  ],
  [
    'the clock is off by 1 s',
    { faults: [{ fault: 'clock-offset', value: 1 }] },
    'clock',
    /times of all stations are late for their \(u,v\): -1\.0\d\d/,
    false,
  ],
];

test.each(FAULTS)('is found when %s', async (_what, more, check, names, withFit) => {
  const found = (await findings(more, withFit)).find((finding) => finding.check === check);
  console.log(`${check}: ${found?.value.toPrecision(3)}, limit ${found?.limit}; ${found?.detail}`);
  expect(found).toMatchObject({ finding: 'out of limits' });
  expect(found?.detail).toMatch(names);
});

test('is quiet without a fault', async () => {
  const found = await findings({}, true);
  expect(found.map(({ check }) => check)).toEqual(
    expect.arrayContaining([
      'u and v against station positions',
      'clock',
      'closureScatter',
      'gainsOverTime',
      'baselinePhases',
    ]),
  );
  for (const { check, finding, detail } of found)
    expect({ check, finding, detail }).toEqual({ check, finding: 'within limits', detail });
});

// Each check of scatter has some hundred values and a limit of 2.5 times their error: what is out of limits by chance is less than one
// in 10^9, what is marginal (1.5) less than one in 1,000; gains of pairs are judged in units that noise does not reach.
test('raises no false alarm over many seeds', async () => {
  const seeds = Number(process.env.PLATEBOOK_SEEDS ?? 20);
  let [out, marginal, all] = [0, 0, 0];
  for (let seed = 1; seed <= seeds; seed += 1) {
    for (const { finding } of await findings({ seed: 1000 + seed }, false)) {
      all += 1;
      if (finding === 'out of limits') out += 1;
      if (finding === 'marginal') marginal += 1;
    }
  }
  console.log(`${seeds} seeds, ${all} findings: ${out} out of limits, ${marginal} marginal`);
  expect(out).toBe(0);
  expect(marginal).toBeLessThanOrEqual(Math.ceil(0.02 * all));
});
