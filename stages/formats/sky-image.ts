/** Formats `fits-image` and `fits-cube`: images of the sky with world coordinates. Layout: CONVENTIONS.
 *  World coordinates: FITS Standard 4.0, section 8. */

import type { ByteSink, ByteSource } from '../bytes.ts';
import type { SkyImage } from '../data.ts';
import { InputProblem, InternalError } from '../problem.ts';
import { fromDegrees, toDegrees } from './angles.ts';
import { type Hdu, openFits } from './fits/hdu.ts';
import type { NewCard } from './fits/header.ts';
import { type Header, headerValue, requireNumber, requireText } from './fits/header.ts';
import { readImageHdu, startImageHdu } from './fits/image.ts';

/** Images of one shape, read plane by plane. */
export interface SkyCube {
  readonly nx: number;
  readonly ny: number;
  readonly count: number;
  readonly pixelRadians: number;
  /** BUNIT as it stands; empty when there is none. */
  readonly unit: string;
  /** Pixels of plane k from 0, turned to the order of CONVENTIONS where CDELT says that they are not. */
  plane(k: number): Float64Array;
}

/** Degrees per unit of CUNIT; the units in which pixel sizes are given (FITS Standard 4.0, section 4.3). */
const unitDegrees: Readonly<Record<string, number>> = {
  deg: 1,
  '': 1,
  degree: 1,
  degrees: 1,
  arcmin: 1 / 60,
  arcsec: 1 / 3600,
  mas: 1 / 3_600_000,
  uas: 1 / 3_600_000_000,
  rad: 180 / Math.PI,
};

/** How far |CDELT1| and |CDELT2| may differ: seven digits, as headers written in single precision have. */
const squareness = 1e-6;

/** Reads an image of one plane. The position of the reference pixel is not read: the origin is the centre.
 *  @throws InputProblem when it is no image of one plane, not on square pixels, or holds a value that is not finite */
export function readSkyImage(source: ByteSource): SkyImage & { readonly unit: string } {
  const { nx, ny, count, pixelRadians, unit, plane } = readSkyCube(source);
  if (count !== 1) {
    throw new InputProblem({
      code: 'wrong-shape',
      place: source.name,
      expected: 'one image',
      found: `a cube of ${count} images`,
      advice: 'Give an image, or a cube where a cube is asked for.',
    });
  }
  return { nx, ny, pixelRadians, unit, pixels: plane(0) };
}

/** Reads a cube: every axis after the first two counts images. Takes the first HDU that holds an image; an image alone
 *  is a cube of one plane. Checksums are verified. @throws InputProblem, as `readSkyImage` */
export function readSkyCube(source: ByteSource): SkyCube {
  const hdus = openFits(source);
  return skyCubeOf(source, hdus.find((each) => each.kind === 'image' && isPicture(each)) ?? (hdus[0] as Hdu));
}

/** The same for an HDU that is known. */
export function skyCubeOf(source: ByteSource, hdu: Hdu): SkyCube {
  const image = readImageHdu(source, hdu);
  const [nx = 0, ny = 0] = image.shape;
  if (!isPicture(hdu)) throw noPicture(hdu);
  const { pixelRadians, flipX, flipY } = readGrid(hdu);
  return {
    nx,
    ny,
    count: image.planes,
    pixelRadians,
    unit: requireText(hdu.header, 'BUNIT', ''),
    plane(k) {
      const pixels = flipped(image.read(k), nx, flipX, flipY);
      requireFinite(pixels, nx, `${hdu.place}, plane ${k + 1}`);
      return pixels;
    },
  };
}

function isPicture({ shape }: Hdu): boolean {
  return shape.length >= 2 && !shape.includes(0);
}

function noPicture(hdu: Hdu): InputProblem {
  return new InputProblem({
    code: 'no-image',
    place: hdu.place,
    expected: 'an image with at least two axes',
    found: `axes [${hdu.shape.join(', ')}]`,
    advice: 'Give a FITS image of the sky.',
  });
}

function readGrid({ header, place }: Hdu): { pixelRadians: number; flipX: boolean; flipY: boolean } {
  requireUnturned(header, place);
  const x = increment(header, 1);
  const y = increment(header, 2);
  const square = Math.abs(Math.abs(x) - Math.abs(y)) <= squareness * Math.abs(y);
  if (!(y !== 0 && square)) {
    throw new InputProblem({
      code: 'bad-grid',
      place,
      expected: 'square pixels of a known size (CDELT1 and CDELT2, or CD1_1 and CD2_2)',
      found: `${x} by ${y} degrees`,
      advice: 'Put the image on square pixels and write their size into its header.',
    });
  }
  return { pixelRadians: fromDegrees(Math.abs(y)), flipX: x > 0, flipY: y < 0 };
}

/** Degrees per pixel along an axis; 0 when the header does not say. */
function increment(header: Header, axis: number): number {
  const unit = requireText(header, `CUNIT${axis}`, 'deg').trim().toLowerCase();
  const degrees = unitDegrees[unit];
  if (degrees === undefined) {
    throw new InputProblem({
      code: 'bad-grid',
      place: header.place,
      expected: `CUNIT${axis} one of ${Object.keys(unitDegrees).filter(Boolean).join(', ')}`,
      found: unit,
      advice: 'Write the pixel size in degrees.',
    });
  }
  const cdelt = headerValue(header, `CDELT${axis}`) === undefined ? `CD${axis}_${axis}` : `CDELT${axis}`;
  return requireNumber(header, cdelt, 0) * degrees;
}

function requireUnturned(header: Header, place: string): void {
  for (const keyword of ['CROTA1', 'CROTA2', 'CD1_2', 'CD2_1', 'PC1_2', 'PC2_1']) {
    const value = requireNumber(header, keyword, 0);
    if (value === 0) continue;
    throw new InputProblem({
      code: 'bad-grid',
      place,
      expected: 'an image whose rows run from east to west',
      found: `${keyword} = ${value}`,
      advice: 'Turn the image upright first.',
    });
  }
}

function flipped(pixels: Float64Array, nx: number, flipX: boolean, flipY: boolean): Float64Array {
  if (flipX) for (let at = 0; at < pixels.length; at += nx) pixels.subarray(at, at + nx).reverse();
  if (!flipY) return pixels;
  const turned = new Float64Array(pixels.length);
  for (let at = 0; at < pixels.length; at += nx) {
    turned.set(pixels.subarray(at, at + nx), pixels.length - nx - at);
  }
  return turned;
}

function requireFinite(pixels: Float64Array, nx: number, place: string): void {
  for (let i = 0; i < pixels.length; i++) {
    if (Number.isFinite(pixels[i])) continue;
    throw new InputProblem({
      code: 'not-finite',
      place: `${place}, pixel (${(i % nx) + 1}, ${Math.floor(i / nx) + 1})`,
      expected: 'a finite value',
      found: `${pixels[i]}`,
      advice: 'Fill undefined pixels, with zeros if they are empty sky.',
    });
  }
}

/** Writes a `fits-image`; `cards` replace or follow those of the format.
 *  @throws InternalError for a pixel that is not finite or a wrong number of pixels */
export function writeSkyImage(sink: ByteSink, image: SkyImage, cards: readonly NewCard[] = []): void {
  requireWhole(image.pixels, image.nx * image.ny, 'writeSkyImage');
  const grid = gridCards(image.nx, image.ny, image.pixelRadians);
  const shape = [image.nx, image.ny];
  const all = merge([...grid, ['BUNIT', 'Jy/pixel']], cards);
  const writer = startImageHdu(sink, { shape, bitpix: -64, cards: all, first: true });
  writer.write(image.pixels);
  writer.end();
}

export interface NewSkyCube {
  readonly nx: number;
  readonly ny: number;
  readonly count: number;
  readonly pixelRadians: number;
  readonly cards?: readonly NewCard[];
}

/** Starts a `fits-cube` (float32), whose planes are then written one by one.
 *  @throws InternalError for a pixel that is not finite, and when planes are too few or too many */
export function startSkyCube(
  sink: ByteSink,
  { nx, ny, count, pixelRadians, cards = [] }: NewSkyCube,
): { plane(pixels: Float64Array): void; end(): void } {
  const all = merge([...gridCards(nx, ny, pixelRadians), ['CTYPE3', 'IMAGE'], ['BUNIT', 'Jy/pixel']], cards);
  const writer = startImageHdu(sink, { shape: [nx, ny, count], bitpix: -32, cards: all, first: true });
  return {
    plane(pixels) {
      requireWhole(pixels, nx * ny, 'startSkyCube');
      writer.write(pixels);
    },
    end: writer.end,
  };
}

/** The world coordinates of CONVENTIONS: x to the west, the origin at the centre of the array. */
export function gridCards(nx: number, ny: number, pixelRadians: number): NewCard[] {
  const degrees = toDegrees(pixelRadians);
  return [
    ['CTYPE1', 'RA---SIN'],
    ['CRPIX1', (nx + 1) / 2],
    ['CRVAL1', 0],
    ['CDELT1', -degrees],
    ['CUNIT1', 'deg'],
    ['CTYPE2', 'DEC--SIN'],
    ['CRPIX2', (ny + 1) / 2],
    ['CRVAL2', 0],
    ['CDELT2', degrees],
    ['CUNIT2', 'deg'],
  ];
}

function merge(ours: readonly NewCard[], theirs: readonly NewCard[]): NewCard[] {
  const given = new Set(theirs.map(([keyword]) => keyword));
  return [...ours.filter(([keyword]) => !given.has(keyword)), ...theirs];
}

function requireWhole(pixels: Float64Array, length: number, where: string): void {
  if (pixels.length !== length) throw new InternalError(where, `${pixels.length} pixels, not ${length}`);
  for (let i = 0; i < length; i++) {
    if (!Number.isFinite(pixels[i])) throw new InternalError(where, `pixel ${i} is ${pixels[i]}`);
  }
}
