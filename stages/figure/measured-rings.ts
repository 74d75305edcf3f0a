/** The rings of a posterior whose histograms are drawn: as `features` has measured them, or measured here. */

import { z } from 'zod';
import type { ByteSource } from '../bytes.ts';
import type { Basis, Posterior, SkyImage } from '../data.ts';
import { readDocument } from '../formats/document.ts';
import { drawImage } from '../imaging/measure-draws.ts';
import { measureRing } from '../numerics/ring.ts';
import { evenDraws, MICROARCSEC } from './sky.ts';

/** Lengths in microarcseconds, the angle in degrees. */
export interface RingValues {
  readonly diameter: number;
  readonly width: number | null;
  readonly asymmetry: number;
  readonly positionAngle: number;
  readonly centralDepression: number;
}

export interface MeasuredRings {
  /** Draws that were looked at. */
  readonly draws: number;
  readonly rings: readonly RingValues[];
}

const reportSchema = z.object({
  draws: z.number(),
  measures: z.array(
    z.object({
      diameter: z.number(),
      width: z.number().nullable(),
      asymmetry: z.number(),
      positionAngle: z.number(),
      centralDepression: z.number(),
    }),
  ),
});

/** @throws InputProblem when the document is no report of `features` */
export function readMeasuredRings(source: ByteSource): MeasuredRings {
  const { draws, measures } = readDocument(
    reportSchema,
    source,
    'the output `report` of a stage of kind features',
  );
  return { draws, rings: measures };
}

/** Measures a part of the draws, evenly taken. Cost: a millisecond or two a draw.
 *  @param progress  called with a fraction 0 to 1 */
export function measureRings(
  basis: Basis,
  posterior: Posterior,
  wanted: number,
  progress: (fraction: number) => void,
): MeasuredRings {
  const draws = evenDraws(posterior, wanted);
  const rings: RingValues[] = [];
  draws.forEach((draw, k) => {
    const ring = ringOf(drawImage(basis, posterior, draw));
    if (ring !== null) rings.push(ring);
    progress((k + 1) / draws.length);
  });
  return { draws: draws.length, rings };
}

/** The ring of an image; null for an image that shows none. */
export function ringOf(image: SkyImage): RingValues | null {
  if (!image.pixels.some((value) => value > 0)) return null;
  const found = measureRing(image);
  if (!found.ring) return null;
  return {
    diameter: found.diameter / MICROARCSEC,
    width: found.width === null ? null : found.width / MICROARCSEC,
    asymmetry: found.asymmetry,
    positionAngle: found.positionAngleDegrees,
    centralDepression: found.centralDepression,
  };
}
