/** Arrays of variable length: descriptors P and Q in a column, their elements in the heap behind the table.
 *  Source: FITS Standard 4.0, section 7.3.5. */

import type { ByteSource } from '../../bytes.ts';
import { InputProblem } from '../../problem.ts';
import { type Field, type Letter, widthOf } from './columns.ts';
import type { Hdu } from './hdu.ts';
import { headerValue, requireInteger } from './header.ts';

/** The bytes of every row's list. Rows may share heap bytes, but all lists together must not take more than the heap
 *  holds: a small file could otherwise claim any amount of memory.
 *  @param descriptors  the column's bytes
 *  @throws InputProblem for a descriptor that points outside the heap */
export function readLists(source: ByteSource, hdu: Hdu, field: Field, descriptors: Uint8Array): Uint8Array[] {
  const [rowBytes = 0, rows = 0] = hdu.shape;
  const table = rowBytes * rows;
  const heap =
    headerValue(hdu.header, 'THEAP') === undefined
      ? table
      : requireInteger(hdu.header, 'THEAP', table, hdu.dataBytes);
  const view = new DataView(descriptors.buffer, descriptors.byteOffset, descriptors.length);
  const room = hdu.dataBytes - heap;
  let taken = 0;
  return Array.from({ length: rows }, (_, row) => {
    const { count, offset } = readDescriptor(view, row, field);
    const length = widthOf({ letter: field.target as Letter, repeat: count });
    taken += length;
    if (!(length === 0 || (count > 0 && offset >= 0 && offset + length <= room && taken <= room))) {
      throw outside(`${hdu.place}, column ${field.name}, row ${row + 1}`, room, count, offset);
    }
    return length === 0 ? new Uint8Array(0) : source.read(hdu.dataOffset + heap + offset, length);
  });
}

function readDescriptor(view: DataView, row: number, { letter, width }: Field) {
  if (width === 0) return { count: 0, offset: 0 };
  if (letter === 'P') return { count: view.getInt32(row * 8), offset: view.getInt32(row * 8 + 4) };
  return {
    count: Number(view.getBigInt64(row * 16)),
    offset: Number(view.getBigInt64(row * 16 + 8)),
  };
}

function outside(place: string, room: number, count: number, offset: number): InputProblem {
  return new InputProblem({
    code: 'bad-size',
    place,
    expected: `a list within the heap of ${room} bytes`,
    found: `${count} elements from its byte ${offset} on`,
    advice: 'The file is damaged: fetch it again.',
  });
}
