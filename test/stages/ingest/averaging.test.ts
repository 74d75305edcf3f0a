import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { type AveragingResult, average } from '../../../stages/ingest/averaging.ts';
import {
  addRecord,
  kept,
  makeRecords,
  makeTally,
  type RecordFields,
} from '../../../stages/ingest/records.ts';
import { findScans } from '../../../stages/ingest/scans.ts';

const usual: RecordFields = {
  station1: 0,
  station2: 1,
  timeMjd: 66100.25,
  integrationSeconds: 10,
  u: 1e9,
  v: 2e9,
  re: 1,
  im: 0,
  weight: 100,
  samples: 1,
};

function run(
  list: Partial<RecordFields>[],
  {
    gap = 60,
    averaging = 'scan' as 'scan' | 'none' | number,
    completeness = 0,
    leastSnr = undefined as number | undefined,
  } = {},
) {
  const records = makeRecords(list.length);
  for (const fields of list) addRecord(records, { ...usual, ...fields });
  const tally = makeTally();
  tally.read = list.reduce((sum, fields) => sum + (fields.samples ?? 1), 0);
  const timetable = findScans(records, gap, averaging);
  return { ...average(records, timetable, { completeness, leastSnr }, tally), tally, timetable };
}

const seconds = (s: number) => 66100.25 + s / 86400;

describe('the weighted mean', () => {
  it('is the direct sum', () => {
    const list = [
      { re: 1, im: 2, weight: 1, u: 10, v: -1, timeMjd: seconds(0) },
      { re: 3, im: -1, weight: 3, u: 12, v: -2, timeMjd: seconds(10) },
    ];
    const { averages } = run(list);
    expect(averages.count).toBe(1);
    // By hand: (1 + 9)/4, (2 − 3)/4, (10 + 36)/4, (−1 − 6)/4, 7.5 s, 1/sqrt(4).
    expect([averages.re[0], averages.im[0], averages.u[0], averages.v[0], averages.sigma[0]]).toEqual([
      2.5, -0.25, 11.5, -1.75, 0.5,
    ]);
    expect((averages.timeMjd[0] - seconds(0)) * 86400).toBeCloseTo(7.5, 5);
    expect(averages.integrationSeconds[0]).toBe(20);
    // By hand: (1·(1.5² + 2.25²) + 3·(0.5² + 0.75²)) / (2·1) = 4.875.
    expect(averages.scatter[0]).toBeCloseTo(4.875, 14);
  });

  it('has a scatter of 1 when the stated noise is right, 4 when it is half of it', () => {
    // Expectation of a reduced chi-square is 1, its standard deviation sqrt(2/dof) (common practice): 3998 degrees.
    for (const [noise, expected] of [
      [0.1, 1],
      [0.2, 4],
    ]) {
      const list = Array.from({ length: 2000 }, (_, k) => {
        // Box-Muller with a fixed sequence (Weyl).
        const a = Math.sqrt(-2 * Math.log(((k + 1) * 0.754877666) % 1));
        const b = 2 * Math.PI * (((k + 1) * 0.569840291) % 1);
        return { re: 1 + noise * a * Math.cos(b), im: noise * a * Math.sin(b), timeMjd: seconds(10 * k) };
      });
      const { averages } = run(list);
      expect(Math.abs(averages.scatter[0] / expected - 1)).toBeLessThan(5 * Math.sqrt(2 / 3998));
    }
  });

  it('loses the amplitude that turning phases lose', () => {
    // Check value coherence.loss: exp(−sigma²/2) for Gaussian phases of 0.3 rad, 0.955997481833 of the amplitude.
    const n = 2000;
    const list = Array.from({ length: n }, (_, k) => {
      const a = Math.sqrt(-2 * Math.log(((k + 1) * 0.754877666) % 1));
      const phase = 0.3 * a * Math.cos(2 * Math.PI * (((k + 1) * 0.569840291) % 1));
      return { re: Math.cos(phase), im: Math.sin(phase), weight: 1e8, timeMjd: seconds(10 * k) };
    });
    const { averages } = run(list);
    expect(1 - averages.loss[0]).toBeCloseTo(0.955997481833, 2);
  });

  it('loses nothing when nothing turns, whatever the noise', () => {
    const list = Array.from({ length: 4000 }, (_, k) => {
      const a = Math.sqrt(-2 * Math.log(((k + 1) * 0.754877666) % 1));
      const b = 2 * Math.PI * (((k + 1) * 0.569840291) % 1);
      return {
        re: 1 + 0.5 * a * Math.cos(b),
        im: 0.5 * a * Math.sin(b),
        weight: 4,
        timeMjd: seconds(10 * k),
      };
    });
    // Error of the debiased mean square: about sigma/sqrt(n) = 0.008 of the amplitude.
    expect(Math.abs(run(list).averages.loss[0])).toBeLessThan(0.04);
  });
});

describe('intervals', () => {
  const list = Array.from({ length: 12 }, (_, k) => ({ timeMjd: seconds(10 * k + (k >= 6 ? 300 : 0)) }));

  it('are scans, single records, or pieces of scans', () => {
    const counts = (result: AveragingResult) => [...result.averages.records.slice(0, result.averages.count)];
    expect(counts(run(list))).toEqual([6, 6]);
    expect(counts(run(list, { averaging: 'none' }))).toEqual(Array(12).fill(1));
    expect(counts(run(list, { averaging: 30 }))).toEqual([3, 3, 3, 3]);
    expect(run(list, { averaging: 30 }).timetable.scanOfInterval).toEqual(Int32Array.from([0, 0, 1, 1]));
  });

  it('hold rows of one record together though their times differ by the rounding of a float32', () => {
    const { timetable } = run([
      { timeMjd: seconds(0) },
      { timeMjd: seconds(0.004), station2: 2 },
      { timeMjd: seconds(10) },
    ]);
    expect(timetable.recordMjd.length).toBe(2);
  });
});

describe('drops', () => {
  it('are counted for baselines in too few records and for faint ones', () => {
    const list = [
      ...Array.from({ length: 4 }, (_, k) => ({ timeMjd: seconds(10 * k) })),
      { station2: 2, samples: 3, timeMjd: seconds(0) },
      ...Array.from({ length: 4 }, (_, k) => ({
        station1: 1,
        station2: 2,
        re: 0.01,
        timeMjd: seconds(10 * k),
      })),
    ];
    const { averages, tally, incomplete, faint } = run(list, { completeness: 0.5, leastSnr: 5 });
    expect([averages.count, incomplete, faint]).toEqual([1, 1, 1]);
    expect(Object.fromEntries(tally.dropped)).toEqual({
      'too few records in the scan': 3,
      'below the least signal-to-noise ratio': 4,
    });
    expect(kept(tally)).toBe(4);
  });

  it('count what rows share baseline and time without being the same', () => {
    expect(run([{}, { re: 2 }, { re: 2 }]).crowded).toBe(1);
  });
});

describe('properties', () => {
  const record = fc.record({
    station1: fc.integer({ min: 0, max: 3 }),
    step: fc.integer({ min: 1, max: 3 }),
    slot: fc.integer({ min: 0, max: 40 }),
    re: fc.double({ min: -5, max: 5, noNaN: true }),
    im: fc.double({ min: -5, max: 5, noNaN: true }),
    weight: fc.double({ min: 0.1, max: 1e4, noNaN: true }),
    samples: fc.integer({ min: 1, max: 4 }),
  });
  const toFields = ({
    station1,
    step,
    slot,
    ...rest
  }: {
    station1: number;
    step: number;
    slot: number;
    re: number;
    im: number;
    weight: number;
    samples: number;
  }) => ({
    ...rest,
    station1,
    station2: station1 + step,
    timeMjd: seconds(10 * slot + (slot > 20 ? 400 : 0)),
  });

  it('give the same bits for rows in any order', () => {
    // Few times and baselines, so that many rows share both and only their content can order them.
    const crowded = fc
      .array(record, { minLength: 6, maxLength: 40 })
      .map((list) =>
        list.map((fields) => ({ ...fields, station1: fields.station1 % 2, step: 1, slot: fields.slot % 3 })),
      );
    const shuffled = crowded.chain((list) =>
      fc.tuple(fc.constant(list), fc.shuffledSubarray(list, { minLength: list.length })),
    );
    fc.assert(
      fc.property(shuffled, ([list, mixed]) => {
        const options = { completeness: 0.3, leastSnr: 1, averaging: 50 as const };
        const { averages: a, tally: ta } = run(list.map(toFields), options);
        const { averages: b, tally: tb } = run(mixed.map(toFields), options);
        expect(a).toEqual(b);
        expect(new Map([...ta.dropped].sort())).toEqual(new Map([...tb.dropped].sort()));
      }),
    );
  });

  it('keep or drop every sample exactly once', () => {
    fc.assert(
      fc.property(fc.array(record, { minLength: 1, maxLength: 60 }), (list) => {
        const { averages, tally } = run(list.map(toFields), { completeness: 0.5, leastSnr: 3 });
        let samples = 0;
        for (let k = 0; k < averages.count; k++) samples += averages.samples[k];
        expect(samples).toBe(kept(tally));
      }),
    );
  });
});
