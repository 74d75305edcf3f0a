/** Faults planted in invented observations: the right check is out of limits and names the station or baseline. And without
 *  a fault alarms come as often as the limits imply. */

import { expect, test } from 'vitest';
import { memorySink, sourceOf } from '../../stages/bytes.ts';
import { fit } from '../../stages/fit/fit.ts';
import { writeBasis } from '../../stages/formats/basis.ts';
import type { Finding } from '../../stages/kind.ts';
import { makeLibraryBasis } from '../stages/fit/synthetic-data.ts';
import { checked, type FalseAlarm, observed } from '../stages/planted-array.ts';
import { runKind } from '../stages/simulate-task.ts';

const basis = memorySink();
writeBasis(basis, makeLibraryBasis(40, 200));

/** Everything that the checks before a fit, and with `withFit` after one, find. */
async function findings(more: Record<string, unknown>, withFit: boolean) {
  const observation = await observed(more);
  const { visibilities, report } = observation;
  if (observation.stop !== undefined) return { found: observation.findings, falseAlarms: [] };
  const before = await checked({ visibilities: [visibilities], report: [report] });
  const found = [...observation.findings, ...before.findings];
  if (!withFit) return { found, falseAlarms: before.document.falseAlarms };
  const fitted = await runKind(
    fit,
    { components: 35, posterior: 'gaussian', samples: 10 },
    { visibilities: [before.outputs.visibilities], basis: [sourceOf(basis.bytes())] },
  );
  const after = await checked({
    visibilities: [visibilities],
    report: [report],
    fitReport: [fitted.outputs.report],
    residuals: [fitted.outputs.residuals],
  });
  return {
    found: [...observation.findings, ...after.findings],
    falseAlarms: after.document.falseAlarms,
  };
}

type Case = readonly [string, Record<string, unknown>, string, RegExp, boolean];

const drop = (station: string, from: string) => ({
  faults: [{ fault: 'gain-drop', station, from, duration: '1 h', value: 0.5 }],
});
const phase = (station: string, other: string) => ({
  faults: [{ fault: 'non-closing-phase', station, other, value: 10 }],
});
const noise = (where: Record<string, string>) => ({
  faults: [{ fault: 'noise-understated', value: 2, ...where }],
});
const swapped = { fault: 'stations-swapped', station: 'EMBER', other: 'BEACON' };
const late = { fault: 'clock-offset', value: 1 };

const FAULTS: readonly Case[] = [
  ['a gain drops by half for an hour', drop('BEACON', '4 h'), 'gainsOverTime', /BEACON, 0\.\d+ low/, true],
  ['the same, without a fit', drop('BEACON', '4 h'), 'stationAmplitudes', /BEACON, 0\.\d+ low/, false],
  ['the same in a pair', drop('WICK-A', '3 h'), 'pairGainsOverTime', /it is WICK-A, 0\.\d+ low/, false],
  ['a phase of 10 deg', phase('TALLOW', 'BEACON'), 'baselinePhases', /TALLOW–BEACON/, true],
  ['the same from a pair', phase('WICK-A', 'BEACON'), 'closureScatter', /WICK-A–BEACON/, false],
  ['the same within a pair', phase('FLINT-A', 'FLINT-B'), 'closureScatter', /on FLINT-A–FLINT-B /, false],
  ['noise understated by 2', noise({}), 'statedNoise', /over the stated noise/, false],
  ['at one station', noise({ station: 'TALLOW' }), 'noiseByBaseline', /all with TALLOW/, false],
  ['on one baseline', noise({ station: 'EMBER', other: 'GLIM' }), 'noiseByBaseline', /: EMBER–GLIM, /, false],
  [
    'two stations exchanged in the table',
    { faults: [swapped] },
    'u and v against station positions',
    /EMBER and BEACON are exchanged/,
    false,
  ],
  [
    'a clock off by 1 s',
    { faults: [late] },
    'clock',
    /times of all stations are late for their \(u,v\): -1\.0\d\d/,
    false,
  ],
];

test.each(FAULTS)('is found: %s %j', async (_what, more, check, names, withFit) => {
  const found = (await findings(more, withFit)).found.find((finding) => finding.check === check);
  console.log(`${check}: ${found?.value.toPrecision(3)}, limit ${found?.limit}; ${found?.detail}`);
  expect(found).toMatchObject({ finding: 'out of limits' });
  expect(found?.detail).toMatch(names);
});

test('is quiet without a fault', async () => {
  const { found } = await findings({}, true);
  expect(found.map(({ check }) => check)).toEqual(
    expect.arrayContaining([
      'u and v against station positions',
      'clock',
      'closureScatter',
      'gainsOverTime',
      'baselinePhases',
      'baselineAmplitudes',
    ]),
  );
  for (const { check, finding, detail } of found)
    expect({ check, finding, detail }).toEqual({ check, finding: 'within limits', detail });
});

/** Checks whose values noise alone decides; the report then states probabilities. */
const EXACT = ['closureScatter', 'redundantPhases', 'redundantAmplitudes', 'noiseByBaseline'];

// Implied rates, by the reports themselves: scatter of some hundred values is marginal (1.5) in less than one case of 10^9; a
// trend is marginal in 0.27 % and out of limits in 0.006 %; pairs of stations good to 10 % are marginal in 0.2 %. The
// probabilities of values as large as those found must be spread evenly, which tells far more than the alarms that never come.
test('raises false alarms at the rate that the limits imply, over 200 seeds', async () => {
  const seeds = Number(process.env.PLATEBOOK_SEEDS ?? 200);
  const all: Finding[] = [];
  const alarms: FalseAlarm[] = [];
  for (let seed = 1; seed <= seeds; seed += 1) {
    const { found, falseAlarms } = await findings({ seed: 1000 + seed }, false);
    all.push(...found);
    alarms.push(...falseAlarms);
  }
  for (const check of new Set(all.map((each) => each.check))) {
    const own = all.filter((each) => each.check === check);
    const count = (finding: string) => own.filter((each) => each.finding === finding).length;
    const largest = Math.max(...own.map(({ value }) => value)).toPrecision(3);
    console.log(`${check}: ${count('marginal')} marginal, ${count('out of limits')} out, largest ${largest}`);
  }
  const implied = alarms.reduce((sum, { marginal }) => sum + marginal, 0) + 0.002 * seeds;
  const marginal = all.filter(({ finding }) => finding !== 'within limits').length;
  // Poisson: with an expectation of about 1 more than 6 alarms come in less than one case of 10,000.
  expect(marginal).toBeLessThanOrEqual(Math.ceil(implied + 5 * Math.sqrt(implied)));
  expect(all.filter(({ finding }) => finding === 'out of limits')).toEqual([]);
  for (const check of EXACT) {
    const p = alarms.filter((each) => each.check === check).map(({ asLarge }) => asLarge);
    for (const level of [0.05, 0.2, 0.5]) {
      const found = p.filter((each) => each < level).length / p.length;
      console.log(`${check}: ${(100 * found).toFixed(1)} % as large as by chance in ${100 * level} %`);
      expect(Math.abs(found - level)).toBeLessThan(4 * Math.sqrt((level * (1 - level)) / p.length));
    }
  }
});

test('raises no false alarm after a fit, over 20 seeds', async () => {
  for (let seed = 1; seed <= 20; seed += 1) {
    const { found } = await findings({ seed: 6000 + seed }, true);
    expect(found.filter(({ finding }) => finding !== 'within limits')).toEqual([]);
  }
});
