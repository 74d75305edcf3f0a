/** The kind `simulate`: what is in the file against slow sums and formulas written anew here. */

import { describe, expect, test } from 'vitest';
import { readNumbers } from '../../stages/formats/json.ts';
import { readSkyImage } from '../../stages/formats/sky-image.ts';
import { readUvGroups, type UvData } from '../../stages/formats/uv-groups.ts';
import { InputProblem } from '../../stages/problem.ts';
import { simulate } from '../../stages/simulate/simulate.ts';
import { type Ran, runKind, SMALL } from './simulate-task.ts';

interface Row {
  /** Seconds, (r_i − r_j)/c. */
  readonly u: number;
  readonly v: number;
  readonly mjd: number;
  readonly i: number;
  readonly j: number;
  /** Re and im of RR and LL, and their weights. */
  readonly hands: readonly { readonly re: number; readonly im: number; readonly weight: number }[];
}

function rowsOf({ outputs }: Ran): { uv: UvData; rows: Row[] } {
  const uv = readUvGroups(outputs.data);
  const block = uv.block(0, uv.count);
  const rows = Array.from({ length: uv.count }, (_, k): Row => {
    const hands = [0, 1].map((stokes) => {
      const at = k * block.rowStride + block.sampleOffset(stokes, 0, 0);
      const [re, im, weight] = [0, 1, 2].map((part) => block.data[at + part * block.partStride] as number);
      return { re: re as number, im: im as number, weight: weight as number };
    });
    return {
      u: block.u[k] as number,
      v: block.v[k] as number,
      mjd: block.timeMjd[k] as number,
      i: (block.number1[k] as number) - 1,
      j: (block.number2[k] as number) - 1,
      hands,
    };
  });
  return { uv, rows };
}

const QUIET = { ...SMALL, noiseFactor: 0, phaseErrors: 'none' } as const;
const withStation = (k: number, change: object) =>
  SMALL.stations.map((station, index) => (index === k ? { ...station, ...change } : station));
const amplitude = (row: Row) => Math.hypot(row.hands[0]?.re ?? 0, row.hands[0]?.im ?? 0);
const phase = (row: Row) => Math.atan2(row.hands[0]?.im ?? 0, row.hands[0]?.re ?? 0);

describe('An observation without errors', () => {
  test('is the sum over an off-centre, asymmetric truth with the sign of random groups, exp(+2πi(ux + vy))', async () => {
    const truth = { ...SMALL.truth, east: '14 uas', north: '-9 uas', floor: 0.2, pixels: 96 };
    const ran = await runKind(simulate, { ...QUIET, duration: '43 min', truth });
    const { uv, rows } = rowsOf(ran);
    const image = readSkyImage(ran.outputs.image);
    const pixel = image.pixelRadians;
    for (const row of rows.filter((_, k) => k % 19 === 0)) {
      let [re, im] = [0, 0];
      for (let b = 0; b < image.ny; b++) {
        for (let a = 0; a < image.nx; a++) {
          const x = ((image.nx - 1) / 2 - a) * pixel;
          const y = (b - (image.ny - 1) / 2) * pixel;
          const angle = 2 * Math.PI * uv.referenceFrequencyHz * (row.u * x + row.v * y);
          re += (image.pixels[b * image.nx + a] as number) * Math.cos(angle);
          im += (image.pixels[b * image.nx + a] as number) * Math.sin(angle);
        }
      }
      // The image cuts off what lies beyond 80 uas: 1e-5 of the flux, as does single precision.
      for (const hand of row.hands) {
        expect(Math.abs(hand.re - re)).toBeLessThan(3e-5);
        expect(Math.abs(hand.im - im)).toBeLessThan(3e-5);
      }
    }
  });

  test('shows the brightest part to the south-east for a position angle of 150 degrees', async () => {
    const { outputs } = await runKind(simulate, QUIET);
    const image = readSkyImage(outputs.image);
    let [flux, east, north] = [0, 0, 0];
    image.pixels.forEach((value, k) => {
      flux += value;
      // CONVENTIONS: the x index rises to the west, the y index to the north.
      east += value * ((image.nx - 1) / 2 - (k % image.nx));
      north += value * (Math.floor(k / image.nx) - (image.ny - 1) / 2);
    });
    // The centroid of 1 + 2b cos(φ − φ0) on a circle lies at b·radius towards φ0.
    const scale = (image.pixelRadians * 180 * 3600e6) / Math.PI / flux;
    expect(east * scale).toBeCloseTo(0.25 * 23 * Math.sin((150 * Math.PI) / 180), 3);
    expect(north * scale).toBeCloseTo(0.25 * 23 * Math.cos((150 * Math.PI) / 180), 3);
    expect(flux).toBeCloseTo(0.8, 9);
  });

  test('has the (u,v) that the antenna table, the sidereal time and the hour angle give', async () => {
    const { uv, rows } = rowsOf(await runKind(simulate, QUIET));
    const table = uv.antennas[0];
    if (!table) throw new Error('no antenna table');
    // Meeus, Astronomical Algorithms, eq. 12.4, at 0 h of 10 March 2031, written anew.
    const days = 62935 - 51544.5;
    const T = days / 36525;
    const gst0 = 280.46061837 + 360.98564736629 * days + 0.000387933 * T * T - (T * T * T) / 38710000;
    for (const row of rows.filter((_, k) => k % 11 === 0)) {
      const H = ((gst0 + 360.98564736629 * (row.mjd - 62935) - 180) * Math.PI) / 180;
      const [p, q] = [table.antennas[row.i]?.xyz, table.antennas[row.j]?.xyz];
      if (!p || !q) throw new Error('no station');
      const [x, y, z] = [0, 1, 2].map((axis) => ((p[axis] as number) - (q[axis] as number)) / 299792458) as [
        number,
        number,
        number,
      ];
      const sinD = Math.sin((18 * Math.PI) / 180);
      const cosD = Math.cos((18 * Math.PI) / 180);
      // Thompson, Moran & Swenson, 3rd ed., eq. 4.1. The time in the file is good to a millisecond: 7e-8 rad.
      expect(Math.abs(row.u - (Math.sin(H) * x + Math.cos(H) * y))).toBeLessThan(1e-8);
      expect(Math.abs(row.v - (-sinD * Math.cos(H) * x + sinD * Math.sin(H) * y + cosD * z))).toBeLessThan(
        1e-8,
      );
    }
  });

  test('takes its records at their middles, scan after scan', async () => {
    const { rows } = rowsOf(await runKind(simulate, QUIET));
    const seconds = [...new Set(rows.map(({ mjd }) => Math.round((mjd - 62935 - 21 / 24) * 86400)))];
    // Six records of 30 s in a scan of 3 min, every 20 min, six scans in 2 h.
    const expected = [0, 1, 2, 3, 4, 5].flatMap((scan) =>
      [15, 45, 75, 105, 135, 165].map((s) => s + 1200 * scan),
    );
    expect(seconds).toEqual(expected);
  });

  test('is the same from its own image as input, and the image comes out as it went in', async () => {
    const first = await runKind(simulate, QUIET);
    const { truth: _, ...rest } = QUIET;
    const second = await runKind(simulate, rest, { image: [first.outputs.image] });
    const [one, other] = [rowsOf(first).rows, rowsOf(second).rows];
    one.forEach((row, k) => {
      expect(Math.abs((row.hands[0]?.re ?? 0) - (other[k]?.hands[0]?.re ?? 9))).toBeLessThan(3e-5);
      expect(Math.abs((row.hands[0]?.im ?? 0) - (other[k]?.hands[0]?.im ?? 9))).toBeLessThan(3e-5);
    });
    const pixels = readSkyImage(second.outputs.image).pixels;
    expect(pixels).toEqual(readSkyImage(first.outputs.image).pixels);
  });

  test('shows extended flux to the shortest baselines only', async () => {
    const extended = { flux: '0.5 Jy', fwhm: '2000 uas' };
    const compact = rowsOf(await runKind(simulate, QUIET)).rows;
    const { rows } = rowsOf(await runKind(simulate, { ...QUIET, extended }));
    rows.forEach((row, k) => {
      const more = amplitude(row) - amplitude(compact[k] as Row);
      // WICK-A and WICK-B stand 1.5 km apart, 1.1 Mλ: a Gaussian of 2 mas keeps 0.9999 there.
      expect(more).toBeCloseTo(row.i === 0 && row.j === 1 ? 0.5 : 0, 3);
    });
  });
});

describe('Errors of an observation', () => {
  test('are thermal noise by the radiometer equation, and weights that state it', async () => {
    const stations = withStation(1, { sefd: '9000 Jy' });
    const noisy = rowsOf(await runKind(simulate, { ...QUIET, stations, noiseFactor: 1 })).rows;
    const quiet = rowsOf(await runKind(simulate, { ...QUIET, stations })).rows;
    let [chi, count, cross] = [0, 0, 0];
    noisy.forEach((row, k) => {
      // sqrt(S1 S2 / (2 B t)) / efficiency, written anew: 2 GHz, 30 s, 0.88.
      const sefd = [4000, 9000, 4000, 4000, 4000];
      const sigma = Math.sqrt(((sefd[row.i] ?? 0) * (sefd[row.j] ?? 0)) / (2 * 2e9 * 30)) / 0.88;
      row.hands.forEach((hand, h) => {
        const clean = quiet[k]?.hands[h];
        if (!clean) throw new Error('rows differ');
        expect(hand.weight * sigma * sigma).toBeCloseTo(1, 5);
        chi += ((hand.re - clean.re) / sigma) ** 2 + ((hand.im - clean.im) / sigma) ** 2;
        count += 2;
      });
      const [rr, ll] = row.hands;
      cross +=
        (((rr?.re ?? 0) - (quiet[k]?.hands[0]?.re ?? 0)) * ((ll?.re ?? 0) - (quiet[k]?.hands[0]?.re ?? 0))) /
        sigma ** 2;
    });
    // Four standard errors of a mean of `count` squares, and of products of independent deviates.
    expect(Math.abs(chi / count - 1)).toBeLessThan(4 * Math.sqrt(2 / count));
    expect(Math.abs(cross / noisy.length)).toBeLessThan(4 / Math.sqrt(noisy.length));
  });

  test('take no more than the stated weights when the noise is twice what they state', async () => {
    const once = rowsOf(await runKind(simulate, { ...QUIET, noiseFactor: 1 })).rows;
    const twice = rowsOf(await runKind(simulate, { ...QUIET, noiseFactor: 2 })).rows;
    const quiet = rowsOf(await runKind(simulate, QUIET)).rows;
    const offset = (rows: Row[], k: number) => (rows[k]?.hands[0]?.re ?? 0) - (quiet[k]?.hands[0]?.re ?? 0);
    for (const k of [0, 10, 100]) {
      expect(offset(twice, k) / offset(once, k)).toBeCloseTo(2, 3);
      expect(twice[k]?.hands[0]?.weight).toBe(once[k]?.hands[0]?.weight);
    }
  });

  test('of a station’s gain are in its baselines and no other', async () => {
    const quiet = rowsOf(await runKind(simulate, QUIET)).rows;
    const { rows } = rowsOf(
      await runKind(simulate, { ...QUIET, stations: withStation(2, { gainFactor: 0.67 }) }),
    );
    rows.forEach((row, k) => {
      expect(amplitude(row) / amplitude(quiet[k] as Row)).toBeCloseTo(
        row.i === 2 || row.j === 2 ? 0.67 : 1,
        5,
      );
    });
  });

  test('of gains scatter from scan to scan as told and stand still within one', async () => {
    const stations = SMALL.stations.map((station) => ({ ...station, gainError: 0.1 }));
    const long = { ...QUIET, duration: '5 h', interval: '3 min' };
    const quiet = rowsOf(await runKind(simulate, long)).rows;
    const { rows } = rowsOf(await runKind(simulate, { ...long, stations }));
    const byBaseline = new Map<string, Set<number>>();
    rows.forEach((row, k) => {
      const key = `${row.i}-${row.j}`;
      const ratio = Math.log(amplitude(row) / amplitude(quiet[k] as Row));
      byBaseline.set(key, (byBaseline.get(key) ?? new Set()).add(Math.round(ratio * 1e4) / 1e4));
    });
    const ratios = [...(byBaseline.get('0-1') ?? [])];
    // 100 scans: about that many values (rounding splits some and joins some).
    expect(ratios.length).toBeGreaterThan(90);
    expect(ratios.length).toBeLessThan(200);
    const variance = ratios.reduce((sum, value) => sum + value * value, 0) / ratios.length;
    expect(Math.sqrt(variance)).toBeGreaterThan(0.11);
    expect(Math.sqrt(variance)).toBeLessThan(0.175);
  });

  test('of station phases leave closure phases as they are, errors of baselines do not', async () => {
    const closure = (rows: Row[], k: number) => {
      const at = (i: number, j: number) =>
        phase(rows.find((row) => row.mjd === rows[k]?.mjd && row.i === i && row.j === j) as Row);
      return at(2, 3) + at(3, 4) - at(2, 4);
    };
    const quiet = rowsOf(await runKind(simulate, QUIET)).rows;
    const unknown = rowsOf(await runKind(simulate, { ...QUIET, phaseErrors: 'unknown' })).rows;
    const open = rowsOf(await runKind(simulate, { ...QUIET, nonClosing: { phase: '5 deg' } })).rows;
    const turn = (angle: number) => Math.abs(Math.sin(angle / 2));
    expect(turn(phase(unknown[5] as Row) - phase(quiet[5] as Row))).toBeGreaterThan(0.01);
    expect(turn(closure(unknown, 5) - closure(quiet, 5))).toBeLessThan(1e-5);
    expect(turn(closure(open, 5) - closure(quiet, 5))).toBeGreaterThan(0.001);
  });
});

describe('The truth’s numbers', () => {
  test('are those of a blurred ring: 42 uas, blurred to 20 uas in all', async () => {
    // Ridge diameter 37.982948468107 and radial width 21.7208870012367 of a thin ring of 42 convolved with a Gaussian of
    // 20, computed outside in 30 digits from the closed form; 12² + 16² = 20².
    const truth = { flux: '1 Jy', diameter: '42 uas', width: '12 uas', field: '200 uas', pixels: 128 };
    const { outputs } = await runKind(simulate, { ...QUIET, truth, resolution: '16 uas' });
    const { values, remarks } = readNumbers(outputs.truth);
    expect(values.diameter?.value).toBeCloseTo(37.982948, 2);
    expect(values.width?.value).toBeCloseTo(21.720887, 2);
    expect(values['thin-ring-diameter']?.value).toBeCloseTo(42, 1);
    expect(values.asymmetry?.value).toBeLessThan(1e-3);
    expect(values.roundness?.value).toBeGreaterThan(0.999);
    expect(values.flux?.value).toBeCloseTo(1, 9);
    expect(remarks[0]).toMatch(/^Invented data/);
  });

  test('are the same from the image, convolved in its pixels', async () => {
    const truth = { flux: '1 Jy', diameter: '42 uas', width: '12 uas', field: '200 uas', pixels: 128 };
    const first = await runKind(simulate, { ...QUIET, truth });
    const { truth: _, ...rest } = QUIET;
    const second = await runKind(
      simulate,
      { ...rest, resolution: '16 uas' },
      { image: [first.outputs.image] },
    );
    const { values } = readNumbers(second.outputs.truth);
    expect(values.diameter?.value).toBeCloseTo(37.982948, 2);
    expect(values.width?.value).toBeCloseTo(21.720887, 2);
  });

  test('say so when the truth is no ring', async () => {
    const truth = { flux: '1 Jy', diameter: '20 uas', width: '40 uas', pixels: 64 };
    const { outputs } = await runKind(simulate, { ...QUIET, truth });
    expect(readNumbers(outputs.truth).remarks[1]).toMatch(/^The truth shows no ring: /);
  });
});

describe('Every product', () => {
  test('is the same bytes for the same seed and other noise for another', async () => {
    const bytes = async (seed: number) => {
      const { outputs } = await runKind(simulate, { ...SMALL, seed });
      return Object.values(outputs).map((source) =>
        Buffer.from(source.read(0, source.size)).toString('base64'),
      );
    };
    const [one, again, other] = [await bytes(5), await bytes(5), await bytes(6)];
    expect(again).toEqual(one);
    expect(other[0]).not.toEqual(one[0]);
    expect(other.slice(1)).toEqual(one.slice(1));
  });

  test('says that the data are invented', async () => {
    const ran = await runKind(simulate, SMALL);
    const text = (name: string) => {
      const source = ran.outputs[name];
      return Buffer.from(source.read(0, Math.min(source.size, 8640))).toString('latin1');
    };
    expect(rowsOf(ran).uv.remark).toBe('Invented data: a simulated observation, nothing was observed.');
    for (const name of ['data', 'image']) expect(text(name)).toContain('Invented data');
    expect(readNumbers(ran.outputs.truth).remarks[0]).toContain('Invented data');
  });
});

describe('A station that never sees the target', () => {
  test('gives a warning and no rows', async () => {
    const stations = withStation(4, { latitude: '-80 deg' });
    const ran = await runKind(simulate, { ...QUIET, stations });
    expect(ran.report.warnings).toEqual([
      'Station BEACON never observes: the target stays below its elevation limit in every scan.',
    ]);
    expect(rowsOf(ran).rows.some(({ i, j }) => i === 4 || j === 4)).toBe(false);
  });
});

describe('Parameters that do not fit are refused:', () => {
  const { truth: _, ...withoutTruth } = SMALL;
  test.each<[string, Record<string, unknown>, string]>([
    [
      'a start that is no time',
      { ...SMALL, start: '2031-02-30T00:00:00Z' },
      'parameter start: parameter: expected a time such as 2031-04-07T21:00:00Z, got "2031-02-30T00:00:00Z". ' +
        'Give date and time in UTC.',
    ],
    [
      'a station without position',
      {
        ...SMALL,
        stations: withStation(0, { longitude: undefined }).map((s) => JSON.parse(JSON.stringify(s))),
      },
      'parameter stations, WICK-A: parameter: expected either xyz or all of longitude, latitude and height, got no xyz ' +
        'and 2 of the three. Give the position once.',
    ],
    [
      'a station with two positions',
      { ...SMALL, stations: withStation(0, { xyz: ['6378137 m', '0 m', '0 m'] }) },
      'parameter stations, WICK-A: parameter: expected either xyz or all of longitude, latitude and height, got xyz and 3 ' +
        'of the three. Give the position once.',
    ],
    [
      'a doubled name',
      { ...SMALL, stations: withStation(1, { name: 'WICK-A' }) },
      'parameter stations: parameter: expected every name once, got WICK-A twice. Rename one of them.',
    ],
    [
      'a scan longer than the interval',
      { ...SMALL, scan: '30 min' },
      'parameter record, scan, interval, duration: parameter: expected a record no longer than a scan, and a scan no ' +
        'longer than interval and duration, got 30 s, 1800 s, 1200 s, 7200 s. Lengthen what is too short.',
    ],
    [
      'no truth at all',
      withoutTruth,
      'parameter truth: parameter: expected either the input image or this parameter, got neither. Give the truth once.',
    ],
    [
      'a target that nobody sees',
      { ...SMALL, target: { ...SMALL.target, dec: '-89 deg' }, stations: SMALL.stations.slice(2) },
      'parameter start, duration, target, stations: parameter: expected at least one scan with two stations above their ' +
        'elevation limits, got none in 6 scans. Move the start, or lower the limits.',
    ],
  ])('%s', async (_name, written, message) => {
    await expect(runKind(simulate, written)).rejects.toThrow(InputProblem);
    await expect(runKind(simulate, written)).rejects.toThrow(message);
  });

  test('a position within the Earth', async () => {
    const { longitude: _1, latitude: _2, height: _3, ...plain } = SMALL.stations[0];
    const stations = [{ ...plain, xyz: ['1000 km', '0 m', '0 m'] }, ...SMALL.stations.slice(1)];
    await expect(runKind(simulate, { ...SMALL, stations })).rejects.toThrow(
      'parameter stations, WICK-A, xyz: parameter: expected a place between 6300 km and 100000 km from the centre of the ' +
        'Earth, got 1000 km. Coordinates are geocentric.',
    );
  });

  test('truth and image together', async () => {
    const { outputs } = await runKind(simulate, QUIET);
    await expect(runKind(simulate, SMALL, { image: [outputs.image] })).rejects.toThrow(
      'parameter truth: parameter: expected either the input image or this parameter, got both. Give the truth once.',
    );
  });
});
