/** Random groups, the layout of visibility data: every group is a few parameters and a small array.
 *  Source: FITS Standard 4.0, section 6; physical = PZEROn + PSCALn * stored, and parameters of one name are added
 *  (section 6.1.2, eqs. 6.1 and 6.2). */

import type { ByteSink, ByteSource } from '../../bytes.ts';
import { InputProblem, InternalError } from '../../problem.ts';
import type { Hdu } from './hdu.ts';
import {
  type Header,
  headerValue,
  type NewCard,
  requireInteger,
  requireNumber,
  requireText,
} from './header.ts';
import { dataScaling } from './image.ts';
import { bytesOf, decodeNumbers, encodeNumbers, unscaled } from './numbers.ts';
import { startHdu } from './writer.ts';

export interface GroupParameter {
  /** PTYPEn, trailing blanks removed. */
  readonly name: string;
  readonly scale: number;
  readonly zero: number;
}

/** An axis of the array; element k (from 1) stands at crval + (k - crpix) * cdelt. */
export interface GroupAxis {
  readonly ctype: string;
  readonly n: number;
  readonly crval: number;
  readonly crpix: number;
  readonly cdelt: number;
}

export interface GroupBlock {
  readonly count: number;
  /** Physical values of parameter i, one per group. */
  parameter(i: number): Float64Array;
  /** Physical values of the parameter of this name; those of one name are added. Undefined when there is none. */
  named(name: string): Float64Array | undefined;
  /** Physical values of the arrays, group after group, the first axis fastest. Undefined values are NaN. */
  readonly data: Float64Array;
}

export interface GroupsData {
  readonly count: number;
  readonly parameters: readonly GroupParameter[];
  /** From NAXIS2 on (NAXIS1 = 0 is the mark of random groups). */
  readonly axes: readonly GroupAxis[];
  /** Values in the array of one group. */
  readonly length: number;
  /** Groups from `from` on, `n` or as many as there are. Reads these only. */
  block(from: number, n: number): GroupBlock;
}

const mostParameters = 999;

/** A reader of the random groups in the primary HDU. @throws InputProblem when there are none. */
export function readGroups(source: ByteSource, hdu: Hdu): GroupsData {
  const { header, shape, bitpix } = hdu;
  if (hdu.kind !== 'groups') throw noGroups(hdu, `an HDU of kind ${hdu.kind}`);
  const count = requireInteger(header, 'GCOUNT', 0, Number.MAX_SAFE_INTEGER);
  const pcount = requireInteger(header, 'PCOUNT', 0, mostParameters);
  const axes = shape.slice(1).map((n, i) => readAxis(header, i + 2, n));
  const length = axes.length === 0 ? 0 : axes.reduce((product, { n }) => product * n, 1);
  const parameters = Array.from({ length: pcount }, (_, i) => readParameter(header, i + 1));
  const stride = pcount + length;
  if (count === 0 || length === 0) throw noGroups(hdu, `${count} groups of ${length} values`);
  const scaling = dataScaling(header, bitpix);
  return {
    count,
    parameters,
    axes,
    length,
    block(from, n) {
      const groups = Math.min(n, count - from);
      if (!(from >= 0 && groups >= 0))
        throw new InternalError('readGroups', `groups ${from}, ${n} of ${count}`);
      const groupBytes = stride * bytesOf(bitpix);
      const bytes = source.read(hdu.dataOffset + from * groupBytes, groups * groupBytes);
      const stored = decodeNumbers(bytes, bitpix, unscaled, hdu.place);
      return blockOf(stored, groups, parameters, scaledData(stored, groups, pcount, length, scaling));
    },
  };
}

function blockOf(
  stored: Float64Array,
  count: number,
  parameters: readonly GroupParameter[],
  data: Float64Array,
): GroupBlock {
  const stride = stored.length / Math.max(count, 1);
  const parameter = (i: number) => {
    const known = parameters[i];
    if (known === undefined) throw new InternalError('GroupBlock', `parameter ${i} of ${parameters.length}`);
    const values = new Float64Array(count);
    for (let g = 0; g < count; g++) values[g] = known.zero + known.scale * (stored[g * stride + i] as number);
    return values;
  };
  const named = (name: string) => {
    const columns = parameters.flatMap((each, i) => (each.name === name ? [parameter(i)] : []));
    const [sum, ...more] = columns;
    for (const column of more) {
      for (let g = 0; g < count; g++) (sum as Float64Array)[g] = (sum?.[g] as number) + (column[g] as number);
    }
    return sum;
  };
  return { count, parameter, named, data };
}

function scaledData(
  stored: Float64Array,
  count: number,
  pcount: number,
  length: number,
  scaling: ReturnType<typeof dataScaling>,
): Float64Array {
  const { scale, zero } = scaling;
  const blank = scaling.blank === undefined ? Number.NaN : Number(scaling.blank);
  const data = new Float64Array(count * length);
  for (let g = 0; g < count; g++) {
    const from = g * (pcount + length) + pcount;
    for (let i = 0; i < length; i++) {
      const value = stored[from + i] as number;
      data[g * length + i] = value === blank ? Number.NaN : zero + scale * value;
    }
  }
  return data;
}

function readAxis(header: Header, n: number, length: number): GroupAxis {
  return {
    ctype: requireText(header, `CTYPE${n}`, ''),
    n: length,
    crval: requireNumber(header, `CRVAL${n}`, 0),
    crpix: requireNumber(header, `CRPIX${n}`, 0),
    cdelt: requireNumber(header, `CDELT${n}`, 1),
  };
}

function readParameter(header: Header, n: number): GroupParameter {
  const scale = requireNumber(header, `PSCAL${n}`, 1);
  if (scale === 0) {
    throw new InputProblem({
      code: 'bad-value',
      place: header.place,
      expected: `PSCAL${n} other than 0`,
      found: `PSCAL${n} = ${headerValue(header, `PSCAL${n}`)}`,
      advice: 'Correct the header with the program that wrote the file.',
    });
  }
  return { name: requireText(header, `PTYPE${n}`, ''), scale, zero: requireNumber(header, `PZERO${n}`, 0) };
}

function noGroups(hdu: Hdu, found: string): InputProblem {
  return new InputProblem({
    code: 'no-groups',
    place: hdu.place,
    expected: 'random groups with data (NAXIS1 = 0, GROUPS = T, GCOUNT groups) in the first HDU',
    found,
    advice: 'Give visibility data as FITS random groups, or declare the format that the file has.',
  });
}

export interface NewGroups {
  readonly parameters: readonly GroupParameter[];
  readonly axes: readonly GroupAxis[];
  readonly count: number;
  /** Pieces in order, together `count` groups. `parameters[i]` holds physical values, `count` of them; `data` the
   *  arrays, group after group. */
  readonly blocks: Iterable<{
    readonly count: number;
    readonly parameters: readonly ArrayLike<number>[];
    readonly data: ArrayLike<number>;
  }>;
  readonly cards?: readonly NewCard[];
}

/** Writes a primary HDU of random groups in float32; parameters are stored as (physical - zero) / scale.
 *  @throws InternalError when the pieces do not fit the declared sizes. */
export function appendGroupsHdu(sink: ByteSink, groups: NewGroups): void {
  const { parameters, axes, count } = groups;
  const length = axes.reduce((product, { n }) => product * n, 1);
  const stride = parameters.length + length;
  const hdu = startHdu(sink, groupsCards(groups), 4 * count * stride);
  for (const block of groups.blocks) {
    const stored = new Float32Array(block.count * stride);
    if (block.parameters.length !== parameters.length || block.data.length !== block.count * length) {
      throw new InternalError(
        'appendGroupsHdu',
        `a block of ${block.count} groups has other sizes than declared`,
      );
    }
    for (const [i, { scale, zero }] of parameters.entries()) {
      const values = block.parameters[i] as ArrayLike<number>;
      for (let g = 0; g < block.count; g++) stored[g * stride + i] = ((values[g] as number) - zero) / scale;
    }
    for (let g = 0; g < block.count; g++) {
      const at = g * stride + parameters.length;
      for (let i = 0; i < length; i++) stored[at + i] = block.data[g * length + i] as number;
    }
    hdu.write(encodeNumbers(stored, -32));
  }
  hdu.end();
}

function groupsCards({ parameters, axes, count, cards = [] }: NewGroups): NewCard[] {
  const mandatory: NewCard[] = [
    ['SIMPLE', true],
    ['BITPIX', -32],
    ['NAXIS', axes.length + 1],
    ['NAXIS1', 0],
    ...axes.map(({ n }, i): NewCard => [`NAXIS${i + 2}`, n]),
    ['EXTEND', true],
    ['GROUPS', true],
    ['PCOUNT', parameters.length],
    ['GCOUNT', count],
  ];
  const axisCards = axes.flatMap(({ ctype, crval, crpix, cdelt }, i): NewCard[] => [
    [`CTYPE${i + 2}`, ctype],
    [`CRVAL${i + 2}`, crval],
    [`CRPIX${i + 2}`, crpix],
    [`CDELT${i + 2}`, cdelt],
  ]);
  const parameterCards = parameters.flatMap(({ name, scale, zero }, i): NewCard[] => [
    [`PTYPE${i + 1}`, name],
    [`PSCAL${i + 1}`, scale],
    [`PZERO${i + 1}`, zero],
  ]);
  return [...mandatory, ...axisCards, ...parameterCards, ...cards];
}
