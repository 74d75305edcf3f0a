/** Forms of the columns of a binary table: TFORMn = repeat, letter, and for descriptors what they point to.
 *  Source: FITS Standard 4.0, sections 7.3.1 and 7.3.2, table 18. */

import { InputProblem } from '../../problem.ts';
import { bigInteger, type Header, requireNumber, requireText } from './header.ts';
import type { Bitpix, Scaling } from './numbers.ts';

export type Letter = 'L' | 'X' | 'B' | 'I' | 'J' | 'K' | 'A' | 'E' | 'D' | 'C' | 'M' | 'P' | 'Q';

/** Bytes of one element; of X, bits are packed by eight. */
const widths: Record<Exclude<Letter, 'X'>, number> = {
  L: 1,
  B: 1,
  I: 2,
  J: 4,
  K: 8,
  A: 1,
  E: 4,
  D: 8,
  C: 8,
  M: 16,
  P: 8,
  Q: 16,
};

/** Number type of the letters that hold numbers. */
const numberTypes: Partial<Record<Letter, Bitpix>> = {
  B: 8,
  I: 16,
  J: 32,
  K: 64,
  E: -32,
  D: -64,
  C: -32,
  M: -64,
};

export interface Form {
  readonly letter: Letter;
  readonly repeat: number;
  /** What a P or Q descriptor points to. */
  readonly target: Letter | undefined;
}

export interface Field extends Form {
  readonly name: string;
  /** As the header has it. */
  readonly form: string;
  readonly unit: string;
  /** Bytes within a row: where it begins and how many. */
  readonly offset: number;
  readonly width: number;
  readonly scaling: Scaling;
}

/** Parses a form such as `3D`, `16A` or `1PE(100)`; undefined when it is none. */
export function parseForm(text: string): Form | undefined {
  const match = /^(\d*)([LXBIJKAEDCMPQ])(?:([LXBIJKAEDCM])?.*)$/.exec(text.trim());
  if (match === null) return undefined;
  const letter = match[2] as Letter;
  const repeat = match[1] === '' ? 1 : Number(match[1]);
  const descriptor = letter === 'P' || letter === 'Q';
  const target = descriptor ? (match[3] as Letter | undefined) : undefined;
  if (!Number.isSafeInteger(repeat) || (descriptor && (repeat > 1 || target === undefined))) return undefined;
  return { letter, repeat, target };
}

export function widthOf({ letter, repeat }: Pick<Form, 'letter' | 'repeat'>): number {
  return letter === 'X' ? Math.ceil(repeat / 8) : repeat * widths[letter];
}

/** The number type of a column of numbers or complex numbers; undefined for all others. */
export function numberType(letter: Letter): Bitpix | undefined {
  return numberTypes[letter];
}

/** Numbers that make up one element: two for complex ones. */
export function numbersPerElement(letter: Letter): number {
  return letter === 'C' || letter === 'M' ? 2 : 1;
}

/** The fields of a row; their widths must add up to NAXIS1. @throws InputProblem */
export function readFields(header: Header, count: number, rowBytes: number, place: string): Field[] {
  const fields: Field[] = [];
  let offset = 0;
  for (let n = 1; n <= count; n++) {
    const field = readField(header, n, offset, place);
    fields.push(field);
    offset += field.width;
  }
  if (offset !== rowBytes) {
    throw new InputProblem({
      code: 'bad-size',
      place,
      expected: `rows of NAXIS1 = ${rowBytes} bytes`,
      found: `columns (TFORM1 to TFORM${count}) that take ${offset} bytes`,
      advice: 'The header contradicts itself: make the file again.',
    });
  }
  return fields;
}

function readField(header: Header, n: number, offset: number, place: string): Field {
  const form = requireText(header, `TFORM${n}`);
  const parsed = parseForm(form);
  if (parsed === undefined) {
    throw new InputProblem({
      code: 'bad-value',
      place: `${place}, column ${n}`,
      expected: `TFORM${n} of a repeat count and one of L X B I J K A E D C M P Q`,
      found: JSON.stringify(form),
      advice: 'Correct the header with the program that wrote the file.',
    });
  }
  const name = requireText(header, `TTYPE${n}`, '');
  const unit = requireText(header, `TUNIT${n}`, '');
  const scaling = readScaling(header, n, parsed, place);
  return { ...parsed, name, form, unit, offset, width: widthOf(parsed), scaling };
}

function readScaling(header: Header, n: number, { letter, target }: Form, place: string): Scaling {
  const scale = requireNumber(header, `TSCAL${n}`, 1);
  if (scale === 0) {
    throw new InputProblem({
      code: 'bad-value',
      place: `${place}, column ${n}`,
      expected: `TSCAL${n} other than 0`,
      found: `TSCAL${n} = 0`,
      advice: 'Correct the header with the program that wrote the file.',
    });
  }
  const integers = 'BIJK'.includes(target ?? letter);
  return {
    scale,
    zero: requireNumber(header, `TZERO${n}`, 0),
    blank: integers ? bigInteger(header, `TNULL${n}`) : undefined,
  };
}
