/** The check `otherAgreement`: simulated hands and bands agree, planted faults of one of them are found and named, and
 *  what cannot be compared is said. */

import { beforeAll, describe, expect, test } from 'vitest';
import { type ByteSource, memorySink, sourceOf } from '../../../stages/bytes.ts';
import { calibrationCheck } from '../../../stages/calibration-check/calibration-check.ts';
import type { Visibilities } from '../../../stages/data.ts';
import { readVisibilities } from '../../../stages/formats/visibilities.ts';
import { writeVisibilities } from '../../../stages/formats/visibilities-write.ts';
import { ingest } from '../../../stages/ingest/ingest.ts';
import type { Finding } from '../../../stages/kind.ts';
import { randomStream } from '../../../stages/numerics/random.ts';
import { simulate } from '../../../stages/simulate/simulate.ts';
import { runKind, SMALL } from '../simulate-task.ts';

/** Twelve scans of the invented observation. */
const OBSERVATION = { ...SMALL, interval: '10 min' };

async function observe(written: Record<string, unknown>): Promise<ByteSource> {
  const { outputs } = await runKind(simulate, { ...OBSERVATION, ...written });
  return outputs.data as ByteSource;
}

async function ingested(data: ByteSource, polarisation = 'stokes-i'): Promise<Visibilities> {
  const { outputs } = await runKind(ingest, { polarisation }, { data: [data] });
  return readVisibilities(outputs.visibilities as ByteSource);
}

async function hands(seed: number): Promise<[Visibilities, Visibilities]> {
  const data = await observe({ seed });
  return [await ingested(data, 'RR'), await ingested(data, 'LL')];
}

interface Part {
  readonly independent: number;
  readonly scatter: number;
  readonly medianDifference: number;
  readonly baselines: readonly { baseline: string; scans: number; scatter: number }[];
}

interface Report {
  readonly errorBudget: {
    readonly amplitudeFraction: number;
    readonly phaseDegrees: number;
    readonly lowerBounds?: readonly string[];
  };
  readonly otherAgreement?: {
    readonly rowsInCommon: number;
    readonly rowsCompared: number;
    readonly medianUvDifference: number;
    readonly closurePhases: Part | null;
    readonly logClosureAmplitudes: Part | null;
  };
}

function sourceFor(visibilities: Visibilities, name: string): ByteSource {
  const sink = memorySink();
  writeVisibilities(sink, visibilities);
  return sourceOf(sink.bytes(), name);
}

async function check(first: Visibilities, other: Visibilities, written: Record<string, unknown> = {}) {
  const { report, outputs } = await runKind(calibrationCheck, written, {
    visibilities: [sourceFor(first, 'visibilities')],
    other: [sourceFor(other, 'other')],
  });
  const text = new TextDecoder().decode(outputs.report?.read(0, outputs.report.size));
  return {
    stop: report.stop,
    warnings: report.warnings ?? [],
    finding: report.findings?.find((each) => each.check === 'otherAgreement') as Finding,
    document: JSON.parse(text) as Report,
  };
}

/** Multiplies a row by factor exp(i phase), and its error by factor. */
function changed(
  data: Visibilities,
  change: (row: number) => readonly [factor: number, phase: number],
): Visibilities {
  const turns = Array.from({ length: data.count }, (_, row) => change(row));
  return {
    ...data,
    re: data.re.map(
      (re, k) => turns[k][0] * (re * Math.cos(turns[k][1]) - data.im[k] * Math.sin(turns[k][1])),
    ),
    im: data.im.map(
      (im, k) => turns[k][0] * (im * Math.cos(turns[k][1]) + data.re[k] * Math.sin(turns[k][1])),
    ),
    sigma: data.sigma.map((sigma, k) => turns[k][0] * sigma),
  };
}

function onBaseline(data: Visibilities, one: string, other: string, factor: number, degrees: number) {
  return changed(data, (row) => {
    const names = [data.stations[data.station1[row]].name, data.stations[data.station2[row]].name];
    const isIt = names.includes(one) && names.includes(other);
    return isIt ? [factor, (degrees * Math.PI) / 180] : [1, 0];
  });
}

/** The same data with the stations in reverse order and every baseline counted the other way. */
function reversed(data: Visibilities): Visibilities {
  const last = data.stations.length - 1;
  return {
    ...data,
    stations: [...data.stations].reverse(),
    station1: data.station2.map((station) => last - station),
    station2: data.station1.map((station) => last - station),
    u: data.u.map((value) => -value),
    v: data.v.map((value) => -value),
    im: data.im.map((value) => -value),
  };
}

function without(data: Visibilities, drop: (row: number) => boolean): Visibilities {
  const rows = Array.from({ length: data.count }, (_, row) => row).filter((row) => !drop(row));
  const entries = Object.entries(data).map(([name, value]) => {
    if (value instanceof Float64Array) return [name, Float64Array.from(rows, (row) => value[row])];
    return [name, value instanceof Int32Array ? Int32Array.from(rows, (row) => value[row]) : value];
  });
  return { ...(Object.fromEntries(entries) as Visibilities), count: rows.length };
}

let rr: Visibilities;
let ll: Visibilities;

beforeAll(async () => {
  [rr, ll] = await hands(1);
});

describe('Two hands of one observation', () => {
  test.each([1, 2, 3, 4, 5, 6])('agree within limits (seed %d)', async (seed) => {
    const { finding, warnings, stop, document } = await check(...(await hands(seed)));
    expect(finding.finding).toBe('within limits');
    expect([finding.marginal, finding.limit]).toEqual([1.5, 2.5]);
    expect(finding.detail).toMatch(
      /^Scatter of differences to the input other, over the errors of both: [\d.]+ of \d+ independent closure phases, worst for \S+–\S+, [\d.]+ in \d+ scans \(by chance up to [\d.]+ of \d+ baselines\); [\d.]+ of \d+ independent log closure amplitudes, worst for .*\)\.$/,
    );
    expect([stop, warnings]).toEqual([undefined, []]);
    // Median sizes of n independent values: standard deviation 1.166/sqrt(n) and less than twice that where neighbours
    // share a baseline; four of them.
    for (const part of [
      document.otherAgreement?.closurePhases,
      document.otherAgreement?.logClosureAmplitudes,
    ]) {
      const { scatter, independent } = part as Part;
      expect(Math.abs(scatter - 1)).toBeLessThan((4 * 1.166 * 1.5) / Math.sqrt(independent));
    }
    expect(document.otherAgreement?.rowsCompared).toBe(document.otherAgreement?.rowsInCommon);
    expect(document.otherAgreement?.medianUvDifference).toBe(0);
  });

  test('are compared whatever the gains and phases of stations in each', async () => {
    const stream = randomStream(3, 'turns');
    const turns = Array.from({ length: 200 }, () => [stream.between(0.5, 2), stream.between(-3, 3)] as const);
    const at = (row: number, station: number) => turns[ll.scan[row] * 5 + station];
    const turned = changed(ll, (row) => {
      const [one, other] = [at(row, ll.station1[row]), at(row, ll.station2[row])];
      return [one[0] * other[0], one[1] - other[1]];
    });
    const [plain, after] = [await check(rr, ll), await check(rr, turned)];
    expect(after.finding.value).toBeCloseTo(plain.finding.value, 8);
  });

  test('are matched by the names of stations and the times of scans, not by their numbers', async () => {
    const plain = await check(rr, ll);
    const turned = await check(rr, reversed(ll));
    expect(turned.finding.value).toBeCloseTo(plain.finding.value, 8);
    // Without its first scan the other counts from 0 again.
    const later = without(ll, (row) => ll.scan[row] === 0);
    const renumbered = { ...later, scan: later.scan.map((scan) => scan - 1) };
    const same = await check(
      without(rr, (row) => rr.scan[row] === 0),
      later,
    );
    const shifted = await check(rr, renumbered);
    expect(shifted.document.otherAgreement).toEqual(same.document.otherAgreement);
  });

  test('that scatter by twice the stated noise have a scatter of 2', async () => {
    const halved = (data: Visibilities) => ({
      ...data,
      sigma: data.sigma.map((value) => value / 2),
      sigmaPhase: data.sigmaPhase.map((value) => value / 2),
    });
    const { document } = await check(halved(rr), halved(ll), { minimumSnr: 10, outOfLimits: 'mark' });
    const plain = (await check(rr, ll)).document.otherAgreement?.closurePhases as Part;
    const phases = document.otherAgreement?.closurePhases as Part;
    expect(phases.independent).toBe(plain.independent);
    expect(phases.scatter / plain.scatter).toBeCloseTo(2, 9);
  });
});

describe('A fault in one of them', () => {
  test.each([
    ['TALLOW', 'EMBER'],
    ['WICK-A', 'BEACON'],
    ['WICK-B', 'BEACON'],
  ])('of 10 degrees on %s–%s that do not close is out of limits, and named', async (one, other) => {
    const { finding, stop } = await check(rr, onBaseline(ll, one, other, 1, 10));
    expect(finding.finding).toBe('out of limits');
    expect(finding.detail).toContain(`independent closure phases, worst for ${one}–${other}, `);
    expect(stop).toMatch(/^Calibration out of limits: otherAgreement is \d+\.?\d*, limit 2\.5\.$/);
  });

  test('of 10 degrees on a faint baseline, twice its errors, is marginal and named', async () => {
    const { finding } = await check(rr, onBaseline(ll, 'EMBER', 'BEACON', 1, 10));
    expect(finding.finding).toBe('marginal');
    expect(finding.detail).toContain('independent closure phases, worst for EMBER–BEACON, ');
  });

  test('of a quarter in one amplitude is found in the log closure amplitudes alone', async () => {
    const { finding, document } = await check(rr, onBaseline(ll, 'WICK-A', 'BEACON', 1.25, 0));
    expect(finding.finding).toBe('out of limits');
    expect(finding.detail).toContain('log closure amplitudes, worst for WICK-A–BEACON, ');
    const plain = await check(rr, ll);
    const phases = document.otherAgreement?.closurePhases as Part;
    expect(phases.scatter).toBeCloseTo(plain.document.otherAgreement?.closurePhases?.scatter as number, 9);
  });

  test('of a station alone is none: it closes', async () => {
    const turned = changed(ll, (row) =>
      ll.stations[ll.station2[row]].name === 'BEACON' ? [1.3, 0.5] : [1, 0],
    );
    const { finding } = await check(rr, turned);
    expect(finding.finding).toBe('within limits');
  });
});

describe('Two bands', () => {
  const band = async (frequency: string, seed: number) =>
    ingested(await observe({ seed, band: { frequency, bandwidth: '2 GHz' } }));

  test('0.9 % apart are compared, and agree', async () => {
    const { finding, document } = await check(await band('229 GHz', 1), await band('227 GHz', 2));
    expect(finding.finding).toBe('within limits');
    // |(u,v) - (u',v')| / |(u,v)| = 1 - 227/229.
    expect(document.otherAgreement?.medianUvDifference).toBeCloseTo(2 / 229, 6);
  });

  test('5 % apart are not, and the warning says why', async () => {
    const { finding, warnings, document } = await check(await band('230 GHz', 1), await band('218.5 GHz', 2));
    expect(finding).toBeUndefined();
    const rows = document.otherAgreement?.rowsInCommon;
    expect(warnings).toEqual([
      `Check otherAgreement was not made: (u,v) of the ${rows} common rows differ by 5.00 %, more than the 1.00 % within which the source itself counts as the same.`,
    ]);
    expect(document.otherAgreement?.rowsCompared).toBe(0);
  });

  test('far apart can be compared when the recipe says so', async () => {
    const { finding } = await check(await band('230 GHz', 1), await band('218.5 GHz', 2), {
      uvDifference: 0.06,
      outOfLimits: 'mark',
    });
    expect(finding).toBeDefined();
  });
});

describe('Other days', () => {
  // A sidereal day is 23 h 56 min 4 s (common practice): then the tracks are the same.
  const nextDay = { start: '2031-03-11T20:56:04Z' };

  test('at like sidereal time agree, and the days between are told', async () => {
    const { finding, document } = await check(
      await ingested(await observe({ seed: 1 })),
      await ingested(await observe({ seed: 2, ...nextDay })),
    );
    expect(finding.finding).toBe('within limits');
    expect(finding.detail).toMatch(
      /^Scatter of differences to the input other of 1 day later, at like sidereal time, over the errors of both: /,
    );
    const { rowsCompared, rowsInCommon, medianUvDifference } = document.otherAgreement as {
      rowsCompared: number;
      rowsInCommon: number;
      medianUvDifference: number;
    };
    expect(rowsCompared).toBe(rowsInCommon);
    // A tenth of a second of time, 7e-6 radians, is lost in rounding a sidereal day to seconds.
    expect(medianUvDifference).toBeLessThan(2e-5);
  });

  test('tell a baseline that is off on one of them', async () => {
    const second = await ingested(await observe({ seed: 2, ...nextDay }));
    const { finding } = await check(
      await ingested(await observe({ seed: 1 })),
      onBaseline(second, 'TALLOW', 'BEACON', 1, 15),
    );
    expect(finding.finding).toBe('out of limits');
    expect(finding.detail).toContain('worst for TALLOW–BEACON, ');
  });

  test('at other sidereal times are not compared', async () => {
    const { finding, warnings } = await check(
      await ingested(await observe({ seed: 1 })),
      await ingested(await observe({ seed: 2, start: '2031-03-11T20:51:04Z' })),
    );
    expect(finding).toBeUndefined();
    expect(warnings[0]).toContain('no baseline is in both inputs at the same time');
  });
});

describe('Several others', () => {
  test('are each compared, and told apart by their names', async () => {
    const third = onBaseline(ll, 'TALLOW', 'EMBER', 1, 15);
    const { report, outputs } = await runKind(
      calibrationCheck,
      { outOfLimits: 'mark' },
      {
        visibilities: [sourceFor(rr, 'visibilities')],
        other: [sourceFor(ll, 'other[0]'), sourceFor(third, 'other[1]')],
      },
    );
    const found = report.findings?.filter(({ check }) => check === 'otherAgreement') ?? [];
    expect(found.map(({ finding }) => finding)).toEqual(['within limits', 'out of limits']);
    expect(found[0].detail).toContain('to the input other[0], over');
    expect(found[1].detail).toContain('to the input other[1], over');
    const text = new TextDecoder().decode(outputs.report.read(0, outputs.report.size));
    expect(JSON.parse(text).otherAgreements).toHaveLength(2);
  });
});

describe('What cannot be compared', () => {
  test('is one measurement written twice', async () => {
    const { warnings, finding } = await check(rr, rr);
    expect(finding).toBeUndefined();
    expect(warnings).toEqual([
      'Check otherAgreement was not made: both inputs hold the same numbers, one measurement written twice.',
    ]);
  });

  test('is an observation at another time', async () => {
    const later = { ...ll, timeMjd: ll.timeMjd.map((mjd) => mjd + 1) };
    expect((await check(rr, later)).warnings).toEqual([
      'Check otherAgreement was not made: no baseline is in both inputs at the same time with a signal-to-noise ratio of 5.',
    ]);
  });

  test('is a part with too few values; the other part is checked', async () => {
    const three = (data: Visibilities) =>
      without(data, (row) =>
        [data.station1[row], data.station2[row]].some((station) =>
          ['WICK-B', 'EMBER'].includes(data.stations[station].name),
        ),
      );
    const { warnings, finding } = await check(three(rr), three(ll));
    expect(warnings.filter((text) => text.includes('otherAgreement'))).toEqual([
      'Check otherAgreement was not made on log closure amplitudes: 0 independent ones are in both inputs, at least 10 are needed.',
    ]);
    expect(finding.detail).toMatch(
      /^Scatter of differences to the input other, over the errors of both: [\d.]+ of \d+ independent closure phases, too few to tell baselines apart\.$/,
    );
  });

  test('is another target: an error', async () => {
    const elsewhere = { ...ll, target: { name: 'Elsewhere', raDegrees: 181, decDegrees: 18 } };
    await expect(check(rr, elsewhere)).rejects.toThrow(
      'input other: other-target: expected the target of the input visibilities, Lantern nucleus at 180, 18 deg, got Elsewhere at 181, 18 deg. Give the same observation in another band or hand.',
    );
  });
});

describe('The error budget without co-located stations', () => {
  const alone = OBSERVATION.stations.filter(({ name }) => name !== 'WICK-B');
  const far = [...alone, { ...alone[0], name: 'GLIM', longitude: '-48 deg', latitude: '66.5 deg' }];
  const written = { stations: far, interval: '5 min', nonClosing: { phase: '4 deg', amplitude: 0.06 } };

  test('comes from the differences, and is called a lower bound', async () => {
    const [one, two] = [
      await ingested(await observe({ ...written, seed: 1 })),
      await ingested(await observe({ ...written, seed: 2 })),
    ];
    const { document, warnings } = await check(one, two, { outOfLimits: 'mark' });
    expect(document.errorBudget.lowerBounds).toEqual(['amplitude', 'phase']);
    // From 100 values and more: good to 7 % each, two to three times that let stand.
    expect(Math.abs(document.errorBudget.phaseDegrees / 4 - 1)).toBeLessThan(0.2);
    expect(Math.abs(document.errorBudget.amplitudeFraction / 0.06 - 1)).toBeLessThan(0.2);
    expect(warnings.join('\n')).toMatch(
      /The phase of the error budget comes from \d+ differences to the input other, for want of co-located stations: a lower bound, since errors that both have in common cancel\./,
    );
  });

  test('holds what the source changes between bands, and says so', async () => {
    const upper = { ...written, band: { frequency: '232 GHz', bandwidth: '2 GHz' }, seed: 2 };
    const { warnings } = await check(
      await ingested(await observe({ ...written, seed: 1 })),
      await ingested(await observe(upper)),
      { outOfLimits: 'mark' },
    );
    expect(warnings.join('\n')).toContain(
      'cancel. It holds what the source changes between (u,v) that differ by 0.87 %.',
    );
  });

  test('is blind to what both have in common', async () => {
    const data = await observe({ ...written, seed: 1 });
    const { document } = await check(await ingested(data, 'RR'), await ingested(data, 'LL'));
    expect(document.errorBudget.phaseDegrees).toBeLessThan(1);
  });

  test('stays with co-located stations where there are some', async () => {
    const { document, warnings } = await check(rr, ll);
    expect(document.errorBudget.lowerBounds).toEqual([]);
    expect(warnings).toEqual([]);
  });
});
