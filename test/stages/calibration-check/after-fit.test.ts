/** Checks after a fit, on documents of a fit written by hand: gains that drop, baselines that do not close. */

import { describe, expect, test } from 'vitest';
import { sourceOf } from '../../../stages/bytes.ts';
import { checkAfterFit } from '../../../stages/calibration-check/after-fit.ts';
import { calibrationCheck } from '../../../stages/calibration-check/calibration-check.ts';
import type { Judged } from '../../../stages/calibration-check/findings.ts';
import { readParameters } from '../../../stages/calibration-check/parameters.ts';
import { randomStream } from '../../../stages/numerics/random.ts';
import { resolve } from '../simulate-task.ts';

const parameters = readParameters(resolve(calibrationCheck, {}));
const json = (value: unknown, name: string) =>
  sourceOf(new TextEncoder().encode(JSON.stringify(value)), name);

/** Six stations whose gains scatter by 0.1 over twelve scans; `off` is added. */
function fitReport(off: (station: string, scan: number) => number) {
  const stations = ['AA', 'BB', 'CC', 'DD', 'EE', 'FF'];
  const stream = randomStream(4, 'gains of a fit');
  const scans = Array.from({ length: 12 }, (_, scan) => ({
    scan,
    stations,
    gains: stations.map((station) => 0.1 * stream.normal() + off(station, scan)),
    deviations: stations.map(() => 0.03),
  }));
  return { gains: { scans } };
}

interface Planted {
  readonly phase?: readonly [number, number, number];
  readonly logAmplitude?: readonly [number, number, number];
}

/** Six stations, ten scans, visibilities of any phase and amplitude, the model exact but for station phases and gains. */
function residuals(seed: number, planted: Planted = {}, N = 6) {
  const stream = randomStream(seed, 'residuals of a fit');
  const columns = ['u', 'v', 'station1', 'station2', 'scan', 'sigma', 're', 'im', 'modelRe', 'modelIm'];
  const rows: Record<string, number[]> = Object.fromEntries(columns.map((name) => [name, []]));
  const sigma = 0.02;
  for (let scan = 0; scan < 10; scan++) {
    const phases = Array.from({ length: N }, () => stream.between(-3, 3));
    const gains = Array.from({ length: N }, () => 0.2 * stream.normal());
    for (let i = 0; i < N; i++) {
      for (let j = i + 1; j < N; j++) {
        const [A, phi] = [stream.between(0.4, 1), stream.between(-3, 3)];
        const of = (what: Planted['phase']) => (what?.[0] === i && what[1] === j ? what[2] : 0);
        const seen = A * Math.exp(gains[i] + gains[j] + of(planted.logAmplitude));
        const angle = phi + phases[i] - phases[j] + of(planted.phase);
        const values = [
          1e9 * (j - i),
          1e8 * i,
          i,
          j,
          scan,
          sigma,
          seen * Math.cos(angle) + sigma * stream.normal(),
          seen * Math.sin(angle) + sigma * stream.normal(),
          A * Math.cos(phi),
          A * Math.sin(phi),
        ];
        columns.forEach((name, k) => {
          rows[name].push(values[k]);
        });
      }
    }
  }
  return { stations: ['AA', 'BB', 'CC', 'DD', 'EE', 'FF'].slice(0, N), visibilities: rows };
}

function afterResiduals(seed: number, planted: Planted = {}) {
  const source = json(residuals(seed, planted), 'residuals');
  const { outcomes, baselines } = checkAfterFit(undefined, source, parameters);
  const [phases, amplitudes] = outcomes as Judged[];
  return { phases, amplitudes, baselines };
}

describe('Gains of a fit over time', () => {
  test('that scatter by 10 % are within limits; one that drops by half names station and scans', () => {
    const quiet = checkAfterFit(
      json(
        fitReport(() => 0),
        'fitReport',
      ),
      undefined,
      parameters,
    );
    expect(quiet.outcomes).toMatchObject([{ check: 'gainsOverTime', finding: 'within limits' }]);
    const isDown = (station: string, scan: number) => station === 'DD' && (scan === 5 || scan === 6);
    const drop = fitReport((station, scan) => (isDown(station, scan) ? Math.log(0.5) : 0));
    const { outcomes, stationGains } = checkAfterFit(json(drop, 'fitReport'), undefined, parameters);
    expect(outcomes).toMatchObject([{ check: 'gainsOverTime', finding: 'out of limits' }]);
    expect((outcomes[0] as Judged).detail).toMatch(/: DD, 0\.\d\d low in scans 5, 6\.$/);
    expect(stationGains?.map(({ station, scans }) => [station, scans.length])).toContainEqual(['DD', 12]);
  });

  test('count by station, wherever a station stands in a scan’s list', () => {
    const one = { scan: 0, stations: ['AA', 'BB'], gains: [0.1, 0.2], deviations: [0.01, 0.02] };
    const two = { scan: 1, stations: ['BB'], gains: [0.3], deviations: [0.03] };
    const report = json({ gains: { scans: [one, two] } }, 'fitReport');
    const { stationGains, outcomes } = checkAfterFit(report, undefined, parameters);
    expect(stationGains).toEqual([
      { station: 'AA', scans: [0], logGain: [0.1], deviations: [0.01] },
      { station: 'BB', scans: [0, 1], logGain: [0.2, 0.3], deviations: [0.02, 0.03] },
    ]);
    expect(outcomes).toEqual([
      { check: 'gainsOverTime', tooLittle: '3 gains in the fit, at least 10 are needed' },
    ]);
  });
});

describe('Baselines after a fit', () => {
  test('that close show nothing, whatever the phases and gains of stations: over 100 seeds none of 15 is 4 errors off', () => {
    let alarms = 0;
    const sizes: number[] = [];
    for (let seed = 1; seed <= 100; seed++) {
      const { phases, amplitudes, baselines } = afterResiduals(seed);
      alarms += [phases, amplitudes].filter(({ value }) => value > 0).length;
      for (const { estimate, error } of baselines?.phasesDegrees ?? []) sizes.push(estimate / error);
    }
    // 200 times 15 values beyond 4 in 6.3e-5 each: 0.19 expected.
    expect(alarms).toBeLessThanOrEqual(2);
    // Estimates over their errors have unit variance; errors are raised, by the scatter where it is above 1, a few per cent.
    const variance = sizes.reduce((sum, z) => sum + z * z, 0) / sizes.length;
    expect(variance).toBeGreaterThan(0.8);
    expect(variance).toBeLessThan(1.05);
  });

  test.each([1, 2, 3])(
    'with a phase of 10 degrees are named, and it is estimated right (seed %d)',
    (seed) => {
      const { phases, amplitudes } = afterResiduals(seed, { phase: [1, 4, Math.PI / 18] });
      expect(phases.finding).toBe('out of limits');
      const found = /: BB–EE, ([-\d.]+) ± ([\d.]+) in 10 scans/.exec(phases.detail);
      expect(Math.abs(Number(found?.[1]) - 10)).toBeLessThan(3.5 * Number(found?.[2]));
      expect(Number(found?.[2])).toBeLessThan(1.5);
      expect(amplitudes.finding).toBe('within limits');
    },
  );

  test('with an amplitude that is off by 0.35 in ln are named, and phases are not blamed', () => {
    const { phases, amplitudes } = afterResiduals(5, { logAmplitude: [0, 3, 0.35] });
    expect(amplitudes.finding).toBe('out of limits');
    const found = /: AA–DD, ([-\d.]+) ± ([\d.]+) in 10 scans/.exec(amplitudes.detail);
    expect(Math.abs(Number(found?.[1]) - 0.35)).toBeLessThan(3.5 * Number(found?.[2]));
    expect(phases.finding).toBe('within limits');
  });

  test('of too few closures are not judged', () => {
    const { outcomes } = checkAfterFit(undefined, json(residuals(1, {}, 3), 'residuals'), parameters);
    expect(outcomes).toEqual([
      expect.objectContaining({ check: 'baselinePhases', finding: 'within limits' }),
      {
        check: 'baselineAmplitudes',
        tooLittle: '0 independent closures in the fit, at least 10 are needed',
      },
    ]);
  });

  test.each([3, 8])(
    'of a fit that does not follow the data are not judged (errors %d times as large)',
    (times) => {
      const { stations, visibilities } = residuals(1);
      const poor = { ...visibilities, sigma: visibilities.sigma.map((value) => value / times) };
      const { outcomes } = checkAfterFit(
        undefined,
        json({ stations, visibilities: poor }, 'residuals'),
        parameters,
      );
      expect(outcomes).toEqual(
        ['baselinePhases', 'baselineAmplitudes'].map((check) => ({
          check,
          tooLittle: expect.stringMatching(
            /^the fit leaves \d+ independent closures with a scatter of \d\.\d\d over their errors when any one baseline is set free, at most 1\.5 is told apart: /,
          ),
        })),
      );
    },
  );

  test('cannot be read from another document', () => {
    expect(() => checkAfterFit(undefined, json({ stations: [] }, 'residuals'), parameters)).toThrow(
      /^residuals, visibilities: wrong-document: expected the output `residuals` of a stage of kind fit, got /,
    );
    expect(() => checkAfterFit(json({}, 'fitReport'), undefined, parameters)).toThrow(
      /^fitReport, gains: wrong-document: expected the output `report` of a stage of kind fit, got /,
    );
  });
});
