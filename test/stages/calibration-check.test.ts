/** The kind `calibration-check`: planted faults are found, sound data pass, the error budget comes back. */

import { describe, expect, test } from 'vitest';
import { type ByteSource, memorySink, sourceOf } from '../../stages/bytes.ts';
import { calibrationCheck } from '../../stages/calibration-check/calibration-check.ts';
import type { Visibilities } from '../../stages/data.ts';
import { readVisibilities } from '../../stages/formats/visibilities.ts';
import { writeVisibilities } from '../../stages/formats/visibilities-write.ts';
import type { Finding } from '../../stages/kind.ts';
import { randomStream } from '../../stages/numerics/random.ts';
import { InputProblem } from '../../stages/problem.ts';
import { runKind } from './simulate-task.ts';

/** Where stations stand: the same letter is the same site. */
type Sites = readonly string[];
const ONE_PAIR: Sites = ['A1', 'A2', 'B1', 'C1', 'D1', 'E1'];
const TWO_PAIRS: Sites = ['A1', 'A2', 'B1', 'B2', 'C1', 'D1', 'E1'];
const NO_PAIR: Sites = ['A1', 'B1', 'C1', 'D1', 'E1'];

interface Faults {
  readonly noiseFactor?: number;
  /** Radians, on one baseline, by station names. */
  readonly baselinePhase?: readonly [string, string, number];
  readonly nonClosingPhase?: number;
  readonly nonClosingAmplitude?: number;
  readonly gains?: Readonly<Record<string, number>>;
  readonly gainScatter?: number;
  readonly scans?: number;
  /** Jy, stated. */
  readonly sigma?: number;
}

/** Jy, where a test does not say otherwise. */
const SIGMA = 0.01;

/** Made-up visibilities of 0.3 to 1 Jy with a noise of 10 mJy: one number per pair of sites and scan, station phases
 *  unknown in every scan. Nothing of it comes from the program but the random numbers. */
function observe(seed: number, sites: Sites, faults: Faults = {}): Visibilities {
  const {
    sigma = SIGMA,
    scans = 20,
    noiseFactor = 1,
    nonClosingPhase = 0,
    nonClosingAmplitude = 0,
    gainScatter = 0,
  } = faults;
  const stream = randomStream(seed, 'calibration test');
  const [rows, re, im]: [[number, number, number][], number[], number[]] = [[], [], []];
  for (let scan = 0; scan < scans; scan++) {
    const phases = sites.map(() => stream.between(-3, 3));
    const gains = sites.map((name) => (faults.gains?.[name] ?? 1) * Math.exp(gainScatter * stream.normal()));
    const sky = new Map<string, readonly [number, number]>();
    for (let i = 0; i < sites.length; i++) {
      for (let j = i + 1; j < sites.length; j++) {
        const [one, other] = [sites[i] as string, sites[j] as string];
        const key = `${one[0]}${other[0]}`;
        const seen = sky.get(key) ?? [
          stream.between(0.3, 1),
          one[0] === other[0] ? 0 : stream.between(-3, 3),
        ];
        sky.set(key, one[0] === other[0] ? [1.2, 0] : seen);
        const [amplitude, phase] = sky.get(key) as readonly [number, number];
        const planted = faults.baselinePhase;
        const own = planted?.[0] === one && planted[1] === other ? planted[2] : 0;
        const A =
          amplitude *
          (gains[i] as number) *
          (gains[j] as number) *
          Math.exp(nonClosingAmplitude * stream.normal());
        const phi =
          phase + (phases[i] as number) - (phases[j] as number) + own + nonClosingPhase * stream.normal();
        rows.push([i, j, scan]);
        re.push(A * Math.cos(phi) + noiseFactor * sigma * stream.normal());
        im.push(A * Math.sin(phi) + noiseFactor * sigma * stream.normal());
      }
    }
  }
  const column = (f: (row: readonly [number, number, number], k: number) => number) =>
    Float64Array.from(rows, f);
  const place = (name: string) => (name.charCodeAt(0) - 64) * 1e6 + name.charCodeAt(1);
  return {
    target: { name: 'Lantern nucleus', raDegrees: 180, decDegrees: 18 },
    arrayName: 'INVENTED',
    remark: 'Invented data.',
    stations: sites.map((name) => ({ name, xyz: [place(name), 6e6, 2e6] })),
    wavelengthMetres: 0.0013,
    bandwidthMetres: 1e-5,
    count: rows.length,
    station1: Int32Array.from(rows, ([i]) => i),
    station2: Int32Array.from(rows, ([, j]) => j),
    scan: Int32Array.from(rows, ([, , scan]) => scan),
    timeMjd: column(([, , scan]) => 62935 + scan / 50),
    integrationSeconds: column(() => 300),
    u: column(([i, j]) => (place(sites[j] as string) - place(sites[i] as string)) / 0.0013),
    v: column(() => 0),
    re: Float64Array.from(re),
    im: Float64Array.from(im),
    sigma: column(() => sigma),
    sigmaPhase: column((_, k) => sigma / Math.hypot(re[k] as number, im[k] as number)),
  };
}

interface Report {
  readonly errorBudget: Readonly<Record<string, number | null>>;
  readonly closures: Readonly<Record<string, number>>;
  readonly stationGains: readonly { station: string; gain: number; logGain: number }[];
  readonly gainRatios: readonly {
    stations: string[];
    meanLogRatio: number;
    scatter: number;
    logRatio: number[];
  }[];
  readonly pairs: readonly { stations: string[]; distanceMetres: number }[];
  readonly remark: string;
}

async function check(
  visibilities: Visibilities,
  written: Record<string, unknown> = {},
  ingestReport?: unknown,
) {
  const sink = memorySink();
  writeVisibilities(sink, visibilities);
  const json = (value: unknown): ByteSource =>
    sourceOf(new TextEncoder().encode(JSON.stringify(value)), 'report');
  const inputs = {
    visibilities: [sourceOf(sink.bytes(), 'visibilities')],
    ...(ingestReport === undefined ? {} : { report: [json(ingestReport)] }),
  };
  const { report, outputs } = await runKind(calibrationCheck, written, inputs);
  const text = new TextDecoder().decode(outputs.report?.read(0, outputs.report.size));
  return {
    ...report,
    document: JSON.parse(text) as Report,
    visibilities: readVisibilities(outputs.visibilities as ByteSource),
    finding: (name: string) => report.findings?.find((each) => each.check === name) as Finding,
  };
}

describe('Sound data', () => {
  test.each([1, 2, 3, 4, 5, 6])(
    'pass every check and need next to no error budget (seed %d)',
    async (seed) => {
      // The source of these data jumps from scan to scan, which a track through a real one does not.
      const { findings, warnings, stop, mark, document } = await check(
        observe(seed, TWO_PAIRS, { gainScatter: 0.05 }),
        { stationAmplitudes: { marginal: 2, limit: 3 } },
      );
      expect(findings?.map((each) => [each.check, each.finding])).toEqual([
        ['closureScatter', 'within limits'],
        ['redundantPhases', 'within limits'],
        ['redundantAmplitudes', 'within limits'],
        ['gainOffset', 'within limits'],
        ['gainScatter', 'within limits'],
        ['pairGainsOverTime', 'within limits'],
        ['stationAmplitudes', 'within limits'],
        ['closureTrends', 'within limits'],
      ]);
      expect([warnings, stop, mark]).toEqual([[], undefined, undefined]);
      // Thermal errors of these visibilities are 1 to 3 %; a scatter 10 % high by chance asks for 0.5 of that.
      expect(document.errorBudget.amplitudeFraction).toBeLessThan(0.012);
      expect(document.errorBudget.phaseDegrees).toBeLessThan(0.7);
    },
  );

  test('have a scatter near 1, within four standard errors', async () => {
    const { finding } = await check(observe(9, ONE_PAIR, { scans: 100 }));
    // 400 triangles and 300 differences; neighbours share a baseline, which widens the error to less than twice.
    expect(Math.abs(finding('closureScatter').value - 1)).toBeLessThan((4 * 2) / Math.sqrt(800));
    expect(Math.abs(finding('redundantPhases').value - 1)).toBeLessThan(4 / Math.sqrt(600));
    expect(Math.abs(finding('redundantAmplitudes').value - 1)).toBeLessThan(4 / Math.sqrt(600));
  });

  test('are counted right: per scan (N−1)(N−2)/2, N(N−3)/2, and N−2 triangles and N−3 quadrangles of a pair', async () => {
    const { document } = await check(observe(1, ONE_PAIR));
    expect(document.closures).toEqual({
      scans: 20,
      triangles: 200,
      quadrangles: 180,
      trivialTriangles: 80,
      trivialQuadrangles: 60,
    });
    expect(document.pairs).toEqual([{ stations: ['A1', 'A2'], distanceMetres: 1 }]);
    expect(document.remark).toBe('Invented data.');
  });

  test('have independent triangles only: of the four in two pairs one follows from the others', async () => {
    // Seven stations: 2 · 5 triangles hold a pair; the four among A1, A2, B1, B2 have rank 3.
    const { document } = await check(observe(1, TWO_PAIRS));
    expect(document.closures.trivialTriangles).toBe(20 * 9);
  });

  test('need no error budget at all where their scatter is below 1', async () => {
    const seen: boolean[] = [];
    for (let seed = 20; seed < 30; seed++) {
      const { finding, document } = await check(observe(seed, ONE_PAIR));
      const low = finding('closureScatter').value <= 1;
      expect(document.errorBudget.phaseDegrees === 0).toBe(low);
      seen.push(low);
    }
    expect(new Set(seen).size).toBe(2);
  });

  test('have gains that do not scatter once the noise is taken off, however faint they are', async () => {
    // Ratios of 0.3 to 1 Jy with 50 mJy, mean of four: 5 % from noise alone.
    const { finding } = await check(observe(14, ONE_PAIR, { sigma: 0.05, scans: 60 }));
    expect(finding('gainScatter').value).toBeLessThan(0.025);
  });

  test('are judged the same whatever the phases and gains of stations', async () => {
    const plain = observe(3, ONE_PAIR);
    const turned = { ...plain, re: plain.re.slice(), im: plain.im.slice(), sigma: plain.sigma.slice() };
    const stream = randomStream(1, 'turns');
    const errors = Array.from(
      { length: 20 * 6 },
      () => [stream.between(0.5, 2), stream.between(-3, 3)] as const,
    );
    for (let k = 0; k < plain.count; k++) {
      const [i, j, scan] = [plain.station1[k], plain.station2[k], plain.scan[k]] as [number, number, number];
      const [g1, p1] = errors[scan * 6 + i] as readonly [number, number];
      const [g2, p2] = errors[scan * 6 + j] as readonly [number, number];
      const [c, s] = [g1 * g2 * Math.cos(p1 - p2), g1 * g2 * Math.sin(p1 - p2)];
      const [re, im] = [plain.re[k] as number, plain.im[k] as number];
      turned.re[k] = c * re - s * im;
      turned.im[k] = s * re + c * im;
      turned.sigma[k] = g1 * g2 * SIGMA;
    }
    const [one, other] = [await check(plain), await check(turned, { outOfLimits: 'mark' })];
    for (const name of ['closureScatter', 'redundantPhases', 'redundantAmplitudes']) {
      expect(other.finding(name).value).toBeCloseTo(one.finding(name).value, 9);
    }
  });
});

describe('Faults', () => {
  test.each([1, 2, 3])('of noise twice what is stated double the scatter (seed %d)', async (seed) => {
    const { finding } = await check(observe(seed, ONE_PAIR, { noiseFactor: 2 }));
    for (const name of ['closureScatter', 'redundantPhases', 'redundantAmplitudes']) {
      expect(finding(name).finding).toBe('marginal');
      expect(Math.abs(finding(name).value - 2)).toBeLessThan(0.4);
    }
  });

  test('of noise six times what is stated stop the run, with the reason', async () => {
    const { finding, stop, mark } = await check(observe(4, ONE_PAIR, { noiseFactor: 6 }));
    expect(finding('closureScatter').finding).toBe('out of limits');
    expect(stop).toMatch(
      /^Calibration out of limits: closureScatter is \d\.\d\d, limit 2\.5; redundantPhases is \d\.\d\d, limit 2\.5; redundantAmplitudes is \d\.\d\d, limit 2\.5\.$/,
    );
    expect(mark).toBeUndefined();
  });

  test('only mark the plates when the recipe says so', async () => {
    const written = { outOfLimits: 'mark', closureScatter: { marginal: 0.1, limit: 0.2 } };
    const { stop, mark } = await check(observe(4, ONE_PAIR), written);
    expect(stop).toBeUndefined();
    expect(mark).toMatch(/^Calibration out of limits: closureScatter is /);
  });

  test('of a phase that does not close are found, and the baseline is named', async () => {
    const { finding } = await check(observe(5, ONE_PAIR, { baselinePhase: ['A2', 'C1', 0.15] }));
    expect(finding('closureScatter').finding).not.toBe('within limits');
    expect(finding('closureScatter').detail).toContain('largest for A1–A2–C1,');
    expect(finding('redundantPhases').finding).not.toBe('within limits');
    expect(finding('redundantPhases').detail).toContain('largest for A1, A2 to C1,');
    expect(finding('redundantAmplitudes').finding).toBe('within limits');
  });

  test('of the short baseline alone show in triangles and not in redundant baselines', async () => {
    const { finding } = await check(observe(6, ONE_PAIR, { baselinePhase: ['A1', 'A2', 0.1] }));
    expect(finding('closureScatter').finding).not.toBe('within limits');
    // Planted: 0.1 rad = 5.73 degrees in every triangle; the mean of 80 with errors of 1.5 degrees.
    const offset = Number(/median closure phase (-?[\d.]+) deg/.exec(finding('closureScatter').detail)?.[1]);
    expect(Math.abs(offset - 5.73)).toBeLessThan(0.6);
    expect(finding('redundantPhases').finding).toBe('within limits');
  });

  test('of a gain off by a third are found, and the station is named where two pairs allow to', async () => {
    const { finding, document } = await check(
      observe(7, TWO_PAIRS, { gains: { A2: 0.67 }, gainScatter: 0.05 }),
    );
    const { value, detail } = finding('gainOffset');
    expect(finding('gainOffset').finding).toBe('marginal');
    // ln 0.67 = −0.4005; two stations of 5 % over 20 scans: 0.016.
    expect(Math.abs(value - 0.4005)).toBeLessThan(0.064);
    expect(detail).toMatch(
      /^Largest mean log gain ratio of 2 co-located pairs: A1 and A2, 0\.\d+ over 20 scans; farthest from the others is A2, 0\.\d+ low in ln\.$/,
    );
    const gain = Object.fromEntries(document.stationGains.map((each) => [each.station, each.gain]));
    expect(Math.abs((gain.A2 ?? 0) - 0.67)).toBeLessThan(0.06);
    for (const name of ['A1', 'B1', 'B2']) expect(Math.abs((gain[name] ?? 0) - 1)).toBeLessThan(0.06);
  });

  test('of a gain in the only pair leave open which of the two it is', async () => {
    const { finding } = await check(observe(8, ONE_PAIR, { gains: { A2: 0.67 } }));
    expect(finding('gainOffset').detail).toContain('which of the two is off, one pair alone does not say');
  });

  test('of gains that scatter from scan to scan are measured', async () => {
    const { finding, document } = await check(observe(9, ONE_PAIR, { gainScatter: 0.25, scans: 60 }));
    // Two stations: 0.25 √2 = 0.354, from 60 scans good to 9 %.
    expect(Math.abs(finding('gainScatter').value - 0.3536)).toBeLessThan(0.13);
    expect(finding('gainScatter').finding).toBe('marginal');
    expect(document.gainRatios[0]?.logRatio).toHaveLength(60);
  });
});

describe('The error budget', () => {
  test('recovers the errors that were planted: 6 % and 4 degrees', async () => {
    const planted = { nonClosingAmplitude: 0.06, nonClosingPhase: (4 * Math.PI) / 180, scans: 100 };
    const data = observe(10, ONE_PAIR, planted);
    const { document, visibilities, warnings } = await check(data, { outOfLimits: 'mark' });
    const { amplitudeFraction = 0, phaseDegrees = 0 } = document.errorBudget;
    // From 300 and 400 values: 4 to 8 %, two to three times that are let stand.
    expect(Math.abs((amplitudeFraction ?? 0) / 0.06 - 1)).toBeLessThan(0.15);
    expect(Math.abs((phaseDegrees ?? 0) / 4 - 1)).toBeLessThan(0.15);
    expect(warnings).toEqual([]);
    for (const k of [0, 17, 300]) {
      const A = Math.hypot(data.re[k] as number, data.im[k] as number);
      const f = amplitudeFraction ?? 0;
      const s = ((phaseDegrees ?? 0) * Math.PI) / 180;
      expect(visibilities.sigma[k]).toBeCloseTo(Math.hypot(SIGMA, f * A), 12);
      expect(visibilities.sigmaPhase[k]).toBeCloseTo(Math.hypot(SIGMA / A, s), 12);
    }
    // With the budget in the errors a second check finds nothing left.
    const again = await check(visibilities);
    expect(again.finding('closureScatter').value).toBeCloseTo(1, 2);
    expect(again.document.errorBudget.phaseDegrees).toBeLessThan(0.1);
  });

  test('leaves everything else in the visibilities as it was', async () => {
    const data = observe(11, ONE_PAIR);
    const { visibilities } = await check(data, { amplitudeBudget: 0.1, phaseBudget: '2 deg' });
    const { sigma: _1, sigmaPhase: _2, re, im, ...rest } = visibilities;
    const { sigma: _3, sigmaPhase: _4, re: re0, im: im0, u: u0, ...rest0 } = data;
    expect({ ...rest, u: 0 }).toEqual({ ...rest0, u: 0 });
    for (let k = 0; k < data.count; k++) {
      expect(re[k]).toBeCloseTo(re0[k] as number, 12);
      expect(im[k]).toBeCloseTo(im0[k] as number, 12);
      expect((rest.u[k] as number) / (u0[k] as number)).toBeCloseTo(1, 12);
    }
    const A = Math.hypot(data.re[3] as number, data.im[3] as number);
    expect(visibilities.sigma[3]).toBeCloseTo(Math.hypot(SIGMA, 0.1 * A), 12);
    expect(visibilities.sigmaPhase[3]).toBeCloseTo(Math.hypot(SIGMA / A, (2 * Math.PI) / 180), 12);
  });
});

describe('The interval of the error budget', () => {
  test('holds the planted error in 68 % of cases', async () => {
    const [planted, degrees] = [0.05, (0.04 * 180) / Math.PI];
    let [amplitudes, phases] = [0, 0];
    const seeds = 30;
    for (let seed = 1; seed <= seeds; seed++) {
      const errors = { nonClosingAmplitude: planted, nonClosingPhase: 0.04, scans: 10 };
      const { document } = await check(observe(700 + seed, ONE_PAIR, errors), { outOfLimits: 'mark' });
      const { amplitudeInterval, phaseIntervalDegrees } = document.errorBudget as unknown as Record<
        string,
        [number, number]
      >;
      if (amplitudeInterval[0] <= planted && planted <= amplitudeInterval[1]) amplitudes++;
      if (phaseIntervalDegrees[0] <= degrees && degrees <= phaseIntervalDegrees[1]) phases++;
    }
    // Binomial with 30 and 0.683: 20.5 ± 2.5, to four standard deviations below and all but all above. The chi-square is
    // exact for phases of triangles with their covariance, and for amplitudes.
    for (const count of [amplitudes, phases]) {
      expect(count).toBeGreaterThan(20.5 - 10);
      expect(count).toBeLessThan(30);
    }
  });

  test('is null where the recipe gives the error', async () => {
    const { document } = await check(observe(1, ONE_PAIR), { amplitudeBudget: 0.1, phaseBudget: '2 deg' });
    expect(document.errorBudget).toMatchObject({ amplitudeInterval: null, phaseIntervalDegrees: null });
  });
});

describe('False alarms', () => {
  test('come as often as the report says: probabilities are spread evenly over 40 seeds', async () => {
    const asLarge = new Map<string, number[]>();
    for (let seed = 1; seed <= 40; seed++) {
      const { document } = await check(observe(300 + seed, ONE_PAIR, { scans: 12 }), { outOfLimits: 'mark' });
      for (const alarm of (document as unknown as { falseAlarms: { check: string; asLarge: number }[] })
        .falseAlarms) {
        asLarge.set(alarm.check, [...(asLarge.get(alarm.check) ?? []), alarm.asLarge]);
      }
    }
    expect([...asLarge.keys()]).toEqual([
      'closureScatter',
      'redundantPhases',
      'redundantAmplitudes',
      'closureTrends',
    ]);
    for (const [check, p] of asLarge) {
      for (const level of [0.1, 0.3, 0.5, 0.7, 0.9]) {
        // Four standard deviations of a binomial; rank correlations with time and elevation are not independent, for
        // which the allowance for trials is too large: alarms are rarer there, never more frequent.
        const found = p.filter((each) => each < level).length / p.length;
        const four = 4 * Math.sqrt((level * (1 - level)) / p.length);
        expect(found, `${check} below ${level}`).toBeLessThan(level + four);
        if (check !== 'closureTrends') expect(found, `${check} below ${level}`).toBeGreaterThan(level - four);
      }
    }
  });

  test('are stated for the limits in force', async () => {
    const limits = { closureScatter: { marginal: 1, limit: 1.2 } };
    const { document } = await check(observe(1, ONE_PAIR), { ...limits, outOfLimits: 'mark' });
    const [alarm] = (
      document as unknown as { falseAlarms: { check: string; marginal: number; outOfLimits: number }[] }
    ).falseAlarms;
    // 80 triangles: chi-square of 80 degrees above 80 in a little less than half, above 115.2 between the 112.329 of 0.01
    // and the 116.321 of 0.005 (Abramowitz & Stegun, table 26.8).
    expect(alarm.check).toBe('closureScatter');
    expect(alarm.marginal).toBeGreaterThan(0.45);
    expect(alarm.marginal).toBeLessThan(0.5);
    expect(alarm.outOfLimits).toBeGreaterThan(0.005);
    expect(alarm.outOfLimits).toBeLessThan(0.01);
  });
});

describe('Data without co-located stations', () => {
  test('are passed on as they are, with a warning for every check that could not be made', async () => {
    const data = observe(12, NO_PAIR);
    const { findings, warnings, document, visibilities } = await check(data);
    expect(findings?.map(({ check }) => check)).toEqual(['stationAmplitudes']);
    expect(warnings).toEqual([
      'Check closureScatter was not made: 0 independent closure phases of triangles with two co-located stations, at least 10 are needed.',
      'Check redundantPhases was not made: 0 independent phase differences on far baselines of co-located stations, at least 10 are needed.',
      'Check redundantAmplitudes was not made: 0 independent closure amplitudes that must be 1, at least 10 are needed.',
      'Check gainOffset was not made: no two co-located stations share a far baseline in two scans.',
      'Check gainScatter was not made: no two co-located stations share a far baseline in two scans.',
      'Check pairGainsOverTime was not made: no two co-located stations share a far baseline in 4 scans.',
      'Check closureTrends was not made: no triangle with two co-located stations in 8 scans.',
      'The amplitude of the error budget is 0: 0 values are too few to estimate it.',
      'The phase of the error budget is 0: 0 values are too few to estimate it.',
    ]);
    expect(document.closures).toMatchObject({ triangles: 120, quadrangles: 100, trivialTriangles: 0 });
    expect(visibilities.sigma).toEqual(data.sigma);
  });

  test('count as co-located within the distance that the recipe declares', async () => {
    const { document } = await check(observe(13, ONE_PAIR), { colocated: '0.5 m' });
    expect(document.pairs).toEqual([]);
  });
});

describe('The stated noise', () => {
  const report = (median: number | null) => ({
    scatter: { definition: '', averages: 400, median, worst: null },
  });

  test('is judged by the root of the median reduced chi-square in the report of ingest', async () => {
    const { finding } = await check(observe(1, ONE_PAIR), {}, report(4));
    expect(finding('statedNoise')).toEqual({
      check: 'statedNoise',
      finding: 'out of limits',
      value: 2,
      marginal: 1.4,
      limit: 1.8,
      detail: 'Median scatter of records inside 400 averages, over the stated noise.',
    });
  });

  test('is not judged where scans have single records', async () => {
    const { warnings } = await check(observe(1, ONE_PAIR), {}, report(null));
    expect(warnings).toEqual([
      'Check statedNoise was not made: 400 averages of three records or more, at least 10 are needed.',
    ]);
  });

  test('cannot be read from another document', async () => {
    await expect(check(observe(1, ONE_PAIR), {}, { findings: [] })).rejects.toThrow(InputProblem);
    await expect(check(observe(1, ONE_PAIR), {}, { findings: [] })).rejects.toThrow(
      /^report, scatter: wrong-document: expected the report of a stage of kind ingest, with scatter\.averages and scatter\.median, got /,
    );
  });
});

test('Limits in the wrong order are refused', async () => {
  await expect(check(observe(1, ONE_PAIR), { gainOffset: { marginal: 2, limit: 1 } })).rejects.toThrow(
    'parameter gainOffset: parameter: expected marginal no larger than limit, got 2 and 1. Exchange them, or correct one.',
  );
});
