/** Text chunks of PNG files: `tEXt` (Latin-1) where the text allows it, else `iTXt` (UTF-8).
 *  W3C, Portable Network Graphics, third edition, sections 11.3.3.2 to 11.3.3.4. */

import { pngChunk } from '../../stages/formats/drawing/png.ts';
import { InputProblem } from '../../stages/problem.ts';

const SIGNATURE = Uint8Array.of(0x89, 0x50, 0x4e, 0x47, 0x0d, 0x0a, 0x1a, 0x0a);
/** Signature and IHDR: 8 + 12 + 13 bytes. Text comes right behind, so that it is found without reading the picture. */
const BEFORE_TEXT = 33;

/** Returns the PNG file with one text chunk per keyword, in the order given.
 *  @param texts  keyword (1 to 79 printable Latin-1 characters) to text */
export function addPngText(png: Uint8Array, texts: Readonly<Record<string, string>>): Uint8Array {
  requirePng(png);
  const chunks = Object.entries(texts).map(([keyword, text]) => textChunk(keyword, text));
  return Buffer.concat([png.subarray(0, BEFORE_TEXT), ...chunks, png.subarray(BEFORE_TEXT)]);
}

/** Returns all uncompressed text of a PNG file by keyword. @throws InputProblem when it is no PNG file or cut short. */
export function readPngText(png: Uint8Array): Record<string, string> {
  requirePng(png);
  const texts: Record<string, string> = {};
  const view = new DataView(png.buffer, png.byteOffset, png.length);
  for (let at = 8; at < png.length; ) {
    if (!(at + 12 <= png.length)) throw cutShort(at, png.length);
    const length = view.getUint32(at);
    if (!(at + 12 + length <= png.length)) throw cutShort(at, png.length);
    const type = Buffer.from(png.subarray(at + 4, at + 8)).toString('latin1');
    if (type === 'IEND') break;
    const data = Buffer.from(png.subarray(at + 8, at + 8 + length));
    if (type === 'tEXt' || type === 'iTXt') Object.assign(texts, parseText(type, data));
    at += 12 + length;
  }
  return texts;
}

function textChunk(keyword: string, text: string): Uint8Array {
  const key = Buffer.from(`${keyword}\0`, 'latin1');
  if (isLatin1(text)) return pngChunk('tEXt', Buffer.concat([key, Buffer.from(text, 'latin1')]));
  // Compression flag and method, empty language tag, empty translated keyword.
  return pngChunk('iTXt', Buffer.concat([key, Buffer.from([0, 0, 0, 0]), Buffer.from(text, 'utf8')]));
}

/** Latin-1 without control characters; line feeds may stand. */
function isLatin1(text: string): boolean {
  return /^[\n\u0020-\u007e\u00a1-\u00ff]*$/.test(text);
}

function parseText(type: string, data: Buffer): Record<string, string> {
  const end = data.indexOf(0);
  if (end < 0) return {};
  const keyword = data.subarray(0, end).toString('latin1');
  if (type === 'tEXt') return { [keyword]: data.subarray(end + 1).toString('latin1') };
  if (data[end + 1] !== 0) return {};
  const language = data.indexOf(0, end + 3);
  const translated = data.indexOf(0, language + 1);
  return language < 0 || translated < 0 ? {} : { [keyword]: data.subarray(translated + 1).toString('utf8') };
}

function requirePng(png: Uint8Array): void {
  if (png.length >= BEFORE_TEXT && SIGNATURE.every((byte, i) => png[i] === byte)) return;
  throw new InputProblem({
    code: 'not-png',
    place: 'picture, byte 0',
    expected: 'the signature of a PNG file',
    found: `${Buffer.from(png.subarray(0, 8)).toString('hex') || 'nothing'}`,
    advice: 'Give a PNG file.',
  });
}

function cutShort(at: number, size: number): InputProblem {
  return new InputProblem({
    code: 'truncated',
    place: `picture, byte ${at}`,
    expected: 'a whole chunk',
    found: `the end of the file at byte ${size}`,
    advice: 'The file is cut short: fetch it again.',
  });
}
