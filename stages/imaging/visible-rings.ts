/** Rings to inject that are rings at the resolution at which they are measured: of one that blurs into a blob there is no
 *  true diameter, and a trial of it would tell nothing. */

import type { Basis } from '../data.ts';
import type { Model } from '../numerics/models.ts';
import { measureRing } from '../numerics/ring.ts';
import { type AboutRing, injectedRings } from './injected-rings.ts';
import { imageAtResolution } from './trial.ts';

/** How often another ring is drawn in place of one that is none; each time from the same part of the range of diameters. */
const ATTEMPTS = 6;

export interface RingChoice {
  readonly about: AboutRing;
  /** Jy. */
  readonly flux: number;
  readonly count: number;
  readonly seed: number;
}

/** Returns as many rings as were asked for, or fewer where none is to be had. Cost: 25 ms for each that is looked at. */
export function visibleRings(basis: Basis, { about, flux, count, seed }: RingChoice): Model[] {
  const found: (Model | null)[] = new Array(count).fill(null);
  for (let attempt = 0; attempt < ATTEMPTS && found.includes(null); attempt++) {
    injectedRings(about, flux, count, seed + attempt).forEach((source, k) => {
      if (found[k] === null && measureRing(imageAtResolution(source, basis)).ring) found[k] = source;
    });
  }
  return found.filter((source) => source !== null);
}
