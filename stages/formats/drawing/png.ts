/** PNG encoding of an indexed raster: 8 bits per pixel and a palette of 256 colours (W3C, Portable Network Graphics,
 *  third edition, sections 5 and 11). Compression is fflate's, plain JavaScript, so the bytes are the same everywhere;
 *  its memory level is fixed because the default takes a logarithm of the length. */

import { zlibSync } from 'fflate';
import { InternalError } from '../../problem.ts';
import type { ColourMap } from './colour.ts';

const SIGNATURE = Uint8Array.of(0x89, 0x50, 0x4e, 0x47, 0x0d, 0x0a, 0x1a, 0x0a);
const CRC_TABLE = crcTable();

/** Returns a PNG file.
 *  @param indices  length width*height, rows from the top, values 0 to 255 into the map */
export function encodePng(width: number, height: number, indices: Uint8Array, map: ColourMap): Uint8Array {
  if (indices.length !== width * height)
    throw new InternalError('encodePng', 'indices do not fill the raster');
  const header = new Uint8Array(13);
  const view = new DataView(header.buffer);
  view.setUint32(0, width);
  view.setUint32(4, height);
  header.set([8, 3, 0, 0, 0], 8); // bit depth, indexed colour, deflate, adaptive filtering, no interlace
  return concatenate([
    SIGNATURE,
    pngChunk('IHDR', header),
    pngChunk('PLTE', map.entries),
    pngChunk('IDAT', zlibSync(filterRows(width, height, indices), { level: 6, mem: 8 })),
    pngChunk('IEND', new Uint8Array(0)),
  ]);
}

/** Returns one chunk: length, type, data, CRC-32 over type and data (section 5.3). */
export function pngChunk(type: string, data: Uint8Array): Uint8Array {
  const chunk = new Uint8Array(12 + data.length);
  const view = new DataView(chunk.buffer);
  view.setUint32(0, data.length);
  for (let i = 0; i < 4; i++) chunk[4 + i] = type.charCodeAt(i);
  chunk.set(data, 8);
  view.setUint32(8 + data.length, crc32(chunk.subarray(4, 8 + data.length)));
  return chunk;
}

/** Returns the CRC-32 of PNG annex D. */
export function crc32(bytes: Uint8Array): number {
  let crc = 0xffffffff;
  for (const byte of bytes) crc = CRC_TABLE[(crc ^ byte) & 0xff] ^ (crc >>> 8);
  return (crc ^ 0xffffffff) >>> 0;
}

/** Returns a `data:` URI of a PNG file. */
export function dataUri(png: Uint8Array): string {
  return `data:image/png;base64,${Buffer.from(png.buffer, png.byteOffset, png.length).toString('base64')}`;
}

/** Every row with filter type Sub (section 9.2): the difference to the pixel before. The maps are ordered, so smooth
 *  pictures give small differences of indices; Sub gave files a fifth smaller than Up and two fifths than None. */
function filterRows(width: number, height: number, indices: Uint8Array): Uint8Array {
  const out = new Uint8Array((width + 1) * height);
  for (let row = 0; row < height; row++) {
    const to = row * (width + 1);
    out[to] = 1;
    let before = 0;
    for (let i = 0; i < width; i++) {
      const index = indices[row * width + i];
      out[to + 1 + i] = index - before;
      before = index;
    }
  }
  return out;
}

function crcTable(): Uint32Array {
  const table = new Uint32Array(256);
  for (let n = 0; n < 256; n++) {
    let c = n;
    for (let k = 0; k < 8; k++) c = c & 1 ? 0xedb88320 ^ (c >>> 1) : c >>> 1;
    table[n] = c >>> 0;
  }
  return table;
}

function concatenate(parts: readonly Uint8Array[]): Uint8Array {
  const whole = new Uint8Array(parts.reduce((sum, part) => sum + part.length, 0));
  let at = 0;
  for (const part of parts) {
    whole.set(part, at);
    at += part.length;
  }
  return whole;
}
