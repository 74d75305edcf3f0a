/** Visibilities in a table of text (format `csv`, RFC 4180): the first line names the columns, the recipe says which
 *  column holds what in which unit. Fields are separated by commas, semicolons or tabs, whichever the first line has;
 *  lines that begin with # are left out. */

import { CsvError, parse } from 'csv-parse/sync';
import { type ByteSource, readAll } from '../bytes.ts';
import { cos, sin } from '../numerics/elementary.ts';
import { InputProblem } from '../problem.ts';
import { convert, dimensionOf } from '../units.ts';

const LIGHT_SPEED = 299792458;
/** JD of MJD 0. */
const MJD_ZERO = 2400000.5;

export const ROLES = [
  'station1',
  'station2',
  'time',
  'u',
  'v',
  're',
  'im',
  'amplitude',
  'phase',
  'sigma',
  'weight',
  'integration',
  'flag',
] as const;

export type Role = (typeof ROLES)[number];

export interface ColumnOf {
  readonly column: string;
  readonly unit: string | undefined;
}

export interface TableRequest {
  readonly columns: Readonly<Partial<Record<Role, ColumnOf>>>;
  /** MJD from which times in a unit of time count. */
  readonly timeOrigin: number;
  /** Turns u and v in metres or seconds into wavelengths. */
  readonly frequencyHz: number;
}

export interface VisibilityTable {
  readonly count: number;
  readonly station1: readonly string[];
  readonly station2: readonly string[];
  readonly timeMjd: Float64Array;
  /** 0 without a column `integration`. */
  readonly integrationSeconds: Float64Array;
  /** Wavelengths, as the table counts them. */
  readonly u: Float64Array;
  readonly v: Float64Array;
  /** Jy. Empty cells and `nan` are NaN. */
  readonly re: Float64Array;
  readonly im: Float64Array;
  /** 1/Jy²; negative for a negative sigma, infinite for a sigma of 0. */
  readonly weight: Float64Array;
  readonly flagged: Uint8Array;
  /** Whether the last line ends as lines do; if not, a number at its end may have lost digits. */
  readonly isEnded: boolean;
}

interface Rows {
  readonly names: readonly string[];
  readonly cells: readonly (readonly string[])[];
  /** Line of each row, from 1. */
  readonly lines: readonly number[];
  readonly place: string;
  readonly isEnded: boolean;
}

/** Reads all rows. @throws InputProblem with line and column. */
export function readVisibilityTable(source: ByteSource, request: TableRequest): VisibilityTable {
  requireRoles(request.columns);
  const rows = readRows(source);
  const has = (role: Role) => request.columns[role] !== undefined;
  const scaled = (role: Role, factorOf: (unit: string | undefined) => number) => {
    const choice = request.columns[role] as ColumnOf;
    const factor = inPlace(`parameter columns.${role}`, () => factorOf(choice.unit));
    return numbers(rows, choice, role).map((value) => value * factor);
  };
  const to = (unit: string) => (from: string | undefined) =>
    from === undefined ? 1 : convert(1, from, unit);
  const wavelengths = (unit: string | undefined) => wavelengthFactor(unit, request.frequencyHz);
  const amplitude = has('amplitude') ? scaled('amplitude', to('Jy')) : undefined;
  const phase = has('phase') ? scaled('phase', (unit) => to('rad')(unit ?? 'deg')) : undefined;
  return {
    count: rows.cells.length,
    station1: names(rows, request.columns.station1 as ColumnOf, 'station1'),
    station2: names(rows, request.columns.station2 as ColumnOf, 'station2'),
    timeMjd: times(rows, request),
    integrationSeconds: has('integration')
      ? scaled('integration', to('s'))
      : new Float64Array(rows.cells.length),
    u: scaled('u', wavelengths),
    v: scaled('v', wavelengths),
    re: amplitude?.map((a, k) => a * cos(phase?.[k] ?? 0)) ?? scaled('re', to('Jy')),
    im: amplitude?.map((a, k) => a * sin(phase?.[k] ?? 0)) ?? scaled('im', to('Jy')),
    weight: has('weight')
      ? scaled('weight', to('Jy**-2'))
      : scaled('sigma', to('Jy')).map((sigma) => weightOfSigma(sigma)),
    flagged: has('flag') ? flags(rows, request.columns.flag as ColumnOf) : new Uint8Array(rows.cells.length),
    isEnded: rows.isEnded,
  };
}

/** 1/sigma²; negative when sigma is, so that such a row counts as flagged. */
export function weightOfSigma(sigma: number): number {
  return (sigma < 0 ? -1 : 1) / (sigma * sigma);
}

function requireRoles(columns: TableRequest['columns']): void {
  const has = (role: Role) => columns[role] !== undefined;
  const lacking = (['station1', 'station2', 'time', 'u', 'v'] as const).filter((role) => !has(role));
  const value = (has('re') && has('im')) !== (has('amplitude') && has('phase'));
  const noise = has('sigma') !== has('weight');
  if (lacking.length === 0 && value && noise) return;
  throw new InputProblem({
    code: 'columns-missing',
    place: 'parameter columns',
    expected: 'station1, station2, time, u, v; re and im, or amplitude and phase; sigma or weight',
    found: Object.keys(columns).join(', ') || 'nothing',
    advice: 'Name the columns, each thing once.',
  });
}

function readRows(source: ByteSource): Rows {
  const text = decode(source);
  const firstLine = /^(?:\s*(?:#.*)?\r?\n)*([^\r\n]*)/.exec(text)?.[1] ?? '';
  const delimiter = ['\t', ';'].find((each) => firstLine.includes(each)) ?? ',';
  const records = parseText(source, text, delimiter);
  const [header, ...rest] = records;
  if (header === undefined || rest.length === 0) {
    throw new InputProblem({
      code: 'empty-table',
      place: source.name,
      expected: 'a line of column names and at least one row',
      found: header === undefined ? 'nothing' : 'column names only',
      advice: 'Give a table with rows.',
    });
  }
  return {
    names: header.record,
    cells: rest.map((each) => each.record),
    lines: rest.map((each) => each.info.lines),
    place: source.name,
    isEnded: /[\r\n]$/.test(text),
  };
}

function decode(source: ByteSource): string {
  try {
    return new TextDecoder('utf-8', { fatal: true }).decode(readAll(source));
  } catch (cause) {
    if (cause instanceof InputProblem) throw cause;
    throw new InputProblem(
      {
        code: 'not-text',
        place: source.name,
        expected: 'a table of text in UTF-8',
        found: 'bytes that are no UTF-8',
        advice: 'Save the table as UTF-8.',
      },
      { cause },
    );
  }
}

interface ParsedRecord {
  readonly record: string[];
  readonly info: { readonly lines: number };
}

function parseText(source: ByteSource, text: string, delimiter: string): ParsedRecord[] {
  try {
    return parse(text, {
      delimiter,
      info: true,
      trim: true,
      skip_empty_lines: true,
      comment: '#',
      comment_no_infix: true,
    }) as unknown as ParsedRecord[];
  } catch (cause) {
    if (!(cause instanceof CsvError)) throw cause;
    throw new InputProblem(
      {
        code: 'bad-table',
        place: `${source.name}, line ${String(cause.lines ?? 1)}`,
        expected: 'rows with as many fields as there are column names (RFC 4180)',
        found: cause.message,
        advice: 'Correct the table at that line.',
      },
      { cause },
    );
  }
}

function columnAt(rows: Rows, { column }: ColumnOf, role: Role): number {
  const at = rows.names.indexOf(column);
  if (at >= 0 && rows.names.indexOf(column, at + 1) < 0) return at;
  throw new InputProblem({
    code: 'no-such-column',
    place: `parameter columns.${role}`,
    expected: `one of the columns ${rows.names.join(', ')} of ${rows.place}, named once`,
    found: JSON.stringify(column),
    advice: 'Correct the name of the column.',
  });
}

const NUMBER = /^[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?$/;
const NOTHING = /^(?:|nan|na|null)$/i;
const INFINITE = /^([+-]?)inf(?:inity)?$/i;

function numbers(rows: Rows, choice: ColumnOf, role: Role): Float64Array {
  const at = columnAt(rows, choice, role);
  const values = new Float64Array(rows.cells.length);
  for (const [k, cells] of rows.cells.entries()) {
    const text = cells[at];
    const infinite = NUMBER.test(text) ? null : INFINITE.exec(text);
    if (NUMBER.test(text)) values[k] = Number(text);
    else if (infinite !== null) values[k] = infinite[1] === '-' ? -Infinity : Infinity;
    else if (NOTHING.test(text)) values[k] = Number.NaN;
    else throw badCell(rows, k, choice, 'a number, nan or nothing', text);
  }
  return values;
}

function names(rows: Rows, choice: ColumnOf, role: Role): string[] {
  const at = columnAt(rows, choice, role);
  return rows.cells.map((cells, k) => {
    if (cells[at] === '') throw badCell(rows, k, choice, 'the name of a station', '');
    return cells[at];
  });
}

function flags(rows: Rows, choice: ColumnOf): Uint8Array {
  const at = columnAt(rows, choice, 'flag');
  return Uint8Array.from(rows.cells, (cells, k) => {
    const text = cells[at].toLowerCase();
    if (['1', 'true', 't', 'yes'].includes(text)) return 1;
    if (['0', 'false', 'f', 'no', ''].includes(text)) return 0;
    throw badCell(rows, k, choice, 'true or false', text);
  });
}

function badCell(rows: Rows, k: number, { column }: ColumnOf, expected: string, text: string): InputProblem {
  return new InputProblem({
    code: 'bad-cell',
    place: `${rows.place}, line ${rows.lines[k]}, column ${column}`,
    expected,
    found: JSON.stringify(text),
    advice: 'Correct the cell.',
  });
}

function times(rows: Rows, { columns, timeOrigin }: TableRequest): Float64Array {
  const choice = columns.time as ColumnOf;
  const values = numbers(rows, choice, 'time');
  const unit = choice.unit ?? 'MJD';
  if (unit === 'MJD') return values;
  if (unit === 'JD') return values.map((jd) => jd - MJD_ZERO);
  const days = inPlace('parameter columns.time', () => convert(1, unit, 'd'));
  return values.map((value) => timeOrigin + value * days);
}

const LAMBDAS: Readonly<Record<string, number>> = { lambda: 1, klambda: 1e3, Mlambda: 1e6, Glambda: 1e9 };

/** From a unit of u and v to wavelengths: wavelengths themselves, a length, or the time that light takes. */
function wavelengthFactor(unit: string | undefined, frequencyHz: number): number {
  const known = LAMBDAS[unit ?? 'lambda'];
  if (known !== undefined) return known;
  const from = unit as string;
  if (dimensionOf(from) === dimensionOf('s')) return convert(1, from, 's') * frequencyHz;
  return (convert(1, from, 'm') * frequencyHz) / LIGHT_SPEED;
}

/** Runs `work`; a problem with a unit is told with the parameter's name. */
function inPlace<T>(place: string, work: () => T): T {
  try {
    return work();
  } catch (cause) {
    if (!(cause instanceof InputProblem)) throw cause;
    const { code, expected, found, advice } = cause;
    throw new InputProblem({ code, place, expected, found, advice }, { cause });
  }
}
