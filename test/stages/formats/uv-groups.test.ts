import { readFileSync } from 'node:fs';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { memorySink, sourceOf } from '../../../stages/bytes.ts';
import {
  decodeBaseline,
  readUvGroups,
  STOKES_NAMES,
  type UvWriteRequest,
  writeUvGroups,
} from '../../../stages/formats/uv-groups.ts';
import { InputProblem } from '../../../stages/problem.ts';
import {
  DEC,
  FREQUENCY,
  RA,
  REFERENCE_JD,
  REFERENCE_MJD,
  rows,
  STATIONS,
  times,
  uvFile,
} from '../uv-synthetic.ts';

const read = (bytes: Uint8Array) => readUvGroups(sourceOf(bytes, 'data'));

function problemIn(bytes: Uint8Array): InputProblem {
  try {
    const uv = read(bytes);
    uv.block(0, uv.count);
  } catch (error) {
    if (error instanceof InputProblem) return error;
    throw error;
  }
  throw new Error('accepted');
}

describe('reading what astropy wrote (test/data/uv/groups.fits)', () => {
  // Source of the numbers: test/data/scripts/uv-groups.py, which wrote both files.
  const folder = new URL('../../data/uv/', import.meta.url);
  const uv = read(readFileSync(new URL('groups.fits', folder)));
  const truth = JSON.parse(readFileSync(new URL('groups.json', folder), 'utf8'));

  it('reads header and tables', () => {
    expect(uv.target).toEqual({ name: 'INVENTED', raDegrees: truth.raDegrees, decDegrees: truth.decDegrees });
    expect(uv.count).toBe(truth.rows.length);
    expect([...uv.frequencyHz]).toEqual([truth.frequencyHz]);
    expect([...uv.widthHz]).toEqual([truth.widthHz]);
    expect(uv.stokes).toEqual([-1, -2]);
    const byNumber = [...truth.stations].sort((a, b) => a.number - b.number);
    expect(uv.antennas[0].antennas).toEqual(byNumber);
    expect(uv.antennas[0].referenceMjd).toBe(66100);
  });

  it('reads every row', () => {
    const block = uv.block(0, uv.count);
    for (const [k, row] of truth.rows.entries()) {
      expect([block.number1[k], block.number2[k], block.subarray[k]]).toEqual([row.number1, row.number2, 1]);
      for (const name of ['u', 'v', 'w'] as const) {
        // One float32 in wavelengths, scaled by 1/frequency: relative 2^-24.
        expect(Math.abs(block[name][k] - row[name])).toBeLessThanOrEqual(Math.abs(row[name]) * 6.1e-8);
      }
      // Check value fits.groups.date_split: within 2 ms.
      expect(Math.abs(block.timeMjd[k] - (row.jd[0] - 2400000.5 + row.jd[1])) * 86400).toBeLessThan(2e-3);
      expect(block.integrationSeconds[k]).toBe(10);
      for (const hand of [0, 1]) {
        const at = k * block.rowStride + block.sampleOffset(hand, 0, 0);
        expect(block.data[at]).toBe(Math.fround(row.re[hand]));
        expect(block.data[at + block.partStride]).toBe(Math.fround(row.im[hand]));
        expect(block.data[at + 2 * block.partStride]).toBe(
          row.weight[hand] === 'inf' ? Infinity : Number(row.weight[hand]),
        );
      }
    }
  });

  it('reads the same in blocks of any size', () => {
    const whole = uv.block(0, uv.count);
    const parts = [0, 5, 10, 15].map((from) => uv.block(from, 5));
    expect(parts.map((part) => part.count)).toEqual([5, 5, 5, 3]);
    expect(parts.flatMap((part) => [...part.timeMjd])).toEqual([...whole.timeMjd]);
    expect(parts.flatMap((part) => [...part.data])).toEqual([...whole.data]);
  });
});

describe('baseline codes', () => {
  // Check value fits.baseline: 256 a1 + a2 + (subarray − 1)/100; as float32, whose quantum is 2^-11 at 6940.
  it.each([
    [258, 1, 2, 1],
    [785, 3, 17, 1],
    [6940.01, 27, 28, 2],
    [511, 1, 255, 1],
    [65535, 255, 255, 1],
  ])('takes %d apart', (code, number1, number2, subarray) => {
    expect(decodeBaseline(code)).toEqual({ number1, number2, subarray });
    expect(decodeBaseline(Math.fround(code))).toEqual({ number1, number2, subarray });
  });

  it('takes 2048·i + j + 65536 apart (common practice, more than 255 stations)', () => {
    expect(decodeBaseline(2048 * 300 + 1999 + 65536)).toEqual({ number1: 300, number2: 1999, subarray: 1 });
    expect(decodeBaseline(2048 * 1 + 256 + 65536)).toEqual({ number1: 1, number2: 256, subarray: 1 });
  });

  it('rounds before dividing', () => {
    expect(decodeBaseline(257.9998)).toEqual({ number1: 1, number2: 2, subarray: 1 });
  });

  it.each([0, 255, 256, -5, Number.NaN, Infinity])('refuses %d', (code) => {
    expect(decodeBaseline(code)).toBeUndefined();
  });

  it('gives back every pair and subarray in float32', () => {
    const number = fc.integer({ min: 1, max: 255 });
    fc.assert(
      fc.property(number, number, fc.integer({ min: 1, max: 9 }), (number1, number2, subarray) => {
        const code = Math.fround(256 * number1 + number2 + (subarray - 1) / 100);
        expect(decodeBaseline(code)).toEqual({ number1, number2, subarray });
      }),
    );
  });
});

it('names the codes of the STOKES axis (check value fits.stokes)', () => {
  const published = {
    I: 1,
    Q: 2,
    U: 3,
    V: 4,
    RR: -1,
    LL: -2,
    RL: -3,
    LR: -4,
    XX: -5,
    YY: -6,
    XY: -7,
    YX: -8,
  };
  expect(Object.fromEntries([...STOKES_NAMES].map(([code, name]) => [name, code]))).toEqual(published);
});

describe('what files vary in', () => {
  const list = rows({ days: times(1, 2) });
  const usual = read(uvFile(list)).block(0, list.length);

  it.each([
    ['UU', 'VV', 'WW'],
    ['UU-L-SIN', 'VV-L-SIN', 'WW-L-SIN'],
    ['UU--', 'VV--', 'WW--'],
  ] as [string, string, string][])('finds u, v, w named %s, %s, %s', (...names) => {
    expect(read(uvFile(list, { names })).block(0, 9).u).toEqual(usual.u.slice(0, 9));
  });

  it('applies PSCAL: wavelengths on disk, seconds in memory', () => {
    const block = read(uvFile(list, { uvScale: 1 / FREQUENCY })).block(0, list.length);
    for (const [k, row] of list.entries()) expect(Math.abs(block.u[k] - row.u)).toBeLessThan(2e-9);
  });

  // Source: FITS Standard 4.0, section 6.1.2: parameters of one name are to be added.
  it('adds parameters of one name, and leaves alone what only begins alike', () => {
    const fine = list.map((_, k) => 1e-12 * (k + 1));
    const extra = [
      { name: 'UU---SIN', values: fine },
      { name: 'VV-OTHER', values: fine },
    ];
    const block = read(uvFile(list, { extra })).block(0, list.length);
    for (const k of list.keys()) expect(block.u[k]).toBe(usual.u[k] + Math.fround(fine[k]));
    expect(block.v).toEqual(usual.v);
  });

  it('adds two DATE parameters, and one alone has a quantum of a quarter of a day', () => {
    for (const [k, row] of list.entries()) {
      expect(Math.abs(usual.timeMjd[k] - (REFERENCE_MJD + row.day)) * 86400).toBeLessThan(2e-3);
    }
    // Check value fits.groups.date_single_float32_quantum_days: 0.25.
    const single = read(uvFile(list, { dates: 'single' })).block(0, 1);
    expect(single.timeMjd[0]).toBe(REFERENCE_MJD + 0.25);
  });

  it('finds axes by CTYPE in any order', () => {
    const axes = ['STOKES', 'DEC', 'FREQ', 'COMPLEX', 'RA', 'IF'];
    const uv = read(uvFile(list, { axes }));
    const block = uv.block(0, list.length);
    expect(uv.target.decDegrees).toBe(DEC);
    for (const part of [0, 1, 2]) {
      const at = block.rowStride + block.sampleOffset(1, 0, 0) + part * block.partStride;
      expect(block.data[at]).toBe(Math.fround(list[1].hands[0][0][1][part]));
    }
  });

  it('takes a missing IF axis for one band and a missing STOKES axis for Stokes I', () => {
    const uv = read(uvFile(rows({ hands: 1 }), { axes: ['COMPLEX', 'FREQ', 'RA', 'DEC'] }));
    expect([uv.bandCount, uv.stokes]).toEqual([1, [1]]);
  });

  it('adds the frequency table to the reference frequency', () => {
    const frequencies = [
      [FREQUENCY, FREQUENCY + 5e8],
      [FREQUENCY + 2e9, FREQUENCY + 2.5e9],
    ];
    const file = uvFile(rows({ frequencies }), { bands: [0, 2e9], bandwidth: 5e8, channelStep: 5e8 });
    expect([...read(file).frequencyHz]).toEqual(frequencies.flat());
  });

  it('reads codes for more than 255 stations, and stations in parameters of their own', () => {
    const stations = STATIONS.map((station) => ({ ...station, number: 300 + station.number }));
    for (const code of ['long', 'none'] as const) {
      const block = read(uvFile(rows({ stations }), { stations, code })).block(0, 1);
      expect([block.number1[0], block.number2[0]]).toEqual([301, 304]);
    }
  });

  it('takes trailing blanks off names and adds ARRAYX, Y, Z', () => {
    const stations = STATIONS.map((station) => ({ ...station, name: `${station.name}  ` }));
    const { antennas } = read(uvFile(list, { stations, antennaCards: [['ARRAYX', 1000]] })).antennas[0];
    expect(antennas.map((each) => each.name)).toEqual(['ONE', 'FOUR', 'SEVEN', 'EIGHT']);
    expect(antennas[0].xyz).toEqual([-1827800, -5054400, 3427900]);
  });

  it('turns a left-handed table round', () => {
    const { antennas } = read(uvFile(list, { antennaCards: [['XYZHAND', 'LEFT']] })).antennas[0];
    expect(antennas[0].xyz).toEqual([-1828800, 5054400, 3427900]);
  });

  it('takes atomic time back to UTC', () => {
    const file = uvFile(list, {
      antennaCards: [
        ['TIMSYS', 'IAT'],
        ['IATUTC', 37],
      ],
    });
    expect((usual.timeMjd[0] - read(file).block(0, 1).timeMjd[0]) * 86400).toBeCloseTo(37, 4);
  });

  it.each(['08/11/39', '2039-13-01', 'soon'])('refuses or reads the reference date %s', (date) => {
    const file = uvFile(list, { antennaCards: [['RDATE', date]] });
    // Two digits mean 19xx (FITS Standard 4.0, section 9.1.1): MJD 29575 is 1939-11-08 (JD 2429575.5 − 2400000.5).
    if (date.includes('/')) expect(read(file).antennas[0].referenceMjd).toBe(29575);
    else expect(problemIn(file).code).toBe('bad-date');
  });
});

describe('what is refused', () => {
  const list = rows({ days: times(1, 1) });
  it.each([
    ['no-antenna-table', uvFile(list, { antennas: 'none' })],
    ['no-complex-axis', uvFile(list, { axes: ['STOKES', 'FREQ', 'RA', 'DEC'] })],
    ['no-frequency', uvFile(list, { axes: ['COMPLEX', 'STOKES', 'RA', 'DEC'] })],
    ['no-position', uvFile(list, { axes: ['COMPLEX', 'STOKES', 'FREQ'] })],
    ['missing-parameter', uvFile(list, { names: ['U', 'V', 'W'] })],
    ['bad-frequency-table', uvFile(rows({ frequencies: [[FREQUENCY], [FREQUENCY + 2e9]] }))],
    ['bad-antenna-table', uvFile(list, { stations: [STATIONS[0], ...STATIONS] })],
    ['bad-baseline', uvFile(list.map((row) => ({ ...row, number1: 0, number2: 0 })))],
    ['bad-time', uvFile(list.map((row) => ({ ...row, day: -2466000 })))],
  ])('says %s', (code, file) => {
    expect(problemIn(file).code).toBe(code);
  });

  it('names the extensions where there is no antenna table', () => {
    expect(problemIn(uvFile(list, { antennas: 'none', bands: [0] })).message).toBe(
      'data: no-antenna-table: expected an antenna table: a binary table whose EXTNAME ends in AN, with columns ANNAME, STABXYZ and NOSTA, got the extensions TEST FQ. Write the file with its antenna table: without it baselines have no stations.',
    );
  });
});

describe('writing', () => {
  function request(count: number, stations = 5): UvWriteRequest {
    const fill = (value: (k: number) => number) => Float64Array.from({ length: count }, (_, k) => value(k));
    const hand = (seed: number) => ({
      re: Float32Array.from(fill((k) => seed + k / 7)),
      im: Float32Array.from(fill((k) => seed - k / 3)),
      weight: Float32Array.from(fill((k) => (k % 5 === 0 ? -1 : 100 + k))),
    });
    return {
      target: { name: 'INVENTED', raDegrees: RA, decDegrees: DEC },
      arrayName: 'TESTARRAY',
      remark:
        'Invented data: nothing here was observed, and the remark is longer than one card of a header can hold.',
      frequencyHz: FREQUENCY,
      bandwidthHz: 2e9,
      stations: Array.from({ length: stations }, (_, k) => ({
        name: `S${k}`,
        xyz: [k * 1e6, 1e6, 5e5 - k * 3e5] as const,
      })),
      referenceDate: REFERENCE_JD,
      gst0Degrees: 201.3,
      degreesPerDay: 360.985647,
      count,
      station1: Int32Array.from(fill((k) => k % 2)),
      station2: Int32Array.from(fill((k) => 2 + (k % (stations - 2)))),
      timeJd: fill((k) => REFERENCE_JD + 0.9 - (k * 10) / 86400),
      u: fill((k) => 1e-2 * Math.sin(k)),
      v: fill((k) => 1e-2 * Math.cos(k)),
      w: fill((k) => 1e-3 * k),
      integrationSeconds: fill((k) => 10 + (k % 2)),
      rr: hand(1),
      ll: hand(2),
    };
  }
  const write = (what: UvWriteRequest) => {
    const sink = memorySink();
    writeUvGroups(sink, what);
    return sink.bytes();
  };

  it('comes back row by row, sorted by time and baseline', () => {
    const what = request(60);
    const uv = read(write(what));
    expect(uv.target).toEqual(what.target);
    expect([uv.arrayName, uv.remark, uv.frequencyHz[0], uv.widthHz[0]]).toEqual([
      'TESTARRAY',
      what.remark,
      FREQUENCY,
      2e9,
    ]);
    expect(uv.antennas[0].antennas.map(({ name, xyz }) => ({ name, xyz }))).toEqual(what.stations);
    expect(uv.antennas[0]).toMatchObject({
      referenceMjd: 66100,
      gst0Degrees: 201.3,
      degreesPerDay: 360.985647,
    });
    const block = uv.block(0, 60);
    for (let k = 0; k < 60; k++) {
      const from = 59 - k; // times fall in the request
      expect([block.number1[k], block.number2[k]]).toEqual([
        what.station1[from] + 1,
        what.station2[from] + 1,
      ]);
      expect(block.u[k]).toBe(Math.fround(what.u[from]));
      // The float64 JD itself has a quantum of 40 µs (2^-31 d at 2.5e6 d); the split adds at most 10 µs.
      expect(Math.abs(block.timeMjd[k] - (what.timeJd[from] - 2400000.5)) * 86400).toBeLessThan(5e-5);
      expect(block.integrationSeconds[k]).toBe(what.integrationSeconds[from]);
      for (const [hand, values] of [what.rr, what.ll].entries()) {
        const at = k * block.rowStride + block.sampleOffset(hand, 0, 0);
        expect([...block.data.subarray(at, at + 3)]).toEqual([
          values.re[from],
          values.im[from],
          values.weight[from],
        ]);
      }
    }
  });

  it('writes the same bytes for rows in any order', () => {
    const what = request(40);
    const order = Array.from({ length: 40 }, (_, k) => (k * 7) % 40);
    const pick = <T extends Float64Array | Float32Array | Int32Array>(a: T) =>
      a.map((_, k) => a[order[k]]) as T;
    const hand = ({ re, im, weight }: UvWriteRequest['rr']) => ({
      re: pick(re),
      im: pick(im),
      weight: pick(weight),
    });
    const mixed: UvWriteRequest = {
      ...what,
      station1: pick(what.station1),
      station2: pick(what.station2),
      timeJd: pick(what.timeJd),
      u: pick(what.u),
      v: pick(what.v),
      w: pick(what.w),
      integrationSeconds: pick(what.integrationSeconds),
      rr: hand(what.rr),
      ll: hand(what.ll),
    };
    expect(Buffer.from(write(mixed)).equals(write(what))).toBe(true);
  });

  it('codes more than 255 stations', () => {
    const what = request(300, 300);
    const block = read(write(what)).block(0, 300);
    expect(block.number2[0]).toBe(what.station2[299] + 1);
    expect(Math.max(...block.number2)).toBe(300);
  });

  it('refuses arrays of other lengths and stations out of order', () => {
    expect(() => write({ ...request(5), u: new Float64Array(4) })).toThrow('writeUvGroups');
    expect(() => write({ ...request(5), station2: new Int32Array(5) })).toThrow('writeUvGroups: row 0');
  });
});

describe('damage', () => {
  const file = uvFile(rows({ days: times(1, 1) }), { bands: [0] });
  it('ends in an InputProblem wherever the file is cut', () => {
    fc.assert(
      fc.property(fc.integer({ min: 0, max: file.length - 1 }), (length) => {
        expect(problemIn(file.slice(0, length))).toBeInstanceOf(InputProblem);
      }),
    );
  });
});
