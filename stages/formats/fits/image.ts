/** Image HDUs, primary or extension, read and written plane by plane.
 *  Source: FITS Standard 4.0, sections 4.4.1, 4.4.2.5 (BSCALE, BZERO, BLANK) and 7.1. */

import type { ByteSink, ByteSource } from '../../bytes.ts';
import { InputProblem, InternalError } from '../../problem.ts';
import type { Hdu } from './hdu.ts';
import { bigInteger, type Header, type NewCard, requireNumber } from './header.ts';
import { type Bitpix, bytesOf, decodeNumbers, encodeNumbers, type Scaling } from './numbers.ts';
import { startHdu } from './writer.ts';

export interface ImageReader {
  /** NAXIS1 (fastest) first. */
  readonly shape: readonly number[];
  /** Values of a plane: NAXIS1 * NAXIS2. */
  readonly planeLength: number;
  readonly planes: number;
  /** Physical values of one plane, from 0; undefined pixels are NaN. Reads that plane only. */
  read(plane: number): Float64Array;
  all(): Float64Array;
}

/** A reader of the pixels of an image HDU. @throws InputProblem when it is no image or holds no pixels. */
export function readImageHdu(source: ByteSource, hdu: Hdu): ImageReader {
  const { shape, bitpix } = hdu;
  if (hdu.kind !== 'image' || shape.length === 0 || shape.includes(0)) {
    throw new InputProblem({
      code: 'no-image',
      place: hdu.place,
      expected: 'an image with pixels',
      found: hdu.kind === 'image' ? `axes [${shape.join(', ')}]` : `${hdu.kind}`,
      advice: 'Give a FITS file whose image is not empty.',
    });
  }
  const scaling = dataScaling(hdu.header, bitpix);
  const planeLength = (shape[0] as number) * (shape[1] ?? 1);
  const planes = shape.slice(2).reduce((product, n) => product * n, 1);
  const range = (from: number, count: number) => {
    const width = bytesOf(bitpix);
    const bytes = source.read(hdu.dataOffset + from * width, count * width);
    return decodeNumbers(bytes, bitpix, scaling, hdu.place);
  };
  return {
    shape,
    planeLength,
    planes,
    read(plane) {
      if (!(plane >= 0 && plane < planes))
        throw new InternalError('readImageHdu', `plane ${plane} of ${planes}`);
      return range(plane * planeLength, planeLength);
    },
    all: () => range(0, planeLength * planes),
  };
}

/** BSCALE, BZERO and, for integers, BLANK. @throws InputProblem for a BSCALE of 0. */
export function dataScaling(header: Header, bitpix: Bitpix): Scaling {
  const scale = requireNumber(header, 'BSCALE', 1);
  if (scale === 0) {
    throw new InputProblem({
      code: 'bad-value',
      place: header.place,
      expected: 'BSCALE other than 0',
      found: 'BSCALE = 0',
      advice: 'Correct the header with the program that wrote the file.',
    });
  }
  const blank = bitpix > 0 ? bigInteger(header, 'BLANK') : undefined;
  return { scale, zero: requireNumber(header, 'BZERO', 0), blank };
}

export interface NewImage {
  readonly shape: readonly number[];
  readonly bitpix: Bitpix;
  /** Keywords after the mandatory ones. */
  readonly cards?: readonly NewCard[];
  /** Whether it is the primary HDU or an extension. */
  readonly first: boolean;
}

export interface ImageWriter {
  /** The next pixels, of any number. @throws InternalError for a value that the type cannot hold. */
  write(values: ArrayLike<number>): void;
  /** @throws InternalError when pixels are missing. */
  end(): void;
}

/** Starts an image; its pixels are then written piece by piece. No scaling is applied. */
export function startImageHdu(sink: ByteSink, { shape, bitpix, cards = [], first }: NewImage): ImageWriter {
  const opening: NewCard = first ? ['SIMPLE', true] : ['XTENSION', 'IMAGE'];
  const axes = shape.map((n, i): NewCard => [`NAXIS${i + 1}`, n]);
  const counts: NewCard[] = first
    ? []
    : [
        ['PCOUNT', 0],
        ['GCOUNT', 1],
      ];
  const values = shape.length === 0 ? 0 : shape.reduce((product, n) => product * n, 1);
  const mandatory: NewCard[] = [opening, ['BITPIX', bitpix], ['NAXIS', shape.length], ...axes, ...counts];
  const hdu = startHdu(sink, [...mandatory, ...cards], values * bytesOf(bitpix));
  return { write: (pixels) => hdu.write(encodeNumbers(pixels, bitpix)), end: hdu.end };
}

/** Writes a whole image from its planes, or pieces of any other length, in order. */
export function appendImageHdu(
  sink: ByteSink,
  image: NewImage & { readonly data: Iterable<ArrayLike<number>> },
): void {
  const writer = startImageHdu(sink, image);
  for (const piece of image.data) writer.write(piece);
  writer.end();
}

/** Writes a primary HDU without data, as it stands before tables. */
export function appendEmptyPrimary(sink: ByteSink, cards: readonly NewCard[] = []): void {
  startImageHdu(sink, { shape: [], bitpix: 8, cards, first: true }).end();
}
