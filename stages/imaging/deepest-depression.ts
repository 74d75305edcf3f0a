/** The central depression of a ring without any light inside: the instrument can see none deeper. */

import { makeDrawing } from '../numerics/draw.ts';
import { blurredRing } from '../numerics/named-models.ts';
import { measureRing } from '../numerics/ring.ts';

export interface Grid {
  readonly nx: number;
  readonly ny: number;
  readonly pixelRadians: number;
}

/** @param diameter  of the thin ring, radians
 *  @param width  as measured, the resolution in it, radians. Cost: 5 ms at 64 by 64 pixels */
export function deepestDepression(diameter: number, width: number, { nx, ny, pixelRadians }: Grid): number {
  const pixels = new Float64Array(nx * ny);
  makeDrawing({ nx, ny, pixelRadians })(pixels, blurredRing(diameter, width));
  return measureRing({ nx, ny, pixelRadians, pixels }).centralDepression;
}
