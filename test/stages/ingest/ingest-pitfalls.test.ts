/** What real uv data do, one case each (design, section 6, kind ingest). Sources beside each expectation; unmarked ones
 *  are common practice of the trade. */

import * as fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  C,
  FREQUENCY,
  pointVisibility,
  project,
  RA,
  REFERENCE_MJD,
  rows,
  STATIONS,
  type TestRow,
  times,
  uvFile,
} from '../uv-synthetic.ts';
import { problemOf, runIngest } from './run-ingest.ts';

type Sample = [number, number, number];
const list = () => rows({ days: times(2, 4) });
const edit = (rows: TestRow[], change: (sample: Sample, row: number, hand: number) => Sample) =>
  rows.map((row, k) => ({
    ...row,
    hands: row.hands.map((band) => band.map((cell) => cell.map((sample, hand) => change(sample, k, hand)))),
  }));
const noise = (k: number) => 0.01 * Math.sin(12.9898 * k);
/** Both hands with errors of their own. */
const noisy = (rows: TestRow[]) =>
  edit(rows, ([re, im, w], k, hand) => [re + noise(2 * k + hand), im + noise(900 + 2 * k + hand), w]);

describe('weights', () => {
  it('drops samples of zero, negative, infinite and undefined weight, and counts each by its reason', () => {
    const bad = [0, -1, Infinity, Number.NaN];
    const file = uvFile(
      edit(noisy(list()), ([re, im, w], k, hand) => [re, im, hand === 1 && k < 8 ? bad[k % 4] : w]),
    );
    const { report, visibilities } = runIngest(file);
    expect(report.samples).toEqual({
      read: 96,
      kept: 88,
      dropped: {
        'flagged by a negative weight': 2,
        'weight zero': 2,
        'weight infinite': 2,
        'weight not a number': 2,
      },
    });
    expect(report.hands).toEqual({ both: 40, one: 8, identical: 0 });
    expect(visibilities.sigma.every((sigma) => sigma > 0 && sigma < 1)).toBe(true);
    // First baseline: 4 records, of which one lost a hand, 1/sqrt(7 · 1e4).
    expect(visibilities.sigma[0]).toBeCloseTo(1 / Math.sqrt(6e4), 12);
  });

  it('drops NaN and infinite values whatever their weight', () => {
    const file = uvFile(
      edit(noisy(list()), ([re, im, w], k, hand) =>
        k === 0 ? [Number.NaN, im, w] : k === 1 && hand === 0 ? [re, Infinity, w] : [re, im, w],
      ),
    );
    const { report, visibilities } = runIngest(file);
    expect(report.samples.dropped).toEqual({ 'value not finite': 3 });
    for (const column of [visibilities.re, visibilities.im, visibilities.u, visibilities.sigma]) {
      expect(column.every(Number.isFinite)).toBe(true);
    }
  });

  it('says so when nothing is left, with the reasons', () => {
    const file = uvFile(edit(list(), ([re, im]) => [re, im, 0]));
    expect(problemOf(file).message).toBe(
      'input data: nothing-left: expected at least one visibility that may be used, got 96 samples, dropped: weight zero 96. Check the data, and the parameters that leave some out.',
    );
  });

  it('gives Stokes I of two hands the sigma 1/sqrt(w1 + w2)', () => {
    const two = edit(rows({ days: times(1, 1) }), ([re, im], _, hand) => [
      re + hand,
      im,
      hand === 0 ? 4e3 : 12e3,
    ]);
    const { visibilities } = runIngest(uvFile(two));
    expect(visibilities.sigma[0]).toBeCloseTo(1 / Math.sqrt(16e3), 14);
    // Weighted mean: a quarter of the first hand, three of the second.
    expect(visibilities.re[0]).toBeCloseTo(two[0].hands[0][0][0][0] + 0.75, 6);
  });
});

describe('hands', () => {
  it('takes bit-identical hands for one measurement: same value and sigma as one hand of twice the weight', () => {
    const single = edit(rows({ days: times(2, 4), hands: 1 }), ([re, im, w], k) => [
      re + noise(k),
      im + noise(k + 99),
      2 * w,
    ]);
    const doubled = single.map((row) => ({
      ...row,
      hands: row.hands.map((band) => band.map(([[re, im, w]]) => [0, 1].map((): Sample => [re, im, w / 2]))),
    }));
    const one = runIngest(uvFile(single));
    const two = runIngest(uvFile(doubled));
    expect(two.report.hands).toEqual({ both: 48, one: 0, identical: 48 });
    for (const [k, re] of one.visibilities.re.entries()) {
      expect(two.visibilities.re[k]).toBeCloseTo(re, 13);
      expect(two.visibilities.sigma[k]).toBeCloseTo(one.visibilities.sigma[k], 14);
    }
    // Not two independent rows: the scatter over the noise is that of the single hand.
    expect(two.report.scatter.median).toBeCloseTo(one.report.scatter.median, 9);
  });

  it('reads a file of one hand, and one hand of a file with two', () => {
    const one = runIngest(uvFile(rows({ hands: 1 })));
    expect(one.report.chosen.polarisation).toBe('RR');
    const file = uvFile(edit(list(), ([re, im, w], _, hand) => [re + hand, im, w]));
    expect(runIngest(file, { polarisation: 'LL' }).visibilities.re[0]).toBeCloseTo(
      runIngest(file, { polarisation: 'RR' }).visibilities.re[0] + 1,
      6,
    );
  });

  it('never mixes cross hands in', () => {
    const four = edit(rows({ hands: 4 }), ([re, im, w], _, hand) => (hand < 2 ? [re, im, w] : [50, 50, w]));
    const { report, visibilities } = runIngest(uvFile(four));
    expect(report.samples.read).toBe(2 * four.length);
    expect(Math.max(...visibilities.re)).toBeLessThan(1);
  });

  it('says which hands there are when the chosen one is not', () => {
    const problem = problemOf(uvFile(list()), { polarisation: 'XX' });
    expect(problem.code).toBe('no-such-polarisation');
    expect(problem.found).toBe('RR, LL');
  });
});

describe('u and v', () => {
  it('are the same in seconds and scaled by PSCAL = 1/frequency', () => {
    const seconds = runIngest(uvFile(list())).visibilities;
    const scaled = runIngest(uvFile(list(), { uvScale: 1 / FREQUENCY })).visibilities;
    for (const [k, u] of seconds.u.entries()) expect(Math.abs(scaled.u[k] / u - 1)).toBeLessThan(3e-7);
  });

  it('run from station 1 to station 2 in wavelengths', () => {
    const { visibilities } = runIngest(uvFile(rows({ days: [0.25] })));
    const [first, second] = [visibilities.station1[0], visibilities.station2[0]].map(
      (k) => visibilities.stations[k],
    );
    expect([first.name, second.name]).toEqual(['ONE', 'FOUR']);
    const [u, v] = project(
      second.xyz.map((value, axis) => value - first.xyz[axis]),
      0.25,
    );
    expect(visibilities.u[0] / (u * FREQUENCY)).toBeCloseTo(1, 6);
    expect(visibilities.v[0] / (v * FREQUENCY)).toBeCloseTo(1, 6);
  });

  it.each([
    ['wavelengths without PSCAL', FREQUENCY, 'lie in the file in wavelengths (or metres) while PSCAL is 1'],
    ['metres without PSCAL', C, 'lie in the file in wavelengths (or metres) while PSCAL is 1'],
    ['seconds scaled once more', 1 / FREQUENCY, 'scaled by PSCAL = 1/frequency once more'],
    ['milliseconds', 1e3, 'not in seconds after PSCAL and PZERO'],
    ['zeros', 0, 'All u and v are 0'],
  ])('are refused in %s, with the likely cause', (_, uvFactor, cause) => {
    const problem = problemOf(uvFile(list(), { uvFactor }));
    expect(problem.code).toBe('implausible-uv');
    expect(problem.advice).toContain(cause);
  });

  it('are refused with the wrong sign, and taken when a parameter says so', () => {
    const file = uvFile(list(), { uvFactor: -1 });
    const problem = problemOf(file);
    expect(problem.code).toBe('uv-sign');
    expect(problem.message).toContain(
      'The picture would be turned by 180°: set the parameter uvSign to reversed',
    );
    const usual = runIngest(uvFile(list())).visibilities;
    const reversed = runIngest(file, { uvSign: 'reversed' });
    expect(reversed.visibilities.u).toEqual(usual.u);
    expect(reversed.visibilities.im).toEqual(usual.im);
    expect(reversed.stage.warnings).toEqual([]);
    const kept = runIngest(file, { uvSign: 'as-written' });
    expect(kept.visibilities.u[0]).toBe(-usual.u[0]);
    expect(kept.stage.warnings?.[0]).toContain('the picture is turned by 180°');
  });

  it('are refused when they belong to other times', () => {
    const problem = problemOf(uvFile(rows({ days: times(2, 4), ra: RA + 20 })));
    expect(problem.code).toBe('uv-disagrees');
    expect(problem.advice).toContain('RDATE, GSTIA0');
  });

  it('are refused, naming the cause, when the stations are left-handed', () => {
    const mirrored = STATIONS.map((station) => ({
      ...station,
      xyz: [station.xyz[0], -station.xyz[1], station.xyz[2]] as [number, number, number],
    }));
    expect(problemOf(uvFile(list(), { stations: mirrored })).code).toBe('uv-mirrored');
    const said = uvFile(list(), { stations: mirrored, antennaCards: [['XYZHAND', 'LEFT']] });
    expect(runIngest(said).report.uv.largest).toBeLessThan(1e-5);
  });

  it('agree to 1e-5 where they should', () => {
    const { report, stage } = runIngest(uvFile(list()));
    expect(report.uv.largest).toBeLessThan(1e-5);
    expect(stage.findings?.[0].finding).toBe('within limits');
  });

  it('agree with the computed sidereal time when the table has none, or a wrong one', () => {
    // The generator's GSTIA0 is 201.3°; the day whose mean sidereal time at 0 h is near is found here by its rate of
    // 0.98565° a day (360.98565 − 360) from 280.4606° at JD 2451544.5 less half a turn: Meeus eq. 12.4.
    const gmst = (mjd: number) => (280.46061837 + 360.98564736629 * (mjd - 51544.5)) % 360;
    const shift = (gmst(REFERENCE_MJD) - 201.3) % 360;
    const moved = rows({ days: times(2, 4), ra: RA - shift });
    const without = runIngest(uvFile(moved, { antennas: 'without-time' }));
    expect(without.report.uv.finding).toContain('sidereal time computed');
    expect(without.report.uv.largest).toBeLessThan(2e-4);
    expect(without.stage.warnings).toEqual([]);
    expect(runIngest(uvFile(moved)).stage.warnings?.[0]).toContain('not with GSTIA0 and RDATE');
  });

  it('report J2000 coordinates that are used as if of date, and do not correct them', () => {
    const file = uvFile(list(), { cards: [['EQUINOX', 2000]] });
    const { stage, visibilities } = runIngest(file);
    expect(stage.warnings?.[0]).toContain('stated as J2000 but used as if of date');
    expect(visibilities.u).toEqual(runIngest(uvFile(list())).visibilities.u);
  });

  it('agree with J2000 coordinates that were brought to date', () => {
    // Rigorous precession of right ascension and declination from J2000 to 2039-11-08: astropy 5.2.1,
    // SkyCoord(187.5, 12.25, frame=FK5(equinox=J2000)).transform_to(FK5(equinox=Time(66100.25, format='mjd'))).
    const file = uvFile(rows({ days: times(2, 4), ra: PRECESSED.ra, dec: PRECESSED.dec }), {
      cards: [['EQUINOX', 2000]],
    });
    const { report, stage } = runIngest(file);
    expect(report.uv.finding).toContain('coordinates brought from J2000 to date');
    expect(report.uv.largest).toBeLessThan(1e-5);
    expect(stage.warnings).toEqual([]);
  });

  it('cannot be checked without positions, which is an error unless the sign is given', () => {
    const nowhere = STATIONS.map((station) => ({ ...station, xyz: [0, 0, 0] as [number, number, number] }));
    const file = uvFile(list(), { stations: nowhere });
    expect(problemOf(file).code).toBe('uv-unchecked');
    expect(runIngest(file, { uvSign: 'as-written' }).report.uv.checked).toBe(false);
  });
});

const PRECESSED = { ra: 188.00418385582483, dec: 12.03018636540233 };

describe('stations', () => {
  it('of the data that the table lacks are an error with row and number, and can be left out', () => {
    const file = uvFile(list(), { stations: STATIONS.filter((station) => station.number !== 7) });
    expect(problemOf(file).message).toBe(
      `data, row 2: unknown-station: expected baselines of the antenna table's stations (ONE, FOUR, EIGHT), got baseline 1–7, where station number 7 is not in the table. Correct the antenna table, or drop the station with leaveOut: ["7"].`,
    );
    const { report } = runIngest(file, { leaveOut: ['7'] });
    expect(report.samples.dropped).toEqual({ 'station left out': 48 });
  });

  it('of the table need not be in the data', () => {
    const stations = [
      ...STATIONS,
      { name: 'TEN', number: 10, xyz: [0, 0, -6359600] as [number, number, number] },
    ];
    const { report, visibilities } = runIngest(uvFile(list(), { stations }));
    expect(report.stations.absent).toEqual(['TEN']);
    expect(visibilities.stations.map((station) => station.name)).toEqual(['ONE', 'FOUR', 'SEVEN', 'EIGHT']);
  });

  it('side by side stay two stations, also at the very same place', () => {
    const same = STATIONS.map((station) =>
      station.name === 'EIGHT'
        ? { ...station, xyz: [...STATIONS[2].xyz] as [number, number, number] }
        : station,
    );
    const { visibilities } = runIngest(uvFile(rows({ stations: same }), { stations: same }));
    expect(visibilities.count).toBe(6);
    expect(visibilities.stations.length).toBe(4);
  });

  it('are left out by name, and a wrong name is an error that lists them', () => {
    const { visibilities } = runIngest(uvFile(list()), { leaveOut: ['EIGHT'] });
    expect(visibilities.stations.map((station) => station.name)).toEqual(['ONE', 'FOUR', 'SEVEN']);
    expect(problemOf(uvFile(list()), { leaveOut: ['EIGTH'] }).expected).toBe(
      'stations of the file: ONE, FOUR, SEVEN, EIGHT',
    );
  });

  it('in falling order are turned round: conjugate, u and v negated', () => {
    const turned = list().map((row) => ({
      ...row,
      number1: row.number2,
      number2: row.number1,
      u: -row.u,
      v: -row.v,
      w: -row.w,
      hands: row.hands.map((b) => b.map((c) => c.map(([re, im, w]): Sample => [re, -im, w]))),
    }));
    const usual = runIngest(uvFile(list())).visibilities;
    expect(runIngest(uvFile(turned)).visibilities).toEqual(usual);
  });

  it('with themselves are no baseline', () => {
    const auto = [...list(), { ...list()[0], number2: 1, u: 0, v: 0 }];
    expect(runIngest(uvFile(auto)).report.samples.dropped).toEqual({ autocorrelation: 2 });
  });

  it('of several subarrays fall back on the one table there is, with a warning', () => {
    const split = list().map((row, k) => ({ ...row, subarray: 1 + (k % 2) }));
    const { visibilities, stage } = runIngest(uvFile(split));
    expect(visibilities).toEqual(runIngest(uvFile(list())).visibilities);
    expect(stage.warnings?.[0]).toContain('subarray 2, for which there is no antenna table');
  });
});

describe('scans', () => {
  it.each([30, 60, 120])('are the same with a gap of %d s', (gap) => {
    expect(runIngest(uvFile(list()), { gap }).report.scans.length).toBe(2);
  });

  it('end at a gap of just the length that is stated, rounded as times are', () => {
    const file = uvFile(rows({ days: times(5, 6, 10, 60) }));
    expect(runIngest(file, { gap: 60 }).report.scans).toHaveLength(5);
    expect(runIngest(file, { gap: 61 }).report.scans).toHaveLength(1);
  });

  it('are counted from the end of a record to the start of the next', () => {
    const spaced = rows({ days: times(1, 5, 90, 0), seconds: 90 });
    expect(runIngest(uvFile(spaced)).report.scans.length).toBe(1);
    expect(runIngest(uvFile(spaced, { noIntegration: true })).report.scans.length).toBe(5);
  });

  it('may have a single baseline', () => {
    const one = list().filter((row) => row.number1 === 1 && row.number2 === 4);
    const { report, visibilities } = runIngest(uvFile(one));
    expect(visibilities.count).toBe(2);
    expect(report.scans[0]).toMatchObject({ baselines: 1, stations: 2, records: 4 });
  });

  it('are chosen by time, in hours and as MJD', () => {
    const hours = runIngest(uvFile(list()), { toHours: 6.05 });
    const mjd = runIngest(uvFile(list()), { toMjd: REFERENCE_MJD + 6.05 / 24 });
    expect(hours.visibilities).toEqual(mjd.visibilities);
    expect(hours.report.samples.dropped).toEqual({ 'time not chosen': 48 });
    expect(problemOf(uvFile(list()), { toHours: 1, toMjd: 2 }).code).toBe('bad-time-range');
    expect(problemOf(uvFile(list()), { fromHours: 2, toHours: 1 }).code).toBe('bad-time-range');
  });

  it('drop a baseline that is in fewer than half of the records, and count it', () => {
    const days = times(1, 4);
    const sparse = rows({ days }).filter((row) => row.number2 !== 8 || row.day === days[0]);
    const { report, visibilities } = runIngest(uvFile(sparse));
    expect(visibilities.count).toBe(3);
    expect(report.averaged.baselinesDroppedAsIncomplete).toBe(3);
    expect(report.samples.dropped).toEqual({ 'too few records in the scan': 6 });
    expect(runIngest(uvFile(sparse), { completeness: 0.25 }).visibilities.count).toBe(6);
  });
});

describe('bands and channels', () => {
  const frequencies = [
    [FREQUENCY, FREQUENCY + 5e8],
    [FREQUENCY + 2e9, FREQUENCY + 2.5e9],
  ];
  const wide = () => rows({ days: [0.25], frequencies });
  const file = () => uvFile(wide(), { bands: [0, 2e9], bandwidth: 5e8, channelStep: 5e8 });

  it('are averaged at their middle frequency', () => {
    const { report, visibilities } = runIngest(file());
    expect(report.chosen).toMatchObject({ bands: [1, 2], channels: [1, 2], frequencyHz: FREQUENCY + 1.25e9 });
    expect(report.chosen.bandwidthHz).toBeCloseTo(2e9, 0);
    expect(visibilities.sigma[0]).toBeCloseTo(1 / Math.sqrt(8e4), 12);
    expect(visibilities.wavelengthMetres).toBeCloseTo(C / (FREQUENCY + 1.25e9), 15);
  });

  it('are chosen by number, with their own wavelength and value', () => {
    const { visibilities } = runIngest(file(), { bands: [2], channels: [1] });
    const frequency = FREQUENCY + 2e9;
    expect(visibilities.wavelengthMetres).toBe(C / frequency);
    expect(visibilities.u[0] / (-wide()[0].u * frequency)).toBeCloseTo(1, 6);
    expect(visibilities.re[0]).toBeCloseTo(pointVisibility(wide()[0].u, wide()[0].v, frequency)[0], 4);
  });

  it('that the file lacks are an error', () => {
    expect(problemOf(file(), { bands: [3] }).message).toBe(
      'parameter bands: no-such-channel: expected numbers from 1 to 2, the bands of the file, got 3. Correct the parameter bands.',
    );
  });

  it('too far apart are not averaged', () => {
    const apart = rows({ frequencies: [[FREQUENCY], [FREQUENCY * 1.2]] });
    expect(problemOf(uvFile(apart, { bands: [0, FREQUENCY * 0.2] })).code).toBe('wide-band');
  });
});

describe('conventions of the STOKES axis (check value fits.stokes)', () => {
  /** The hands of a row in the order of the axis, each with a value of its own: 10, 20, … */
  const marked = (hands: number) =>
    edit(rows({ days: [0.25], hands }), (_, _k, hand) => [10 * (hand + 1), 0, 4]);
  const valueWith = (hands: number, crval: number, cdelt: number, parameters = {}) => {
    const { visibilities, report } = runIngest(
      uvFile(marked(hands), { stokes: { crval, cdelt } }),
      parameters,
    );
    return [visibilities.re[0], report.chosen.polarisation];
  };

  it.each([
    // I Q U V; RR LL RL LR; XX YY XY YX: (first + second) / 2 of equal weights, but for Stokes I itself.
    [4, 1, 1, 10, 'I'],
    [1, 1, 1, 10, 'I'],
    [4, -1, -1, 15, 'RR and LL'],
    [2, -1, -1, 15, 'RR and LL'],
    [4, -5, -1, 15, 'XX and YY'],
    [2, -5, -1, 15, 'XX and YY'],
    // The axis counts the other way: LR RL LL RR, YY XX, V U Q I.
    [4, -4, 1, 35, 'RR and LL'],
    [2, -6, 1, 15, 'XX and YY'],
    [4, 4, -1, 40, 'I'],
    // One hand alone stands for both.
    [1, -1, -1, 10, 'RR'],
    [1, -2, -1, 10, 'LL'],
    [1, -6, -1, 10, 'YY'],
  ])('%d values from %d in steps of %d are %d, %s', (hands, crval, cdelt, value, name) => {
    expect(valueWith(hands, crval, cdelt)).toEqual([value, name]);
  });

  it('give one hand when it is asked for, and are refused where Stokes I cannot be had', () => {
    expect(valueWith(4, -1, -1, { polarisation: 'LL' })).toEqual([20, 'LL']);
    expect(valueWith(4, -5, -1, { polarisation: 'YY' })).toEqual([20, 'YY']);
    const cross = uvFile(marked(2), { stokes: { crval: -3, cdelt: -1 } });
    expect(problemOf(cross).message).toContain(
      'expected Stokes I or a parallel hand (RR, LL, XX, YY), got RL, LR',
    );
  });
});

describe('axes in any order', () => {
  // Identity: the order of the axes is none of the data's.
  it('give the same visibilities, with several bands, channels and hands', () => {
    const frequencies = [
      [FREQUENCY, FREQUENCY + 5e8, FREQUENCY + 1e9],
      [FREQUENCY + 2e9, FREQUENCY + 2.5e9, FREQUENCY + 3e9],
    ];
    const list_ = noisy(rows({ days: times(1, 2), frequencies, hands: 4 }));
    const options = { bands: [0, 2e9], bandwidth: 5e8, channelStep: 5e8 };
    const usual = runIngest(uvFile(list_, options)).bytes;
    const names = ['COMPLEX', 'STOKES', 'FREQ', 'IF', 'RA', 'DEC'];
    fc.assert(
      fc.property(fc.shuffledSubarray(names, { minLength: 6 }), (axes) => {
        expect(
          Buffer.from(runIngest(uvFile(list_, { ...options, axes })).bytes).equals(Buffer.from(usual)),
        ).toBe(true);
      }),
      { numRuns: 12 },
    );
  });

  it('fall in frequency in a lower sideband', () => {
    const step = 5e8;
    const frequencies = [
      [FREQUENCY, FREQUENCY - step],
      [FREQUENCY + 2e9, FREQUENCY + 2e9 - step],
    ];
    const file = uvFile(rows({ days: [0.25], frequencies }), {
      bands: [0, 2e9],
      bandwidth: step,
      channelStep: step,
      sideband: -1,
    });
    for (const [band, channel] of [
      [1, 2],
      [2, 1],
    ]) {
      const { visibilities } = runIngest(file, { bands: [band], channels: [channel] });
      expect(visibilities.wavelengthMetres).toBeCloseTo(C / frequencies[band - 1][channel - 1], 15);
    }
  });
});

describe('other things', () => {
  it('a row that the file holds twice is one measurement', () => {
    const twice = [...list(), ...list().slice(0, 6)];
    const { report, visibilities } = runIngest(uvFile(twice));
    expect(report.samples.dropped).toEqual({ 'row doubled': 12 });
    expect(visibilities).toEqual(runIngest(uvFile(list())).visibilities);
  });

  it('several targets or frequency setups in one file are refused', () => {
    const values = list().map((_, k) => (k < 40 ? 1 : 2));
    for (const name of ['SOURCE', 'FREQSEL']) {
      expect(problemOf(uvFile(list(), { extra: [{ name, values }] })).place).toBe('data, row 41');
    }
  });

  it('a flipped byte fails the checksum, which can be ignored', () => {
    const file = uvFile(noisy(list()));
    const at = file.length - 2880 * 4 + 7;
    file[at] ^= 1;
    expect(problemOf(file).code).toBe('checksum');
  });
});
