/** FITS files built byte by byte for tests, with nothing of stages/: cards of 80 characters, big-endian numbers, blocks of 2880
 *  bytes (FITS Standard 4.0, sections 3 to 7). What a reader must find is what was put in here. */

export type RawCard = readonly [keyword: string, value: string | number | boolean];
export type RawBitpix = 8 | 16 | 32 | 64 | -32 | -64;

const BLOCK = 2880;

function card([keyword, value]: RawCard): string {
  const shown =
    typeof value === 'string'
      ? `'${value.padEnd(8)}'`
      : typeof value === 'boolean'
        ? (value ? 'T' : 'F').padStart(20)
        : String(value).toUpperCase().padStart(20);
  return `${keyword.padEnd(8)}= ${shown}`.padEnd(80);
}

/** One HDU: its header, its data, and what fills both up. */
export function rawHdu(cards: readonly RawCard[], data: Uint8Array = new Uint8Array(0)): Uint8Array {
  const text = `${cards.map(card).join('')}${'END'.padEnd(80)}`;
  const header = text.padEnd(Math.ceil(text.length / BLOCK) * BLOCK);
  const whole = new Uint8Array(header.length + Math.ceil(data.length / BLOCK) * BLOCK);
  for (let at = 0; at < header.length; at++) whole[at] = header.charCodeAt(at);
  whole.set(data, header.length);
  return whole;
}

export function joined(...parts: readonly Uint8Array[]): Uint8Array {
  return new Uint8Array(Buffer.concat(parts));
}

/** Big-endian numbers of one type. */
export function rawNumbers(values: readonly number[], bitpix: RawBitpix): Uint8Array {
  const width = Math.abs(bitpix) / 8;
  const view = new DataView(new ArrayBuffer(values.length * width));
  for (const [k, value] of values.entries()) {
    const at = k * width;
    if (bitpix === 8) view.setUint8(at, value);
    else if (bitpix === 16) view.setInt16(at, value);
    else if (bitpix === 32) view.setInt32(at, value);
    else if (bitpix === 64) view.setBigInt64(at, BigInt(value));
    else if (bitpix === -32) view.setFloat32(at, value);
    else view.setFloat64(at, value);
  }
  return new Uint8Array(view.buffer);
}

export interface RawParameter {
  readonly name: string;
  readonly scale?: number;
  readonly zero?: number;
}

export interface RawAxis {
  readonly ctype: string;
  readonly n: number;
  readonly crval?: number;
  readonly crpix?: number;
  readonly cdelt?: number;
}

export interface RawGroups {
  readonly bitpix: RawBitpix;
  readonly parameters: readonly RawParameter[];
  /** From NAXIS2 on. */
  readonly axes: readonly RawAxis[];
  /** Stored numbers of each group: parameters, then the array, its first axis fastest. */
  readonly groups: readonly (readonly number[])[];
  /** Such as BSCALE, and lies about GCOUNT and PCOUNT. */
  readonly cards?: readonly RawCard[];
}

/** A primary HDU of random groups (section 6). Keywords that are not given are not written. */
export function rawGroups({ bitpix, parameters, axes, groups, cards = [] }: RawGroups): Uint8Array {
  const lies = new Map(cards);
  const optional = (keyword: string, value: number | undefined): RawCard[] =>
    value === undefined ? [] : [[keyword, value]];
  const own: RawCard[] = [
    ['SIMPLE', true],
    ['BITPIX', bitpix],
    ['NAXIS', axes.length + 1],
    ['NAXIS1', 0],
    ...axes.map(({ n }, k): RawCard => [`NAXIS${k + 2}`, n]),
    ['GROUPS', true],
    ['PCOUNT', parameters.length],
    ['GCOUNT', groups.length],
    ...axes.flatMap(({ ctype, crval, crpix, cdelt }, k): RawCard[] => [
      [`CTYPE${k + 2}`, ctype],
      ...optional(`CRVAL${k + 2}`, crval),
      ...optional(`CRPIX${k + 2}`, crpix),
      ...optional(`CDELT${k + 2}`, cdelt),
    ]),
    ...parameters.flatMap(({ name, scale, zero }, k): RawCard[] => [
      [`PTYPE${k + 1}`, name],
      ...optional(`PSCAL${k + 1}`, scale),
      ...optional(`PZERO${k + 1}`, zero),
    ]),
  ];
  const truthful = own.filter(([keyword]) => !lies.has(keyword));
  const head = own.filter(([keyword]) => /^(SIMPLE|BITPIX|NAXIS\d*)$/.test(keyword));
  const rest = truthful.filter((each) => !head.includes(each));
  return rawHdu(
    [...head, ...rest, ...cards],
    rawNumbers(
      groups.flatMap((group) => [...group]),
      bitpix,
    ),
  );
}

export interface RawColumn {
  readonly name: string;
  readonly form: string;
  /** Bytes of each row. */
  readonly rows: readonly Uint8Array[];
}

/** A binary table (section 7.3). */
export function rawTable(
  extname: string,
  columns: readonly RawColumn[],
  cards: readonly RawCard[] = [],
  rows = columns[0]?.rows.length ?? 0,
): Uint8Array {
  const width = columns.reduce((sum, column) => sum + (column.rows[0]?.length ?? 0), 0);
  const data = Array.from({ length: rows }, (_, row) => columns.map((column) => column.rows[row])).flat();
  return rawHdu(
    [
      ['XTENSION', 'BINTABLE'],
      ['BITPIX', 8],
      ['NAXIS', 2],
      ['NAXIS1', width],
      ['NAXIS2', rows],
      ['PCOUNT', 0],
      ['GCOUNT', 1],
      ['TFIELDS', columns.length],
      ['EXTNAME', extname],
      ...columns.flatMap(({ name, form }, k): RawCard[] => [
        [`TTYPE${k + 1}`, name],
        [`TFORM${k + 1}`, form],
      ]),
      ...cards,
    ],
    joined(...data),
  );
}

/** Rows of a column of text, doubles, singles or integers. */
export const rawRows = {
  text: (width: number, values: readonly string[]) =>
    values.map((value) => new Uint8Array(Buffer.from(value.padEnd(width), 'latin1'))),
  numbers: (bitpix: RawBitpix, values: readonly (readonly number[])[]) =>
    values.map((row) => rawNumbers(row, bitpix)),
};
