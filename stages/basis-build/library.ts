/** The library as basis-build reads it: an image after the other, checked, of unit flux; and its families. */

import { z } from 'zod';
import type { ByteSource } from '../bytes.ts';
import { readDocument } from '../formats/document.ts';
import { readSkyCube } from '../formats/sky-image.ts';
import type { PixelGrid } from '../numerics/fourier.ts';
import { InputProblem } from '../problem.ts';

/** Images that can be read in any order. */
export interface Library extends PixelGrid {
  readonly count: number;
  readonly families: readonly string[];
  /** Pixels of image k, of unit flux. @throws InputProblem that names the plane */
  image(k: number): Float64Array;
}

const manifestSchema = z.object({ images: z.array(z.object({ family: z.string().min(1).max(24) })) });

/** Opens a cube and its manifest. @throws InputProblem when they do not belong together */
export function openLibrary(cubeSource: ByteSource, manifestSource: ByteSource): Library {
  const { nx, ny, count, pixelRadians, plane } = readSkyCube(cubeSource);
  const families = readFamilies(manifestSource);
  if (families.length !== count) {
    throw new InputProblem({
      code: 'wrong-count',
      place: manifestSource.name,
      expected: `${count} images, as many as ${cubeSource.name} has planes`,
      found: `${families.length}`,
      advice: 'Give the manifest of this very library.',
    });
  }
  return {
    nx,
    ny,
    pixelRadians,
    count,
    families,
    image: (k) => withUnitFlux(plane(k), `${cubeSource.name}, plane ${k + 1}`),
  };
}

function readFamilies(source: ByteSource): string[] {
  const expected = 'a list images, each with its family, a text of 1 to 24 characters';
  const advice = 'Give the manifest that image-library wrote.';
  return readDocument(manifestSchema, source, expected, advice).images.map(({ family }) => family);
}

/** Below this fraction of the sum of magnitudes a flux is rounding. */
const LEAST_FLUX = 1e-6;

/** Scales pixels to a sum of 1, in place. @throws InputProblem when they have none, or one is not finite */
export function withUnitFlux(pixels: Float64Array, place: string): Float64Array {
  let flux = 0;
  let size = 0;
  for (let k = 0; k < pixels.length; k++) {
    flux += pixels[k] as number;
    size += Math.abs(pixels[k] as number);
  }
  if (!(flux > 0 && flux > LEAST_FLUX * size && size < Number.POSITIVE_INFINITY)) {
    throw new InputProblem({
      code: 'no-flux',
      place,
      expected: 'finite pixels with a positive sum',
      found: `a sum of ${flux}`,
      advice: 'Leave this image out of the library, or correct it.',
    });
  }
  for (let k = 0; k < pixels.length; k++) pixels[k] = (pixels[k] as number) / flux;
  return pixels;
}
