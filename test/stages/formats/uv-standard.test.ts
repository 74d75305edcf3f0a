/** Random groups in every combination that the standard and the trade allow. Files are built byte by byte (raw-fits.ts) from
 *  chosen numbers, powers of two where they scale, so that what must be read is exact: physical = PZERO + PSCAL · stored for
 *  parameters, those of one name added (FITS Standard 4.0, section 6.1.2), BZERO + BSCALE · stored in the array, whose first
 *  axis runs fastest (section 3.3.2); coordinates CRVAL + (k − CRPIX) · CDELT (eq. 9). Names: common practice. */

import fc from 'fast-check';
import { describe, expect, it, test } from 'vitest';
import { sourceOf } from '../../../stages/bytes.ts';
import { readUvGroups } from '../../../stages/formats/uv-groups.ts';
import { problemOf } from './fits/fixtures.ts';
import {
  joined,
  type RawAxis,
  type RawBitpix,
  type RawCard,
  type RawColumn,
  type RawParameter,
  rawGroups,
  rawRows,
  rawTable,
} from './raw-fits.ts';

const FREQUENCY = 2.2e11;
const STEP = 2 ** 20;
const OFFSET = 2 ** 30;
const SCALE = 2 ** -20;
const JD = 2466100.5;
const LEAST_WIDTH = 2 ** 22;

const antennaTable = (numbers: readonly number[], cards: readonly RawCard[] = []) =>
  rawTable(
    'AN',
    [
      {
        name: 'ANNAME',
        form: '8A',
        rows: rawRows.text(
          8,
          numbers.map((n) => `S${n}`),
        ),
      },
      {
        name: 'STABXYZ',
        form: '3D',
        rows: rawRows.numbers(
          -64,
          numbers.map((n) => [n, 2 * n, 3 * n]),
        ),
      },
      {
        name: 'NOSTA',
        form: 'J',
        rows: rawRows.numbers(
          32,
          numbers.map((n) => [n]),
        ),
      },
    ],
    cards,
  );

/** The frequency table: setups of an offset, a width and a sideband for each band. */
function frequencyTable(
  setups: readonly { number: number; bands: readonly { sideband: number; offset: number }[] }[],
) {
  const n = setups[0].bands.length;
  const column = (name: string, form: string, bitpix: RawBitpix, values: number[][]): RawColumn => ({
    name,
    form,
    rows: rawRows.numbers(bitpix, values),
  });
  const of = (value: (band: { sideband: number; offset: number }) => number) =>
    setups.map(({ bands }) => bands.map(value));
  return rawTable('FQ', [
    column(
      'FRQSEL',
      'J',
      32,
      setups.map(({ number }) => [number]),
    ),
    column(
      'IF FREQ',
      `${n}D`,
      -64,
      of(({ offset }) => offset),
    ),
    column(
      'CH WIDTH',
      `${n}E`,
      -32,
      of(() => STEP),
    ),
    column(
      'TOTAL BANDWIDTH',
      `${n}E`,
      -32,
      of(() => LEAST_WIDTH),
    ),
    column(
      'SIDEBAND',
      `${n}J`,
      32,
      of(({ sideband }) => sideband),
    ),
  ]);
}

/** A parameter with what each row stores of it. */
interface Stored extends RawParameter {
  readonly values: readonly number[];
}

/** What a file is drawn from. */
const drawn = fc.record({
  bitpix: fc.constantFrom<RawBitpix>(16, 32, 64, -32, -64),
  order: fc.shuffledSubarray(['COMPLEX', 'STOKES', 'FREQ', 'IF', 'RA', 'DEC'], { minLength: 6 }),
  absent: fc.subarray(['STOKES', 'IF', 'RA', 'DEC']),
  stokes: fc.record({
    codes: fc.constantFrom([1, 2, 3, 4], [-1, -2, -3, -4], [-5, -6, -7, -8]),
    from: fc.nat(3),
    n: fc.integer({ min: 1, max: 4 }),
    falls: fc.boolean(),
    crpix: fc.integer({ min: -2, max: 5 }),
  }),
  channels: fc.record({
    n: fc.integer({ min: 1, max: 3 }),
    crpix: fc.integer({ min: -1, max: 4 }),
    falls: fc.boolean(),
  }),
  bands: fc.array(fc.record({ sideband: fc.constantFrom(1, -1), offset: fc.nat(9).map((k) => k * OFFSET) }), {
    minLength: 1,
    maxLength: 3,
  }),
  hasTable: fc.boolean(),
  scale: fc.constantFrom(undefined, 1, 0.25, -2),
  zero: fc.constantFrom(undefined, 0, 64, -1.5),
  blank: fc.option(fc.constant(-7)),
  suffix: fc.constantFrom('', '--', '-L-SIN', '---SIN', '-L', '---NCP'),
  twice: fc.subarray(['UU', 'VV', 'WW', 'DATE']),
  underscored: fc.boolean(),
  stations: fc.constantFrom('BASELINE', 'ANTENNA1'),
  hasW: fc.boolean(),
  hasTime: fc.boolean(),
  shuffle: fc.array(fc.nat(1000), { minLength: 12, maxLength: 12 }),
  rows: fc.array(fc.tuple(fc.integer({ min: 1, max: 120 }), fc.integer({ min: 1, max: 255 }), fc.nat(1023)), {
    minLength: 1,
    maxLength: 4,
  }),
});

test('files of any combination read as they were made', () => {
  fc.assert(
    fc.property(drawn, (d) => {
      const rows = d.rows.length;
      const list = <T>(value: (row: number) => T) => Array.from({ length: rows }, (_, row) => value(row));
      const expected: Record<string, number[]> = {};
      const parameters: Stored[] = [];
      /** Adds a parameter, and its physical values to what is expected. */
      const put = (what: string, name: string, scale: number, zero: number, values: number[]) => {
        const written = {
          ...(scale === 1 && values.length % 2 === 0 ? {} : { scale }),
          ...(zero === 0 && values.length % 2 === 1 ? {} : { zero }),
        };
        parameters.push({ name, ...written, values });
        const before = expected[what] ?? list(() => 0);
        expected[what] = values.map((value, row) => before[row] + (zero + scale * value));
      };
      for (const [k, name] of ['UU', 'VV', 'WW'].entries()) {
        if (name === 'WW' && !d.hasW) continue;
        put(
          name,
          `${name}${d.suffix}`,
          SCALE,
          0,
          list((row) => 7 * row - 5 * k + 3),
        );
        if (d.twice.includes(name))
          put(
            name,
            `${name}${d.suffix}`,
            SCALE / 4096,
            3 * SCALE,
            list((row) => row - k),
          );
      }
      if (d.stations === 'BASELINE') {
        // Whole codes, less a number that PZERO gives back.
        put(
          'code',
          'BASELINE',
          1,
          1000,
          d.rows.map(([i, j]) => 256 * i + j - 1000),
        );
      } else {
        put(
          'i',
          'ANTENNA1',
          1,
          0,
          d.rows.map(([i]) => i),
        );
        put(
          'j',
          'ANTENNA2',
          0.5,
          0,
          d.rows.map(([, j]) => 2 * j),
        );
        put(
          's',
          'SUBARRAY',
          1,
          0,
          list(() => 1),
        );
      }
      put(
        'DATE',
        'DATE',
        d.twice.includes('DATE') ? 1 : 2 ** -10,
        JD,
        list((row) => row),
      );
      if (d.twice.includes('DATE'))
        put(
          'DATE',
          d.underscored ? '_DATE' : 'DATE',
          2 ** -10,
          0,
          d.rows.map(([, , part]) => part),
        );
      if (d.hasTime)
        put(
          'INTTIM',
          'INTTIM',
          0.5,
          1,
          list((row) => 20 + row),
        );
      const mixed = inOrder(parameters, d.shuffle);

      const first = Math.min(d.stokes.from, 4 - Math.min(d.stokes.n, 4 - d.stokes.from));
      const codes = d.absent.includes('STOKES') ? [1] : d.stokes.codes.slice(first, first + d.stokes.n);
      if (d.stokes.falls) codes.reverse();
      const step = codes.length > 1 ? codes[1] - codes[0] : -1;
      const bands = d.absent.includes('IF') ? d.bands.slice(0, 1) : d.bands;
      const hasTable = d.hasTable || bands.length > 1;
      const channelStep = d.channels.falls ? -STEP : STEP;
      const known: Record<string, RawAxis> = {
        COMPLEX: { ctype: 'COMPLEX', n: 3, crval: 1, crpix: 1, cdelt: 1 },
        STOKES: {
          ctype: 'STOKES',
          n: codes.length,
          crval: codes[0] + (d.stokes.crpix - 1) * step,
          crpix: d.stokes.crpix,
          cdelt: step,
        },
        FREQ: {
          ctype: 'FREQ',
          n: d.channels.n,
          crval: FREQUENCY,
          crpix: d.channels.crpix,
          cdelt: channelStep,
        },
        IF: { ctype: 'IF', n: bands.length, crval: 1, crpix: 1, cdelt: 1 },
        RA: { ctype: 'RA---SIN', n: 1, crval: 187.5 },
        DEC: { ctype: 'DEC--SIN', n: 1, crval: -12.25 },
      };
      const axes = d.order.filter((name) => !d.absent.includes(name)).map((name) => known[name]);
      const length = axes.reduce((product, { n }) => product * n, 1);
      const stored = (row: number, k: number) => ((row * 131 + k * 17) % 201) - 100;
      const isInteger = d.bitpix > 0;
      const file = joined(
        rawGroups({
          bitpix: d.bitpix,
          parameters: mixed,
          axes,
          groups: list((row) => [
            ...mixed.map(({ values }) => values[row]),
            ...Array.from({ length }, (_, k) => stored(row, k)),
          ]),
          cards: [
            ...(d.scale === undefined ? [] : [['BSCALE', d.scale] as const]),
            ...(d.zero === undefined ? [] : [['BZERO', d.zero] as const]),
            ...(d.blank === null || !isInteger ? [] : [['BLANK', d.blank] as const]),
            ['OBSRA', 187.5],
            ['OBSDEC', -12.25],
          ],
        }),
        antennaTable([...new Set([...d.rows.map(([i]) => i), ...d.rows.map(([, j]) => j)])]),
        ...(hasTable ? [frequencyTable([{ number: 1, bands }])] : []),
      );

      const uv = readUvGroups(sourceOf(file, 'raw'));
      const block = uv.block(0, rows);
      expect([uv.target.raDegrees, uv.target.decDegrees, uv.count]).toEqual([187.5, -12.25, rows]);
      expect(uv.stokes).toEqual(codes);
      expect([uv.bandCount, uv.channelCount]).toEqual([bands.length, d.channels.n]);
      for (const [b, { sideband, offset }] of bands.entries()) {
        const width = hasTable ? sideband * STEP : channelStep;
        for (let c = 0; c < d.channels.n; c++) {
          const frequency = FREQUENCY + (hasTable ? offset : 0) + (c + 1 - d.channels.crpix) * width;
          expect(uv.frequencyHz[b * d.channels.n + c]).toBe(frequency);
        }
        expect(uv.widthHz[b]).toBe(hasTable && d.channels.n === 1 ? LEAST_WIDTH : STEP);
      }
      expect([...block.u]).toEqual(expected.UU);
      expect([...block.v]).toEqual(expected.VV);
      expect([...block.w]).toEqual(expected.WW ?? list(() => 0));
      expect([...block.timeMjd]).toEqual(expected.DATE.map((jd) => jd - 2400000.5));
      expect([...block.integrationSeconds]).toEqual(expected.INTTIM ?? list(() => 0));
      expect([...block.number1]).toEqual(d.rows.map(([i]) => i));
      expect([...block.number2]).toEqual(d.rows.map(([, j]) => j));
      expect([...block.subarray]).toEqual(list(() => 1));
      const at = (index: Record<string, number>) => {
        let [place, stride] = [0, 1];
        for (const { ctype, n } of axes) {
          place += (index[ctype] ?? 0) * stride;
          stride *= n;
        }
        return place;
      };
      for (let row = 0; row < rows; row++) {
        for (const s of codes.keys()) {
          for (const b of bands.keys()) {
            for (let c = 0; c < d.channels.n; c++) {
              for (const part of [0, 1, 2]) {
                const number = stored(row, at({ COMPLEX: part, STOKES: s, IF: b, FREQ: c }));
                const isBlank = isInteger && d.blank !== null && number === d.blank;
                const value = isBlank ? Number.NaN : (d.zero ?? 0) + (d.scale ?? 1) * number;
                const found = row * block.rowStride + block.sampleOffset(s, b, c) + part * block.partStride;
                expect(block.data[found]).toBe(value);
              }
            }
          }
        }
      }
    }),
    { numRuns: 150 },
  );
});

/** In the order that the keys give; parameters of one name keep theirs, which does not matter. */
function inOrder<T>(list: readonly T[], keys: readonly number[]): T[] {
  return list
    .map((value, k) => ({ value, key: keys[k % keys.length] }))
    .sort((a, b) => a.key - b.key)
    .map(({ value }) => value);
}

interface Change {
  bitpix?: RawBitpix;
  parameters?: Stored[];
  axes?: RawAxis[];
  cards?: RawCard[];
  tables?: Uint8Array[];
  groups?: number[][];
}

const plain: Stored[] = [
  { name: 'UU', values: [1] },
  { name: 'VV', values: [2] },
  { name: 'BASELINE', values: [258] },
  { name: 'DATE', zero: JD, values: [0.25] },
];
const complex: RawAxis = { ctype: 'COMPLEX', n: 3, crval: 1, crpix: 1, cdelt: 1 };
const freq: RawAxis = { ctype: 'FREQ', n: 1, crval: FREQUENCY, crpix: 1, cdelt: STEP };
const usual: RawAxis[] = [complex, freq];

function file(change: Change = {}): Uint8Array {
  const {
    bitpix = -64,
    parameters = plain,
    axes = usual,
    cards = [],
    tables = [antennaTable([1, 2])],
  } = change;
  const length = axes.reduce((product, { n }) => product * n, 1);
  const groups = change.groups ?? [
    [...parameters.map(({ values }) => values[0]), ...new Array(length).fill(1)],
  ];
  return joined(
    rawGroups({ bitpix, parameters, axes, groups, cards: [['OBSRA', 10], ['OBSDEC', 20], ...cards] }),
    ...tables,
  );
}

const blockOf = (change: Change) => {
  const uv = readUvGroups(sourceOf(file(change), 'raw'));
  return uv.block(0, uv.count);
};
const withParameter = (name: string, value: number, more: Partial<RawParameter> = {}) => [
  ...plain.filter((each) => each.name !== name),
  { name, values: [value], ...more },
];
const antennas = (...numbers: number[]) =>
  ['ANTENNA1', 'ANTENNA2', 'SUBARRAY'].flatMap((name, k) =>
    numbers[k] === undefined ? [] : [{ name, values: [numbers[k]] }],
  );
const paired = (...numbers: number[]) => [
  ...plain.filter(({ name }) => name !== 'BASELINE'),
  ...antennas(...numbers),
];
const oneBand = [{ sideband: 1, offset: 0 }];

describe('what is read', () => {
  it('is a lower sideband once, though width and SIDEBAND both say so', () => {
    const table = rawTable('FQ', [
      { name: 'IF FREQ', form: 'D', rows: rawRows.numbers(-64, [[0]]) },
      { name: 'CH WIDTH', form: 'E', rows: rawRows.numbers(-32, [[-STEP]]) },
      { name: 'SIDEBAND', form: 'J', rows: rawRows.numbers(32, [[-1]]) },
    ]);
    const axes = [complex, { ...freq, n: 2 }];
    const uv = readUvGroups(sourceOf(file({ axes, tables: [antennaTable([1, 2]), table] })));
    expect([...uv.frequencyHz]).toEqual([FREQUENCY, FREQUENCY - STEP]);
  });

  it('is the setup that FREQSEL names, rounded after scaling', () => {
    const setups = [
      { number: 1, bands: oneBand },
      { number: 3, bands: [{ sideband: 1, offset: OFFSET }] },
    ];
    const tables = [antennaTable([1, 2]), frequencyTable(setups)];
    const parameters = [...plain, { name: 'FREQSEL', values: [2.9999] }];
    const uv = readUvGroups(sourceOf(file({ parameters, tables })));
    expect(uv.frequencyHz[0]).toBe(FREQUENCY + OFFSET);
    expect(uv.block(0, 1).frequencySetup[0]).toBe(3);
  });

  it('is in UTC by the lead of the table of its subarray', () => {
    const tables = [
      antennaTable([1, 2], [['EXTVER', 1]]),
      antennaTable(
        [1, 2],
        [
          ['EXTVER', 2],
          ['TIMSYS', 'TAI'],
          ['IATUTC', 37],
        ],
      ),
    ];
    const times = [258, 258.01].map(
      (code) => blockOf({ parameters: withParameter('BASELINE', code), tables }).timeMjd[0],
    );
    // A double at 66100 days holds 1e-6 s.
    expect((times[0] - times[1]) * 86400).toBeCloseTo(37, 5);
  });

  it('is a station of more than 255 by any of the ways to number it', () => {
    const many = { tables: [antennaTable([300, 1999])] };
    for (const parameters of [
      withParameter('BASELINE', 65536 + 2048 * 300 + 1999),
      paired(300, 1999, 1),
      paired(300, 1999),
    ]) {
      const { number1, number2, subarray } = blockOf({ parameters, ...many });
      expect([number1[0], number2[0], subarray[0]]).toEqual([300, 1999, 1]);
    }
  });

  it('is NaN where NaN or BLANK stands, and a weight as it stands', () => {
    const groups = [[...plain.map(({ values }) => values[0]), Number.NaN, -0.5, Number.POSITIVE_INFINITY]];
    expect([...blockOf({ groups }).data]).toEqual([Number.NaN, -0.5, Number.POSITIVE_INFINITY]);
    const parameters = withParameter('DATE', 1, { zero: JD });
    const ordered = parameters.map(({ name, values }) => (name === 'BASELINE' ? 258 : values[0]));
    const integers = [[...ordered, -32768, 5, -4]];
    const { data } = blockOf({
      bitpix: 16,
      parameters,
      groups: integers,
      cards: [
        ['BLANK', -32768],
        ['BSCALE', 0.5],
      ],
    });
    expect([...data]).toEqual([Number.NaN, 2.5, -2]);
  });
});

describe('what is refused', () => {
  const stokes = (n: number, crval: number, cdelt?: number): Change => ({
    axes: [complex, freq, { ctype: 'STOKES', n, crval, crpix: 1, ...(cdelt === undefined ? {} : { cdelt }) }],
  });
  const setup = (column: RawColumn): Change => ({
    axes: [complex, freq, { ctype: 'IF', n: 2, crval: 1, crpix: 1, cdelt: 1 }],
    tables: [
      antennaTable([1, 2]),
      rawTable('FQ', [{ name: 'IF FREQ', form: '2D', rows: rawRows.numbers(-64, [[0, OFFSET]]) }, column]),
    ],
  });
  const two = frequencyTable([
    { number: 1, bands: oneBand },
    { number: 2, bands: oneBand },
  ]);
  const lie = (keyword: string, value: number | boolean): Change => ({ cards: [[keyword, value]] });

  it.each<[string, Change, string, string]>([
    ['no groups', { groups: [] }, 'no-groups', '0 groups of 3 values'],
    ['an axis of no length', { axes: [complex, { ...freq, n: 0 }] }, 'no-groups', '1 groups of 0 values'],
    ['no parameters', { parameters: [] }, 'missing-parameter', 'none'],
    ['more groups than the file holds', lie('GCOUNT', 9007199254740991), 'bad-size', ''],
    ['more parameters than the file holds', lie('PCOUNT', 9007199254740991), 'bad-size', ''],
    ['a negative number of groups', lie('GCOUNT', -1), 'bad-value', '-1'],
    ['a BSCALE of 0', lie('BSCALE', 0), 'bad-value', 'BSCALE = 0'],
    ['a PSCAL of 0', { parameters: withParameter('UU', 1, { scale: 0 }) }, 'bad-value', 'PSCAL4 = 0'],
    ['two axes FREQ', { axes: [complex, freq, freq] }, 'doubled-axis', 'two'],
    ['an axis of another kind', { axes: [complex, freq, { ctype: 'BEAM', n: 2 }] }, 'unknown-axis', 'BEAM'],
    ['no weights', { axes: [{ ...complex, n: 2 }, freq] }, 'no-complex-axis', 'length 2'],
    ['two products of one code', stokes(2, -1, 0), 'bad-stokes', 'CDELT 0'],
    ['products between codes', stokes(2, -1, 0.5), 'bad-stokes', 'CDELT 0.5'],
    ['a code that is not whole', stokes(1, 1.5), 'bad-stokes', '1.5'],
    ['channels of one frequency', { axes: [complex, { ...freq, n: 2, cdelt: 0 }] }, 'no-frequency', '0 Hz'],
    [
      'bands without frequencies',
      { axes: [complex, freq, { ctype: 'IF', n: 2 }] },
      'bad-frequency-table',
      'no frequency',
    ],
    [
      'widths of other bands',
      setup({ name: 'CH WIDTH', form: 'E', rows: rawRows.numbers(-32, [[1]]) }),
      'bad-frequency-table',
      'TFORM E',
    ],
    [
      'sidebands of other bands',
      setup({ name: 'SIDEBAND', form: '3J', rows: rawRows.numbers(32, [[1, 1, 1]]) }),
      'bad-frequency-table',
      'TFORM 3J',
    ],
    [
      'setups and nothing that says which',
      { tables: [antennaTable([1, 2]), two] },
      'bad-frequency-table',
      'no parameter FREQSEL',
    ],
    [
      'a setup that is not there',
      { parameters: [...plain, { name: 'FREQSEL', values: [7] }], tables: [antennaTable([1, 2]), two] },
      'bad-frequency-table',
      'FREQSEL 7',
    ],
    [
      'a setup that the only one is not',
      {
        parameters: [...plain, { name: 'FREQSEL', values: [2] }],
        tables: [antennaTable([1, 2]), frequencyTable([{ number: 1, bands: oneBand }])],
      },
      'bad-frequency-table',
      'FREQSEL 2',
    ],
    [
      'two tables of one subarray',
      { tables: [antennaTable([1, 2], [['EXTVER', 1]]), antennaTable([1, 2], [['EXTVER', 1]])] },
      'bad-antenna-table',
      '1, as in raw, HDU 2 (AN)',
    ],
    [
      'atomic time without its lead',
      { tables: [antennaTable([1, 2], [['TIMSYS', 'IAT']])] },
      'bad-antenna-table',
      'none',
    ],
    [
      'a station number beyond any array',
      { parameters: paired(4294967297, 2, 1) },
      'bad-baseline',
      '4294967297',
    ],
    [
      'a subarray beyond any',
      { parameters: paired(1, 2, 4294967297) },
      'bad-baseline',
      'SUBARRAY 4294967297',
    ],
    [
      'a subarray that is no number',
      { parameters: paired(1, 2, Number.NaN) },
      'bad-baseline',
      'SUBARRAY NaN',
    ],
    ['a code that ends in 0.6', { parameters: withParameter('BASELINE', 257.6) }, 'bad-baseline', '257.6'],
    [
      'a long code with a fraction',
      { parameters: withParameter('BASELINE', 65536 + 2048 + 2 + 1 / 64) },
      'bad-baseline',
      '67586.015625',
    ],
    [
      'a code that is no number',
      { parameters: withParameter('BASELINE', Number.NaN) },
      'bad-baseline',
      'NaN',
    ],
    ['a time that is no Julian date', { parameters: withParameter('DATE', 12.5) }, 'bad-time', '12.5'],
  ])('%s', (_what, change, code, found) => {
    const problem = problemOf(() => blockOf(change));
    expect([problem.code, problem.found]).toEqual([code, expect.stringContaining(found)]);
  });

  it('a frequency table without rows whose row has no end, without room for it', () => {
    const lying = rawTable('FQ', [{ name: 'IF FREQ', form: `${2 ** 48}D`, rows: [] }], [['ABC', 1]], 0);
    const text = Buffer.from(lying)
      .toString('latin1')
      .replace(/NAXIS1 {2}= +0/, (card) => `NAXIS1  = ${String(2 ** 51).padStart(card.length - 10)}`);
    const tables = [antennaTable([1, 2]), new Uint8Array(Buffer.from(text, 'latin1'))];
    expect(readUvGroups(sourceOf(file({ tables }))).frequencyHz[0]).toBe(FREQUENCY);
    const bands = { ctype: 'IF', n: 2, crval: 1 };
    expect(problemOf(() => blockOf({ tables, axes: [...usual, bands] })).code).toBe('bad-frequency-table');
  });
});
