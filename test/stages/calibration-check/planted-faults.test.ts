/** Faults that the checks see without a fit: the right one is out of limits and names the station or baseline. */

import { describe, expect, test } from 'vitest';
import type { Visibilities } from '../../../stages/data.ts';
import { InputProblem } from '../../../stages/problem.ts';
import { changed, checked, jsonOf, observed } from '../planted-array.ts';

const inputsOf = ({ visibilities, report }: Awaited<ReturnType<typeof observed>>) => ({
  visibilities: [visibilities],
  report: [report],
});

/** Without a fault, made once. */
const sound = observed({});

/** Turns the phase of one baseline by an angle in degrees that depends on the row. */
function turned(
  data: Visibilities,
  one: string,
  other: string,
  angle: (row: number) => number,
): Visibilities {
  const turn = (row: number) => {
    const names = [data.stations[data.station1[row]].name, data.stations[data.station2[row]].name];
    return names.includes(one) && names.includes(other) ? (angle(row) * Math.PI) / 180 : 0;
  };
  return {
    ...data,
    re: data.re.map((re, k) => re * Math.cos(turn(k)) - data.im[k] * Math.sin(turn(k))),
    im: data.im.map((im, k) => im * Math.cos(turn(k)) + data.re[k] * Math.sin(turn(k))),
  };
}

describe('Without a fault', () => {
  test('every check is within its limits', async () => {
    const { findings, warnings } = await checked(inputsOf(await sound));
    for (const { check, finding, detail } of findings)
      expect({ check, finding, detail }).toEqual({ check, finding: 'within limits', detail });
    expect(findings.map(({ check }) => check)).toEqual([
      'closureScatter',
      'redundantPhases',
      'redundantAmplitudes',
      'gainOffset',
      'gainScatter',
      'pairGainsOverTime',
      'stationAmplitudes',
      'closureTrends',
      'statedNoise',
      'noiseByBaseline',
    ]);
    expect(warnings).toEqual([]);
  });

  test('the Sun’s distance is that of March: opposite in right ascension, 163 degrees', async () => {
    // The Sun on 2031 March 10 stands at right ascension 23 h 23 m, declination −4° (common practice, an almanac of any
    // year), the target at 12 h, 18°: 180° − 9° in right ascension, 14° in declination.
    const { document } = await checked(inputsOf(await sound));
    expect(document.trends.sunDistanceDegrees).toBeGreaterThan(161);
    expect(document.trends.sunDistanceDegrees).toBeLessThan(166);
  });
});

describe('A gain that drops by half for an hour', () => {
  test('is found by the other station of its pair, and the baseline between tells which it is', async () => {
    const fault = { fault: 'gain-drop', station: 'FLINT-B', from: '7 h', duration: '1 h', value: 0.5 };
    const { finding } = await checked(inputsOf(await observed({ faults: [fault] })));
    expect(finding('pairGainsOverTime').finding).toBe('out of limits');
    expect(finding('pairGainsOverTime').detail).toMatch(
      /FLINT-A over FLINT-B, 0\.\d\d high in scans 14 and 15; by the baseline between them it is FLINT-B, 0\.\d\d low\.$/,
    );
  });

  test('is found in the amplitudes of all baselines of a station that stands alone, without a fit', async () => {
    const fault = { fault: 'gain-drop', station: 'BEACON', from: '4 h', duration: '1 h', value: 0.5 };
    const { finding } = await checked(inputsOf(await observed({ faults: [fault] })));
    expect(finding('stationAmplitudes').finding).toBe('out of limits');
    expect(finding('stationAmplitudes').detail).toMatch(/: BEACON, 0\.\d\d low in scans 8 and 9\.$/);
    expect(finding('pairGainsOverTime').finding).toBe('within limits');
  });

  test('is not seen where a station always scatters by as much', async () => {
    const observation = await sound;
    const { finding } = await checked(inputsOf(observation));
    const wild = changed(observation.visibilities, (data) => {
      const gain = (row: number) => {
        const of = [data.station1[row], data.station2[row]].some((k) => data.stations[k].name === 'BEACON');
        return of && data.scan[row] % 4 < 2 ? 0.5 : 1;
      };
      return {
        ...data,
        re: data.re.map((re, k) => re * gain(k)),
        im: data.im.map((im, k) => im * gain(k)),
        sigma: data.sigma.map((sigma, k) => sigma * gain(k)),
      };
    });
    const after = await checked({ visibilities: [wild] });
    expect(finding('stationAmplitudes').finding).toBe('within limits');
    expect(after.finding('stationAmplitudes').finding).toBe('within limits');
  });
});

describe('A phase that does not close', () => {
  test.each([
    ['FLINT-A', 'FLINT-B', 'FLINT-A–FLINT-B'],
    ['WICK-B', 'BEACON', 'WICK-B–BEACON or WICK-A–BEACON'],
  ])(
    'of 10 degrees on %s–%s is found in triangles that must close, and named',
    async (station, other, named) => {
      const faults = [{ fault: 'non-closing-phase', station, other, value: 10 }];
      const { finding } = await checked(inputsOf(await observed({ faults })));
      expect(finding('closureScatter').finding).toBe('out of limits');
      const found = /a phase of ([\d.]+) ± ([\d.]+) deg on (.*) explains most/.exec(
        finding('closureScatter').detail,
      );
      expect(found?.[3].split(' or ').sort()).toEqual(named.split(' or ').sort());
      expect(Math.abs(Number(found?.[1]) - 10)).toBeLessThan(3 * Number(found?.[2]));
    },
  );

  test('and grows with time, or with the Sun, is a trend that is named', async () => {
    const { visibilities } = await sound;
    const drifting = changed(visibilities, (data) =>
      turned(data, 'WICK-A', 'TALLOW', (row) => 150 * (data.timeMjd[row] - data.timeMjd[0])),
    );
    const { finding } = await checked({ visibilities: [drifting] });
    expect(finding('closureTrends').finding).toBe('out of limits');
    expect(finding('closureTrends').detail).toContain('WICK-A–WICK-B–TALLOW against time, tau');
  });
});

describe('Noise understated by a factor of 2', () => {
  test.each([
    [{}, /27 of 28|28 of 28/],
    [
      { station: 'TALLOW' },
      /largest of 28 baselines: \S*TALLOW.* [67] of 28 are above 1\.3, all with TALLOW\.$/,
    ],
    [
      { station: 'EMBER', other: 'GLIM' },
      /largest of 28 baselines: EMBER–GLIM, .* 1 of 28 are above 1\.3\.$/,
    ],
  ])('on %j is out of limits, and named', async (where, named) => {
    const faults = [{ fault: 'noise-understated', value: 2, ...where }];
    const { finding } = await checked(inputsOf(await observed({ faults })));
    expect(finding('noiseByBaseline').finding).toBe('out of limits');
    expect(finding('noiseByBaseline').detail).toMatch(named);
    expect(finding('statedNoise').finding).toBe('station' in where ? 'within limits' : 'out of limits');
  });

  test('is measured by baseline as the mean of the scans, by their degrees of freedom', async () => {
    const { report } = await sound;
    const { scatter } = jsonOf(report) as {
      scatter: {
        averages: number;
        baselines: { baseline: string; averages: number; degrees: number; value: number }[];
      };
    };
    expect(scatter.baselines.reduce((sum, { averages }) => sum + averages, 0)).toBe(scatter.averages);
    // Five records an average: 2 (5 − 1) degrees of freedom.
    for (const { averages, degrees } of scatter.baselines) expect(degrees).toBe(8 * averages);
    const all = scatter.baselines.reduce((sum, { degrees }) => sum + degrees, 0);
    const chiSquare = scatter.baselines.reduce((sum, { degrees, value }) => sum + degrees * value, 0);
    expect(Math.abs(chiSquare / all - 1)).toBeLessThan(4 * Math.sqrt(2 / all));
  });
});

describe('Geometry', () => {
  test('of two stations exchanged, and of a clock 1 s late, is out of limits in ingest', async () => {
    const swapped = await observed({
      faults: [{ fault: 'stations-swapped', station: 'EMBER', other: 'BEACON' }],
    });
    expect(swapped.stop).toContain('EMBER and BEACON exchanged');
    const late = await observed({ faults: [{ fault: 'clock-offset', value: 1 }] });
    expect(late.findings.find(({ check }) => check === 'clock')).toMatchObject({ finding: 'out of limits' });
  });
});

describe('A fault in the recipe', () => {
  test.each([
    [{ fault: 'gain-drop' }, 'expected 1 different stations for gain-drop, got none'],
    [
      { fault: 'noise-understated', station: 'EMBER', other: 'EMBER' },
      'expected 0 to 2 different stations for noise-understated, got EMBER and EMBER',
    ],
    [{ fault: 'noise-understated', value: 0 }, 'expected a factor above 0, got 0'],
    [{ fault: 'gain-drop', station: 'GLIMMER' }, 'got GLIMMER. Correct the name.'],
  ])('%j is refused', async (fault, text) => {
    await expect(observed({ faults: [fault] })).rejects.toThrow(InputProblem);
    await expect(observed({ faults: [fault] })).rejects.toThrow(text);
  });
});
