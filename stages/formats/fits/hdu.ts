/** The HDUs of a FITS file: what each is and where its data lie. All sizes are checked against the file before
 *  anything is allocated. Source: FITS Standard 4.0, sections 3, 4.4.1, 6 and 7. */

import type { ByteSource } from '../../bytes.ts';
import { InputProblem } from '../../problem.ts';
import { onesComplementSum } from './checksum.ts';
import { blockLength, type Header, headerValue, parseHeader, requireInteger, requireText } from './header.ts';
import { type Bitpix, bytesOf, isBitpix } from './numbers.ts';

export interface Hdu {
  /** From 0, the primary HDU. */
  readonly index: number;
  readonly header: Header;
  /** Upper case, trailing blanks removed; empty when there is none. */
  readonly extname: string;
  readonly headerOffset: number;
  readonly dataOffset: number;
  /** Without the filling of the last block. */
  readonly dataBytes: number;
  readonly bitpix: Bitpix;
  /** NAXISn, NAXIS1 first. */
  readonly shape: readonly number[];
  /** `other` is an extension that is never read, such as a table in ASCII. */
  readonly kind: 'image' | 'table' | 'groups' | 'other';
  /** How messages call it. */
  readonly place: string;
}

const sumPiece = 1 << 22;
const mostAxes = 999;

/** All HDUs, in the order of the file. Reads the headers only.
 *  @throws InputProblem for a header that is damaged or promises more than the file holds. */
export function listHdus(source: ByteSource): Hdu[] {
  const hdus: Hdu[] = [];
  for (let offset = 0; offset < source.size || offset === 0; ) {
    if (offset > 0 && !startsExtension(source, offset)) {
      requireFilling(source, offset);
      break;
    }
    const hdu = readHdu(source, offset, hdus.length);
    hdus.push(hdu);
    offset = hdu.dataOffset + padded(hdu.dataBytes);
  }
  return hdus;
}

/** `listHdus`, and every CHECKSUM and DATASUM is verified. Reads the whole file once. @throws InputProblem */
export function openFits(source: ByteSource): Hdu[] {
  const hdus = listHdus(source);
  for (const hdu of hdus) verifyChecksums(source, hdu);
  return hdus;
}

/** Tables whose EXTNAME is `ending` or ends in a blank and `ending`, without case. */
export function tablesEndingIn(hdus: readonly Hdu[], ending: string): Hdu[] {
  const word = ending.toUpperCase();
  return hdus.filter(
    (hdu) => hdu.kind === 'table' && (hdu.extname === word || hdu.extname.endsWith(` ${word}`)),
  );
}

/** The table with this EXTNAME. @throws InputProblem when there is none or more than one. */
export function requireTable(source: ByteSource, hdus: readonly Hdu[], extname: string): Hdu {
  const found = hdus.filter((hdu) => hdu.kind === 'table' && hdu.extname === extname);
  const [hdu] = found;
  if (hdu !== undefined && found.length === 1) return hdu;
  throw new InputProblem({
    code: 'missing-table',
    place: source.name,
    expected: `one binary table with EXTNAME ${extname}`,
    found: `${found.length} among ${hdus.map((each) => each.extname || 'unnamed').join(', ')}`,
    advice: 'Give a file of the format that the input declares.',
  });
}

function readHdu(source: ByteSource, offset: number, index: number): Hdu {
  const { header, dataOffset } = parseHeader(source, offset);
  requireOpening(header, source, offset);
  const bitpix = requireInteger(header, 'BITPIX', -64, 64);
  if (!isBitpix(bitpix)) throw badSize(header, 'BITPIX 8, 16, 32, 64, -32 or -64', `BITPIX ${bitpix}`);
  const axes = requireInteger(header, 'NAXIS', 0, mostAxes);
  const shape = Array.from({ length: axes }, (_, n) =>
    requireInteger(header, `NAXIS${n + 1}`, 0, Number.MAX_SAFE_INTEGER),
  );
  const kind = kindOf(header, shape);
  const dataBytes = bytesOf(bitpix) * valuesOf(header, shape, kind);
  if (!(dataOffset + padded(dataBytes) <= source.size)) {
    const room = source.size - dataOffset;
    const promised = `${padded(dataBytes)} bytes of data (${dataBytes} and the filling of the last block)`;
    throw badSize(header, `${promised}, as the header promises`, `${room} bytes from byte ${dataOffset} on`);
  }
  const extname = requireText(header, 'EXTNAME', '').toUpperCase();
  const place = `${source.name}, HDU ${index + 1}${extname === '' ? '' : ` (${extname})`}`;
  return { index, header, extname, headerOffset: offset, dataOffset, dataBytes, bitpix, shape, kind, place };
}

function requireOpening(header: Header, source: ByteSource, offset: number): void {
  const keyword = offset === 0 ? 'SIMPLE' : 'XTENSION';
  const first = header.cards[0];
  const good = offset === 0 ? first?.value === true : typeof first?.value === 'string';
  if (first?.keyword === keyword && good) return;
  throw new InputProblem({
    code: 'not-fits',
    place: `${source.name}, byte ${offset}`,
    expected: offset === 0 ? 'the card SIMPLE = T' : 'a card XTENSION',
    found: first === undefined ? 'an empty header' : `${first.keyword} = ${first.value}`,
    advice: 'Give a FITS file.',
  });
}

function kindOf(header: Header, shape: readonly number[]): Hdu['kind'] {
  const extension = headerValue(header, 'XTENSION');
  if (extension === undefined) {
    return headerValue(header, 'GROUPS') === true && shape[0] === 0 ? 'groups' : 'image';
  }
  if (extension === 'BINTABLE') return 'table';
  return extension === 'IMAGE' ? 'image' : 'other';
}

/** Number of values: GCOUNT * (PCOUNT + NAXIS1 * ...), without the leading 0 of random groups (eq. 6.1). May be
 *  infinite when the header lies; the comparison with the file's size then fails. */
function valuesOf(header: Header, shape: readonly number[], kind: Hdu['kind']): number {
  const most = Number.MAX_SAFE_INTEGER;
  const has = (keyword: string) => headerValue(header, keyword) !== undefined;
  const extension = has('XTENSION');
  const pcount = kind === 'groups' || extension ? requireInteger(header, 'PCOUNT', 0, most) : 0;
  const gcount = kind === 'groups' || extension ? requireInteger(header, 'GCOUNT', 0, most) : 1;
  const axes = kind === 'groups' ? shape.slice(1) : shape;
  const block = axes.length === 0 || axes.includes(0) ? 0 : axes.reduce((product, n) => product * n, 1);
  return gcount * (pcount + block);
}

function badSize(header: Header, expected: string, found: string): InputProblem {
  return new InputProblem({
    code: 'bad-size',
    place: header.place,
    expected,
    found,
    advice: 'The file is cut short or its header is damaged: fetch it again.',
  });
}

function startsExtension(source: ByteSource, offset: number): boolean {
  if (offset + blockLength > source.size) return false;
  return Buffer.from(source.read(offset, 8)).toString('latin1') === 'XTENSION';
}

/** What follows the last HDU must be zeros or blanks, as some writers fill up to a tape's block. */
function requireFilling(source: ByteSource, offset: number): void {
  for (let at = offset; at < source.size; at += sumPiece) {
    const bytes = source.read(at, Math.min(sumPiece, source.size - at));
    const odd = bytes.findIndex((byte) => byte !== 0 && byte !== 0x20);
    if (odd < 0) continue;
    throw new InputProblem({
      code: 'not-fits',
      place: `${source.name}, byte ${at + odd}`,
      expected: 'a further extension (XTENSION) or nothing but zeros',
      found: `byte 0x${(bytes[odd] as number).toString(16)} after the last HDU`,
      advice: 'The file is cut short or something was appended to it: fetch it again.',
    });
  }
}

function padded(bytes: number): number {
  return Math.ceil(bytes / blockLength) * blockLength;
}

/** Compares DATASUM and CHECKSUM with the bytes; keywords that are not there are not checked.
 *  Reads the HDU once, in pieces. @throws InputProblem of code `checksum` */
export function verifyChecksums(source: ByteSource, hdu: Hdu): void {
  const has = (keyword: string) => (headerValue(hdu.header, keyword) ?? '') !== '';
  if (!has('DATASUM') && !has('CHECKSUM')) return;
  const dataSum = sumRange(source, hdu.dataOffset, padded(hdu.dataBytes), 0);
  if (has('DATASUM')) {
    const stated = String(headerValue(hdu.header, 'DATASUM')).trim();
    if (!(/^\d+$/.test(stated) && Number(stated) === dataSum)) {
      throw badSum(hdu, `data whose sum is DATASUM ${stated}`, `the sum ${dataSum}`);
    }
  }
  if (!has('CHECKSUM')) return;
  const total = sumRange(source, hdu.headerOffset, hdu.dataOffset - hdu.headerOffset, dataSum);
  if (total !== 0xffffffff) {
    throw badSum(hdu, 'header and data that sum to 4294967295 with CHECKSUM', `the sum ${total}`);
  }
}

function sumRange(source: ByteSource, offset: number, length: number, start: number): number {
  let sum = start;
  for (let at = 0; at < length; at += sumPiece) {
    sum = onesComplementSum(source.read(offset + at, Math.min(sumPiece, length - at)), sum);
  }
  return sum;
}

function badSum(hdu: Hdu, expected: string, found: string): InputProblem {
  return new InputProblem({
    code: 'checksum',
    place: `${hdu.place}, bytes from ${hdu.headerOffset} on`,
    expected,
    found,
    advice: 'The file was damaged, or edited without renewing its checksums: fetch it again or renew them.',
  });
}
