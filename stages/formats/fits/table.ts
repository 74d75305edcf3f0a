/** Binary tables, read column by column in blocks of rows.
 *  Source: FITS Standard 4.0, section 7.3; scaling TZERO + TSCAL * stored, TNULL is undefined (section 7.3.2). */

import type { ByteSource } from '../../bytes.ts';
import { InputProblem } from '../../problem.ts';
import { type Field, numbersPerElement, numberType, readFields } from './columns.ts';
import type { Hdu } from './hdu.ts';
import { type Header, requireInteger } from './header.ts';
import { readLists } from './heap.ts';
import { decodeNumbers } from './numbers.ts';

export { appendEmptyPrimary } from './image.ts';
export { appendTableHdu, type NewColumn, type NewTable } from './table-write.ts';

export interface Column {
  readonly name: string;
  /** TFORM as it stands. */
  readonly form: string;
  readonly repeat: number;
  readonly unit: string;
  /** Physical values, rows * repeat; undefined ones are NaN. Forms B I J K E D. */
  numbers(): Float64Array;
  /** Real and imaginary parts, rows * repeat each. Forms C M. */
  complex(): { re: Float64Array; im: Float64Array };
  /** One string per row, without trailing blanks. Form A, and P or Q to A. */
  texts(): string[];
  /** rows * repeat of 1 (true), 0 (false), 2 (undefined, so that an undefined flag counts as set). Forms L X. */
  flags(): Uint8Array;
  /** Physical values row by row, of any number. Forms P and Q to B I J K E D. */
  lists(): Float64Array[];
}

export interface Table {
  readonly rows: number;
  readonly header: Header;
  readonly names: readonly string[];
  readonly place: string;
  /** Names are compared without case. */
  has(name: string): boolean;
  /** @throws InputProblem when there is no such column. */
  column(name: string): Column;
  /** Column n, from 0, for tables whose columns share names. */
  columnAt(n: number): Column;
}

const mostFields = 999;
const blockBytes = 1 << 22;

/** A reader of a binary table. Columns are read when asked for.
 *  @throws InputProblem when the HDU is no binary table or its header contradicts itself */
export function readTable(source: ByteSource, hdu: Hdu): Table {
  if (hdu.kind !== 'table' || hdu.shape.length !== 2 || hdu.bitpix !== 8) {
    throw new InputProblem({
      code: 'no-table',
      place: hdu.place,
      expected: 'a binary table (XTENSION BINTABLE, BITPIX 8, NAXIS 2)',
      found: `an HDU of kind ${hdu.kind} with BITPIX ${hdu.bitpix} and ${hdu.shape.length} axes`,
      advice: 'Give the file that the input declares.',
    });
  }
  const [rowBytes = 0, rows = 0] = hdu.shape;
  const count = requireInteger(hdu.header, 'TFIELDS', 0, mostFields);
  const fields = readFields(hdu.header, count, rowBytes, hdu.place);
  // Rows without bytes cost the file nothing, so their number proves nothing.
  if (rowBytes === 0 && rows > source.size) throw emptyRows(hdu, rows);
  const names = fields.map(({ name }) => name);
  const byName = new Map(fields.map((field) => [field.name.toUpperCase(), field] as const).toReversed());
  return {
    rows,
    header: hdu.header,
    names,
    place: hdu.place,
    has: (name) => byName.has(name.toUpperCase()),
    column(name) {
      const field = byName.get(name.toUpperCase());
      if (field === undefined) throw noColumn(hdu.place, name, names);
      return columnOf(source, hdu, field);
    },
    columnAt(n) {
      const field = fields[n];
      if (field === undefined) throw noColumn(hdu.place, String(n + 1), names);
      return columnOf(source, hdu, field);
    },
  };
}

function columnOf(source: ByteSource, hdu: Hdu, field: Field): Column {
  const { name, form, repeat, unit, letter, target, scaling } = field;
  const place = `${hdu.place}, column ${name}`;
  const bytes = () => columnBytes(source, hdu, field);
  const only = (letters: string, what: string) => {
    if (!letters.includes(letter)) throw wrongForm(place, form, what);
  };
  const values = (letters: string, what: string) => {
    only(letters, what);
    return decodeNumbers(bytes(), numberType(letter) as -64, scaling, place);
  };
  return {
    name,
    form,
    repeat,
    unit,
    numbers: () => values('BIJKED', 'numbers (B I J K E D)'),
    complex: () => parts(values('CM', 'complex numbers (C M)')),
    texts() {
      if (target === 'A')
        return readLists(source, hdu, field, bytes()).map((list, row) => text(list, place, row));
      only('A', 'text (A)');
      return Array.from({ length: hdu.shape[1] as number }, rowTexts(bytes(), repeat, place));
    },
    flags() {
      only('LX', 'logicals (L) or bits (X)');
      return letter === 'L' ? logicals(bytes(), repeat, place) : bits(bytes(), repeat, field.width);
    },
    lists() {
      const type = target === undefined ? undefined : numberType(target);
      if (target === undefined || type === undefined || numbersPerElement(target) > 1) {
        throw wrongForm(place, form, 'lists of numbers (P or Q to B I J K E D)');
      }
      return readLists(source, hdu, field, bytes()).map((list) => decodeNumbers(list, type, scaling, place));
    },
  };
}

/** The bytes of one column, row after row. The table is read in blocks. */
function columnBytes(source: ByteSource, hdu: Hdu, { offset, width }: Field): Uint8Array {
  const [rowBytes = 0, rows = 0] = hdu.shape;
  const column = new Uint8Array(rows * width);
  if (width === 0) return column;
  const rowsAtOnce = Math.max(1, Math.floor(blockBytes / rowBytes));
  for (let row = 0; row < rows; row += rowsAtOnce) {
    const n = Math.min(rowsAtOnce, rows - row);
    const block = source.read(hdu.dataOffset + row * rowBytes, n * rowBytes);
    for (let i = 0; i < n; i++) {
      const from = i * rowBytes + offset;
      column.set(block.subarray(from, from + width), (row + i) * width);
    }
  }
  return column;
}

function parts(interleaved: Float64Array): { re: Float64Array; im: Float64Array } {
  const n = interleaved.length / 2;
  const re = new Float64Array(n);
  const im = new Float64Array(n);
  for (let i = 0; i < n; i++) {
    re[i] = interleaved[2 * i] as number;
    im[i] = interleaved[2 * i + 1] as number;
  }
  return { re, im };
}

function rowTexts(bytes: Uint8Array, width: number, place: string): (_: unknown, row: number) => string {
  return (_, row) => text(bytes.subarray(row * width, (row + 1) * width), place, row);
}

/** A NUL ends a string before its width does (section 7.3.3.1); anything but printable ASCII is refused. */
function text(bytes: Uint8Array, place: string, row: number): string {
  const end = bytes.indexOf(0);
  const used = end < 0 ? bytes : bytes.subarray(0, end);
  const odd = used.findIndex((byte) => byte < 0x20 || byte > 0x7e);
  if (odd >= 0) {
    throw new InputProblem({
      code: 'not-ascii',
      place: `${place}, row ${row + 1}, character ${odd + 1}`,
      expected: 'printable ASCII',
      found: `byte 0x${(used[odd] as number).toString(16).padStart(2, '0')}`,
      advice: 'Correct the name with the program that wrote the file.',
    });
  }
  return String.fromCharCode(...used).trimEnd();
}

function logicals(bytes: Uint8Array, repeat: number, place: string): Uint8Array {
  return bytes.map((byte, i) => {
    if (byte === 0x54) return 1;
    if (byte === 0x46) return 0;
    if (byte === 0) return 2;
    throw new InputProblem({
      code: 'bad-value',
      place: `${place}, row ${Math.floor(i / repeat) + 1}`,
      expected: 'T, F or 0 in a column of logicals',
      found: `byte 0x${byte.toString(16).padStart(2, '0')}`,
      advice: 'The file is damaged: fetch it again.',
    });
  });
}

function bits(bytes: Uint8Array, repeat: number, width: number): Uint8Array {
  const rows = width === 0 ? 0 : bytes.length / width;
  const flags = new Uint8Array(rows * repeat);
  for (let row = 0; row < rows; row++) {
    for (let bit = 0; bit < repeat; bit++) {
      const byte = bytes[row * width + (bit >> 3)] as number;
      flags[row * repeat + bit] = (byte >> (7 - (bit & 7))) & 1;
    }
  }
  return flags;
}

function wrongForm(place: string, form: string, expected: string): InputProblem {
  return new InputProblem({
    code: 'bad-column',
    place,
    expected: `a column of ${expected}`,
    found: `TFORM ${form}`,
    advice: 'Give a file whose table has the columns that its kind prescribes.',
  });
}

function noColumn(place: string, name: string, names: readonly string[]): InputProblem {
  return new InputProblem({
    code: 'missing-column',
    place,
    expected: `a column ${name}`,
    found: names.length === 0 ? 'no columns' : `columns ${names.join(', ')}`,
    advice: 'Give a file whose table has the columns that its kind prescribes.',
  });
}

function emptyRows(hdu: Hdu, rows: number): InputProblem {
  return new InputProblem({
    code: 'bad-size',
    place: hdu.place,
    expected: 'rows with bytes in them',
    found: `${rows} rows of 0 bytes`,
    advice: 'The header is damaged: fetch the file again.',
  });
}
