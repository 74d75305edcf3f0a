/** Synthetic uv data for tests: a point source off the centre, seen by invented stations; every quirk of real files can
 *  be switched on. The geometry is written out here from unit vectors, and does not call the code under test. */

import { memorySink } from '../../stages/bytes.ts';
import { appendGroupsHdu } from '../../stages/formats/fits/groups.ts';
import type { NewCard } from '../../stages/formats/fits/header.ts';
import { appendTableHdu } from '../../stages/formats/fits/table.ts';

export const C = 299792458;
export const FREQUENCY = 2.2e11;
export const REFERENCE_JD = 2466100.5;
export const REFERENCE_MJD = REFERENCE_JD - 2400000.5;
const GST0 = 201.3;
const RATE = 360.985647;
export const RA = 187.5;
export const DEC = 12.25;
const RADIANS = Math.PI / 180;
const UAS = RADIANS / 3600e6;

/** East 30 µas, south 15 µas, 0.8 Jy. */
export const POINT = { x: 30 * UAS, y: -15 * UAS, flux: 0.8 };

export interface TestStation {
  name: string;
  number: number;
  xyz: [number, number, number];
}

/** Invented places on the Earth; SEVEN and EIGHT stand side by side. */
export const STATIONS: TestStation[] = [
  { name: 'FOUR', number: 4, xyz: [-768700, -5988500, 2063300] },
  { name: 'ONE', number: 1, xyz: [-1828800, -5054400, 3427900] },
  { name: 'SEVEN', number: 7, xyz: [5088900, -301700, 3825000] },
  { name: 'EIGHT', number: 8, xyz: [5088900, -301640, 3825000] },
];

export interface TestRow {
  number1: number;
  number2: number;
  subarray: number;
  /** Days after REFERENCE_JD. */
  day: number;
  seconds: number;
  /** Seconds, (r1 − r2)/c. */
  u: number;
  v: number;
  w: number;
  /** hands[band][channel][stokes] = [re, im, weight]. */
  hands: [number, number, number][][][];
}

/** A source's (u,v,w) of a vector in metres, seconds of light, from unit vectors east, north and to the source at hour
 *  angle H of Greenwich: the source stands above longitude −H. */
export function project(
  xyz: readonly number[],
  day: number,
  ra = RA,
  dec = DEC,
  gst0 = GST0,
): [number, number, number] {
  const longitude = -(gst0 + RATE * day - ra) * RADIANS;
  const latitude = dec * RADIANS;
  const east = [-Math.sin(longitude), Math.cos(longitude), 0];
  const north = [
    -Math.sin(latitude) * Math.cos(longitude),
    -Math.sin(latitude) * Math.sin(longitude),
    Math.cos(latitude),
  ];
  const source = [
    Math.cos(latitude) * Math.cos(longitude),
    Math.cos(latitude) * Math.sin(longitude),
    Math.sin(latitude),
  ];
  const dot = (axis: number[]) => (xyz[0] * axis[0] + xyz[1] * axis[1] + xyz[2] * axis[2]) / C;
  return [dot(east), dot(north), dot(source)];
}

/** Of the point source, for baseline 1–2 with (u,v) = (r1 − r2)/λ: by the difference of arrival, exp(+2πi(ux + vy)). */
export function pointVisibility(u: number, v: number, frequency = FREQUENCY): [number, number] {
  const phase = 2 * Math.PI * frequency * (u * POINT.x + v * POINT.y);
  return [POINT.flux * Math.cos(phase), POINT.flux * Math.sin(phase)];
}

/** Times of records, days after the reference: scans of `records` records of `seconds`, `gap` apart. */
export function times(scans: number, records: number, seconds = 10, gap = 300): number[] {
  const list: number[] = [];
  for (let s = 0; s < scans; s++) {
    for (let r = 0; r < records; r++) list.push(0.25 + (s * (records * seconds + gap) + r * seconds) / 86400);
  }
  return list;
}

export interface RowOptions {
  stations?: TestStation[];
  days?: number[];
  seconds?: number;
  hands?: number;
  frequencies?: number[][];
  weight?: number;
  ra?: number;
  dec?: number;
}

/** All baselines at all times, noiseless, both hands alike but for nothing: change what a test needs changed. */
export function rows(options: RowOptions = {}): TestRow[] {
  const { days = times(1, 3), seconds = 10, hands = 2, weight = 1e4, frequencies = [[FREQUENCY]] } = options;
  const sorted = [...(options.stations ?? STATIONS)].sort((a, b) => a.number - b.number);
  return days.flatMap((day) =>
    sorted.flatMap((first, i) =>
      sorted.slice(i + 1).map((second): TestRow => {
        const baseline = first.xyz.map((value, axis) => value - second.xyz[axis]);
        const [u, v, w] = project(baseline, day, options.ra, options.dec);
        const cell = (frequency: number) =>
          Array.from({ length: hands }, (): [number, number, number] => [
            ...pointVisibility(u, v, frequency),
            weight,
          ]);
        return {
          number1: first.number,
          number2: second.number,
          subarray: 1,
          day,
          seconds,
          u,
          v,
          w,
          hands: frequencies.map((band) => band.map(cell)),
        };
      }),
    ),
  );
}

export interface FileOptions {
  stations?: TestStation[];
  /** 1/frequency: u, v, w on disk in wavelengths. */
  uvScale?: number;
  /** Factor on u and v that makes the file wrong. */
  uvFactor?: number;
  names?: [string, string, string];
  /** `split`: the day in PZERO, the fraction in a second DATE; `single`: one DATE. */
  dates?: 'split' | 'single';
  code?: 'short' | 'long' | 'none';
  axes?: string[];
  stokes?: { crval: number; cdelt: number };
  bands?: number[];
  channelStep?: number;
  antennas?: 'usual' | 'none' | 'without-time';
  antennaCards?: NewCard[];
  cards?: NewCard[];
  bandwidth?: number;
  /** Of every band; −1 for a lower one. */
  sideband?: number;
  extra?: { name: string; values: number[] }[];
  noIntegration?: boolean;
  ra?: number;
  dec?: number;
}

/** The bytes of a file with these rows. Samples lie in the order of `axes`. */
export function uvFile(list: TestRow[], options: FileOptions = {}): Uint8Array {
  const sink = memorySink();
  const stations = options.stations ?? STATIONS;
  const names = options.names ?? ['UU---SIN', 'VV---SIN', 'WW---SIN'];
  const scale = options.uvScale ?? 1;
  const factor = options.uvFactor ?? 1;
  const column = (name: string, value: (row: TestRow) => number, zero = 0, pscal = 1) => ({
    parameter: { name, scale: pscal, zero },
    values: list.map(value),
  });
  const columns = [
    column(names[0], (row) => factor * row.u, 0, scale),
    column(names[1], (row) => factor * row.v, 0, scale),
    column(names[2], (row) => row.w, 0, scale),
    ...baselineColumns(list, options, column),
    ...(options.dates === 'single'
      ? [column('DATE', (row) => REFERENCE_JD + row.day)]
      : [column('DATE', () => REFERENCE_JD, REFERENCE_JD), column('DATE', (row) => row.day)]),
    ...(options.noIntegration ? [] : [column('INTTIM', (row) => row.seconds)]),
    ...(options.extra ?? []).map(({ name, values }) => ({
      parameter: { name, scale: 1, zero: 0 },
      values,
    })),
  ];
  const axes = axesOf(list[0], options);
  appendGroupsHdu(sink, {
    count: list.length,
    parameters: columns.map((each) => each.parameter),
    axes,
    cards: [['OBJECT', 'INVENTED'], ['TELESCOP', 'TESTARRAY'], ...(options.cards ?? [])],
    blocks: [
      {
        count: list.length,
        parameters: columns.map((each) => each.values),
        data: list.flatMap((row) => samples(row, axes)),
      },
    ],
  });
  if (options.antennas !== 'none') antennaTable(sink, stations, options);
  if (options.bands !== undefined) frequencyTable(sink, options);
  return sink.bytes().slice();
}

function baselineColumns<T>(
  _list: TestRow[],
  { code = 'short' }: FileOptions,
  column: (name: string, value: (row: TestRow) => number) => T,
): T[] {
  if (code === 'none') {
    return [
      column('ANTENNA1', (row) => row.number1),
      column('ANTENNA2', (row) => row.number2),
      column('SUBARRAY', (row) => row.subarray),
    ];
  }
  // BASELINE: check value fits.baseline (256 a1 + a2 + (subarray − 1)/100), common practice.
  return [
    column('BASELINE', ({ number1, number2, subarray }) =>
      code === 'long' ? 2048 * number1 + number2 + 65536 : 256 * number1 + number2 + (subarray - 1) / 100,
    ),
  ];
}

function axesOf(row: TestRow, options: FileOptions) {
  const { axes = ['COMPLEX', 'STOKES', 'FREQ', 'IF', 'RA', 'DEC'], stokes = { crval: -1, cdelt: -1 } } =
    options;
  const axis = (ctype: string, n: number, crval: number, cdelt: number) => ({
    ctype,
    n,
    crval,
    cdelt,
    crpix: 1,
  });
  const known: Record<string, ReturnType<typeof axis>> = {
    COMPLEX: axis('COMPLEX', 3, 1, 1),
    STOKES: axis('STOKES', row.hands[0][0].length, stokes.crval, stokes.cdelt),
    FREQ: axis('FREQ', row.hands[0].length, FREQUENCY, options.channelStep ?? 2e9),
    IF: axis('IF', row.hands.length, 1, 1),
    RA: axis('RA', 1, options.ra ?? RA, 1),
    DEC: axis('DEC', 1, options.dec ?? DEC, 1),
  };
  return axes.map((name) => known[name] ?? axis(name, 1, 0, 1));
}

/** The samples of a row in the order of the axes, the first axis fastest. */
function samples(row: TestRow, axes: { ctype: string; n: number }[]): number[] {
  const total = axes.reduce((product, { n }) => product * n, 1);
  return Array.from({ length: total }, (_, at) => {
    const index: Record<string, number> = { COMPLEX: 0, STOKES: 0, FREQ: 0, IF: 0 };
    let rest = at;
    for (const { ctype, n } of axes) {
      index[ctype] = rest % n;
      rest = Math.floor(rest / n);
    }
    return row.hands[index.IF][index.FREQ][index.STOKES][index.COMPLEX];
  });
}

function antennaTable(sink: ReturnType<typeof memorySink>, stations: TestStation[], options: FileOptions) {
  const time: NewCard[] = [
    ['GSTIA0', GST0],
    ['DEGPDY', RATE],
    ['RDATE', '2039-11-08'],
  ];
  const cards = new Map<string, NewCard>();
  const usual = options.antennas === 'without-time' ? [] : time;
  const origin: NewCard[] = [
    ['ARRAYX', 0],
    ['ARRAYY', 0],
    ['ARRAYZ', 0],
  ];
  for (const card of [...origin, ...usual, ...(options.antennaCards ?? [])]) cards.set(card[0], card);
  appendTableHdu(sink, {
    extname: 'TEST AN',
    rows: stations.length,
    columns: [
      { name: 'ANNAME', form: '8A', values: stations.map((station) => station.name) },
      { name: 'STABXYZ', form: '3D', values: stations.flatMap((station) => station.xyz) },
      { name: 'ORBPARM', form: '0D', values: [] },
      { name: 'NOSTA', form: '1J', values: stations.map((station) => station.number) },
    ],
    cards: [...cards.values()],
  });
}

function frequencyTable(
  sink: ReturnType<typeof memorySink>,
  { bands = [], bandwidth = 2e9, sideband = 1 }: FileOptions,
) {
  const n = bands.length;
  appendTableHdu(sink, {
    extname: 'TEST FQ',
    rows: 1,
    columns: [
      { name: 'FRQSEL', form: '1J', values: [1] },
      { name: 'IF FREQ', form: `${n}D`, values: bands },
      { name: 'CH WIDTH', form: `${n}E`, values: bands.map(() => bandwidth) },
      { name: 'TOTAL BANDWIDTH', form: `${n}E`, values: bands.map(() => bandwidth) },
      { name: 'SIDEBAND', form: `${n}J`, values: bands.map(() => sideband) },
    ],
  });
}
