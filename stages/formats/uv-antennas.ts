/** Antenna table (AN) and frequency table (FQ) of uv data. Names of columns and keywords: common practice.
 *  Station positions are ARRAYX/Y/Z + STABXYZ, metres; a table with XYZHAND = 'LEFT' counts y to the west and is turned
 *  round. The station number NOSTA is what baseline codes refer to, not the row. */

import type { ByteSource } from '../bytes.ts';
import { calendarDate, julianDate, mjdOfJulianDate, SIDEREAL_DEGREES_PER_DAY } from '../numerics/time.ts';
import { InputProblem } from '../problem.ts';
import type { Hdu } from './fits/hdu.ts';
import { type Header, headerValue } from './fits/header.ts';
import { readTable, type Table } from './fits/table.ts';
import { uvProblem } from './uv-problem.ts';

export interface UvAntenna {
  readonly number: number;
  readonly name: string;
  readonly xyz: readonly [number, number, number];
}

export interface AntennaTable {
  /** Number of the subarray, from 1 (EXTVER). */
  readonly subarray: number;
  readonly place: string;
  readonly arrayName: string;
  readonly antennas: readonly UvAntenna[];
  readonly byNumber: ReadonlyMap<number, UvAntenna>;
  /** MJD of the reference date at 0 h and sidereal time of Greenwich there; undefined when the table does not say. */
  readonly referenceMjd: number | undefined;
  readonly gst0Degrees: number | undefined;
  readonly degreesPerDay: number;
  /** Time of the data less UTC, seconds: not 0 when the file counts in atomic time. */
  readonly lessUtcSeconds: number;
}

export interface FrequencySetup {
  readonly number: number;
  /** Of each band: offset from the reference frequency, width of a channel (signed by the sideband), total width. */
  readonly offsetHz: readonly number[];
  readonly channelHz: readonly number[];
  readonly totalHz: readonly number[];
}

/** All antenna tables of the file, by subarray.
 *  @throws InputProblem when there is none, or a number or name occurs twice, or a position is not finite. */
export function readAntennaTables(source: ByteSource, hdus: readonly Hdu[]): AntennaTable[] {
  const tables: AntennaTable[] = [];
  for (const hdu of hdus) {
    if (hdu.kind !== 'table' || !hdu.extname.endsWith('AN')) continue;
    const table = readTable(source, hdu);
    if (table.has('ANNAME') && table.has('STABXYZ') && table.has('NOSTA')) {
      tables.push(antennaTable(hdu, table, tables.length + 1));
    }
  }
  if (tables.length > 0) return oneOfEach(tables);
  throw new InputProblem({
    code: 'no-antenna-table',
    place: source.name,
    expected:
      'an antenna table: a binary table whose EXTNAME ends in AN, with columns ANNAME, STABXYZ and NOSTA',
    found: `the extensions ${
      hdus
        .slice(1)
        .map((hdu) => hdu.extname || 'without name')
        .join(', ') || '(none)'
    }`,
    advice: 'Write the file with its antenna table: without it baselines have no stations.',
  });
}

/** @throws InputProblem when two tables are of one subarray: rows would not tell which they mean */
function oneOfEach(tables: AntennaTable[]): AntennaTable[] {
  const seen = new Map<number, AntennaTable>();
  for (const table of tables) {
    const before = seen.get(table.subarray);
    if (before !== undefined) {
      throw badTable(
        table,
        'an EXTVER of its own, the number of the subarray',
        `${table.subarray}, as in ${before.place}`,
      );
    }
    seen.set(table.subarray, table);
  }
  return tables;
}

function antennaTable(hdu: Hdu, table: Table, ordinal: number): AntennaTable {
  const { header } = hdu;
  const rdate = headerValue(header, 'RDATE');
  const version = numberOf(header, 'EXTVER');
  const antennas = readAntennas(hdu, table);
  return {
    subarray: version !== undefined && version >= 1 ? version : ordinal,
    place: hdu.place,
    arrayName: textOf(header, 'ARRNAM'),
    antennas,
    byNumber: new Map(antennas.map((each) => [each.number, each])),
    referenceMjd: typeof rdate === 'string' && rdate.trim() !== '' ? mjdOfDate(rdate, hdu.place) : undefined,
    gst0Degrees: numberOf(header, 'GSTIA0'),
    degreesPerDay: usualUnlessPositive(numberOf(header, 'DEGPDY')),
    lessUtcSeconds: lessUtc(hdu),
  };
}

function usualUnlessPositive(rate: number | undefined): number {
  return rate !== undefined && rate > 0 ? rate : SIDEREAL_DEGREES_PER_DAY;
}

/** TIMSYS names the time scale; with atomic time IATUTC, or else DATUTC, is its lead over UTC. */
function lessUtc(hdu: Hdu): number {
  const { header } = hdu;
  const system = textOf(header, 'TIMSYS').toUpperCase() || textOf(header, 'TIMESYS').toUpperCase();
  if (!(system.startsWith('IAT') || system.startsWith('TAI'))) return 0;
  const lead = numberOf(header, 'IATUTC') ?? numberOf(header, 'DATUTC');
  if (lead !== undefined) return lead;
  throw badTable(hdu, `IATUTC, the lead over UTC in seconds, with TIMSYS ${system}`, 'none');
}

function readAntennas(hdu: Hdu, table: Table): UvAntenna[] {
  const names = table.column('ANNAME').texts();
  const numbers = table.column('NOSTA').numbers();
  const xyz = table.column('STABXYZ').numbers();
  if (xyz.length !== 3 * table.rows || numbers.length !== table.rows) {
    throw badTable(hdu, 'three numbers STABXYZ and one number NOSTA in each row', 'other counts');
  }
  const origin = ['ARRAYX', 'ARRAYY', 'ARRAYZ'].map((key) => numberOf(hdu.header, key) ?? 0);
  const handed = textOf(hdu.header, 'XYZHAND').toUpperCase() === 'LEFT' ? -1 : 1;
  const antennas = names.map((text, row): UvAntenna => {
    const number = numbers[row];
    const [x, y, z] = origin.map((start, axis) => start + xyz[3 * row + axis]);
    if (!(Number.isFinite(x) && Number.isFinite(y) && Number.isFinite(z))) {
      throw badTable(hdu, `a finite position in row ${row + 1}`, `${x}, ${y}, ${z}`);
    }
    if (!(Number.isInteger(number) && number >= 1)) {
      throw badTable(hdu, `a whole number NOSTA of 1 or more in row ${row + 1}`, `${number}`);
    }
    return { number, name: text.trim() || `station ${number}`, xyz: [x, handed * y, z] };
  });
  requireUnique(
    hdu,
    'NOSTA',
    antennas.map((each) => `${each.number}`),
  );
  requireUnique(
    hdu,
    'ANNAME',
    antennas.map((each) => each.name),
  );
  return antennas.sort((a, b) => a.number - b.number);
}

function requireUnique(hdu: Hdu, column: string, values: readonly string[]): void {
  const seen = new Set<string>();
  for (const value of values) {
    if (seen.has(value)) throw badTable(hdu, `every ${column} once`, `${value} twice`);
    seen.add(value);
  }
}

function badTable(hdu: { readonly place: string }, expected: string, found: string): InputProblem {
  return new InputProblem({
    code: 'bad-antenna-table',
    place: hdu.place,
    expected,
    found,
    advice: 'Correct the antenna table with the program that wrote the file.',
  });
}

const ISO_DATE = /^(\d{4})-(\d{1,2})-(\d{1,2})(?:T.*)?$/;
/** Before 1999 FITS dates had two digits for the year (FITS Standard 4.0, section 9.1.1). */
const OLD_DATE = /^(\d{1,2})\/(\d{1,2})\/(\d{2})$/;

/** MJD at 0 h of a FITS date; a time of day is left out. @throws InputProblem */
export function mjdOfDate(text: string, place: string): number {
  const iso = ISO_DATE.exec(text.trim());
  const old = OLD_DATE.exec(text.trim());
  const [year, month, day] = (iso ? iso.slice(1, 4) : old ? [`19${old[3]}`, old[2], old[1]] : []).map(Number);
  const jd = julianDate({ year, month, day });
  const back = calendarDate(jd);
  if (back.year === year && back.month === month && back.day === day) return mjdOfJulianDate(jd);
  throw new InputProblem({
    code: 'bad-date',
    place,
    expected: 'a date such as 2031-04-05',
    found: JSON.stringify(text),
    advice: 'Correct the keyword RDATE.',
  });
}

/** The frequency table, empty when the file has none. */
export function readFrequencySetups(source: ByteSource, hdus: readonly Hdu[]): FrequencySetup[] {
  for (const hdu of hdus) {
    if (hdu.kind !== 'table' || !hdu.extname.endsWith('FQ')) continue;
    const table = readTable(source, hdu);
    if (table.has('IF FREQ')) return setupsOf(table);
  }
  return [];
}

function setupsOf(table: Table): FrequencySetup[] {
  const offsets = table.column('IF FREQ');
  const bands = offsets.repeat;
  const values = offsets.numbers();
  const numbers = optionalColumn(table, 'FRQSEL', 1);
  const widths = optionalColumn(table, 'CH WIDTH', bands);
  const totals = optionalColumn(table, 'TOTAL BANDWIDTH', bands);
  const sidebands = optionalColumn(table, 'SIDEBAND', bands);
  return Array.from({ length: table.rows }, (_, row) => {
    const places = Array.from({ length: bands }, (_, band) => row * bands + band);
    return {
      number: numbers?.[row] ?? row + 1,
      offsetHz: places.map((at) => values[at]),
      channelHz: places.map((at) => signedWidth(widths?.[at] ?? 0, sidebands?.[at] ?? 1)),
      totalHz: places.map((at) => totals?.[at] ?? 0),
    };
  });
}

/** Frequency falls in a lower sideband, whether the table says so by SIDEBAND, by a negative width or by both. */
function signedWidth(width: number, sideband: number): number {
  return sideband < 0 ? -Math.abs(width) : width;
}

/** @throws InputProblem when a row holds another number of values: they would be taken for those of other bands */
function optionalColumn(table: Table, name: string, repeat: number): Float64Array | undefined {
  if (!table.has(name)) return undefined;
  const column = table.column(name);
  if (column.repeat === repeat) return column.numbers();
  throw uvProblem(
    'bad-frequency-table',
    `${table.place}, column ${name}`,
    `${repeat} values in a row, as many as ${repeat === 1 ? 'setups' : 'IF FREQ has'}`,
    `TFORM ${column.form}`,
  );
}

export function numberOf(header: Header, keyword: string): number | undefined {
  const value = headerValue(header, keyword);
  return typeof value === 'number' && Number.isFinite(value) ? value : undefined;
}

export function textOf(header: Header, keyword: string): string {
  const value = headerValue(header, keyword);
  return typeof value === 'string' ? value.trim() : '';
}
