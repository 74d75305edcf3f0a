/** Texts in a picture in which a plate number may stand: PNG's text chunks, also the compressed ones, and whatever
 *  stands as text in the bytes of any file (SVG metadata, XMP in other formats). */

import { gunzipSync, inflateSync } from 'node:zlib';

// PNG (W3C Recommendation, third edition), section 5.2: signature; 11.3.3: textual chunks.
const SIGNATURE = Buffer.from([0x89, 0x50, 0x4e, 0x47, 0x0d, 0x0a, 0x1a, 0x0a]);
/** No metadata is longer; a chunk that claims to be is not unpacked. */
const LONGEST = 1 << 22;

/** Texts in the order in which they should be searched. Bytes are read as Latin-1, so ASCII is found anywhere. */
export function* embeddedTexts(bytes: Buffer): Generator<string> {
  if (bytes.subarray(0, 8).equals(SIGNATURE)) yield* pngTexts(bytes);
  // A packed SVG. A failure to unpack means only that there is no text to be had this way.
  if (bytes[0] === 0x1f && bytes[1] === 0x8b) {
    const unpacked = unpack(() => gunzipSync(bytes, { maxOutputLength: LONGEST * 16 }));
    if (unpacked !== null) yield unpacked;
  }
  yield bytes.toString('latin1');
}

/** The texts of chunks tEXt, zTXt and iTXt, as far as the file goes. */
function* pngTexts(bytes: Buffer): Generator<string> {
  for (let at = 8; at + 12 <= bytes.length; ) {
    const length = bytes.readUInt32BE(at);
    const type = bytes.toString('latin1', at + 4, at + 8);
    const data = bytes.subarray(at + 8, at + 8 + length);
    const text = data.length === length ? textOfChunk(type, data) : null;
    if (text !== null) yield text;
    at += 12 + length;
  }
}

function textOfChunk(type: string, data: Buffer): string | null {
  const keyword = data.indexOf(0);
  if (keyword < 0) return null;
  if (type === 'tEXt') return data.toString('latin1', keyword + 1);
  // keyword 0, method, data
  if (type === 'zTXt') return inflate(data.subarray(keyword + 2));
  if (type !== 'iTXt') return null;
  // keyword 0, flag, method, language 0, translated keyword 0, text
  const language = data.indexOf(0, keyword + 3);
  const translated = data.indexOf(0, language + 1);
  if (language < 0 || translated < 0) return null;
  const text = data.subarray(translated + 1);
  return data[keyword + 1] === 1 ? inflate(text) : text.toString('utf8');
}

function inflate(data: Buffer): string | null {
  return unpack(() => inflateSync(data, { maxOutputLength: LONGEST }));
}

function unpack(work: () => Buffer): string | null {
  try {
    return work().toString('latin1');
  } catch {
    return null;
  }
}
