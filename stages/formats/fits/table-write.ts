/** Writing binary tables. Source: FITS Standard 4.0, section 7.3. */

import type { ByteSink } from '../../bytes.ts';
import { InputProblem, InternalError } from '../../problem.ts';
import { isAscii } from './cards.ts';
import { type Form, numbersPerElement, numberType, parseForm, widthOf } from './columns.ts';
import type { NewCard } from './header.ts';
import { encodeNumbers } from './numbers.ts';
import { startHdu } from './writer.ts';

export interface NewColumn {
  readonly name: string;
  /** Such as `1D`, `2I`, `16A`, `5L`; no X, P or Q. */
  readonly form: string;
  readonly unit?: string;
  /** rows * repeat numbers or truths (not 0), twice as many for complex forms (re, im in turn), one string a row. */
  readonly values: ArrayLike<number> | readonly string[];
}

export interface NewTable {
  readonly extname: string;
  readonly rows: number;
  readonly columns: readonly NewColumn[];
  readonly cards?: readonly NewCard[];
}

/** Bytes of rows that are put together at a time. */
const blockBytes = 1 << 20;

/** Writes a table as an extension.
 *  @throws InputProblem for a text that is not ASCII or too long for its column
 *  @throws InternalError when a column has the wrong length or a value that its form cannot hold */
export function appendTableHdu(sink: ByteSink, table: NewTable): void {
  const forms = table.columns.map(({ form }) => requireForm(form));
  const widths = forms.map(widthOf);
  const rowBytes = widths.reduce((sum, width) => sum + width, 0);
  const encoded = table.columns.map((column, i) => encodeColumn(column, forms[i] as Form, table));
  const hdu = startHdu(sink, tableCards(table, rowBytes), rowBytes * table.rows);
  const rowsAtOnce = Math.max(1, Math.floor(blockBytes / Math.max(rowBytes, 1)));
  for (let row = 0; row < table.rows; row += rowsAtOnce) {
    const n = Math.min(rowsAtOnce, table.rows - row);
    hdu.write(joinRows(encoded, widths, rowBytes, row, n));
  }
  hdu.end();
}

function requireForm(form: string): Form {
  const parsed = parseForm(form);
  if (parsed === undefined || 'XPQ'.includes(parsed.letter)) throw new InternalError('appendTableHdu', form);
  return parsed;
}

function tableCards({ extname, rows, columns, cards = [] }: NewTable, rowBytes: number): NewCard[] {
  const fields = columns.flatMap(({ name, form, unit }, i): NewCard[] => [
    [`TTYPE${i + 1}`, name],
    [`TFORM${i + 1}`, form],
    ...(unit === undefined ? [] : [[`TUNIT${i + 1}`, unit] as const]),
  ]);
  return [
    ['XTENSION', 'BINTABLE'],
    ['BITPIX', 8],
    ['NAXIS', 2],
    ['NAXIS1', rowBytes],
    ['NAXIS2', rows],
    ['PCOUNT', 0],
    ['GCOUNT', 1],
    ['TFIELDS', columns.length],
    ...fields,
    ['EXTNAME', extname],
    ...cards,
  ];
}

function joinRows(
  columns: readonly Uint8Array[],
  widths: readonly number[],
  rowBytes: number,
  from: number,
  n: number,
): Uint8Array {
  const rows = new Uint8Array(n * rowBytes);
  let offset = 0;
  for (const [i, column] of columns.entries()) {
    const width = widths[i] as number;
    for (let row = 0; row < n; row++) {
      const at = (from + row) * width;
      rows.set(column.subarray(at, at + width), row * rowBytes + offset);
    }
    offset += width;
  }
  return rows;
}

function encodeColumn({ name, values }: NewColumn, form: Form, { rows, extname }: NewTable): Uint8Array {
  const { letter, repeat } = form;
  const expected = letter === 'A' ? rows : rows * repeat * numbersPerElement(letter);
  if (values.length !== expected) {
    throw new InternalError('appendTableHdu', `${name} has ${values.length} values, not ${expected}`);
  }
  if (letter === 'A')
    return encodeTexts(values as readonly string[], repeat, `table ${extname}, column ${name}`);
  const numbers = values as ArrayLike<number>;
  if (letter === 'L') return Uint8Array.from(numbers, (value) => (value === 0 ? 0x46 : 0x54));
  return encodeNumbers(numbers, numberType(letter) as -64);
}

function encodeTexts(texts: readonly string[], width: number, place: string): Uint8Array {
  const bytes = new Uint8Array(texts.length * width).fill(0x20);
  for (const [row, text] of texts.entries()) {
    if (!(text.length <= width && isAscii(text))) {
      throw new InputProblem({
        code: 'not-ascii',
        place: `${place}, row ${row + 1}`,
        expected: `at most ${width} printable ASCII characters, as a FITS table holds them`,
        found: JSON.stringify(text),
        advice: 'Give the thing a shorter or plainer name.',
      });
    }
    for (let i = 0; i < text.length; i++) bytes[row * width + i] = text.charCodeAt(i);
  }
  return bytes;
}
