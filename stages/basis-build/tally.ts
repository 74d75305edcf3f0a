/** What a basis leaves unexplained, gathered image by image: in all by number of components, and family by family for
 *  images held out of it. */

import { median } from '../numerics/statistics.ts';
import type { Projection } from './build.ts';

export interface FamilyErrors {
  readonly family: string;
  /** Number of images held out. */
  readonly images: number;
  /** Root of the sum of squares left, over that of the band-limited image. */
  readonly medianError: number;
  readonly worstError: number;
  /** The image with the worst error, its number in the manifest. */
  readonly worstImage: number;
}

export interface Tally {
  add(projection: Projection, family: string): void;
  /** Part of the held-out images' variance about the mean that the leading k+1 components explain; empty when none
   *  were held out. */
  heldOutExplained(): number[];
  /** Families with images held out, in the order in which they came. */
  families(): FamilyErrors[];
}

/** Makes an empty tally for a number of components. */
export function makeTally(components: number): Tally {
  const explained = new Float64Array(components);
  let total = 0;
  const errors = new Map<string, { image: number; error: number }[]>();
  return {
    add({ image, heldOut, scores, square, deviation }, family) {
      if (!heldOut) return;
      total += deviation;
      let sum = 0;
      for (let k = 0; k < components; k++) {
        sum += (scores[k] as number) * (scores[k] as number);
        explained[k] = (explained[k] as number) + sum;
      }
      const list = errors.get(family) ?? [];
      // Rounding may leave less than nothing of an image that the basis holds whole.
      list.push({ image, error: Math.sqrt(Math.max(0, deviation - sum) / square) });
      errors.set(family, list);
    },
    heldOutExplained: () => (total > 0 ? Array.from(explained, (value) => value / total) : []),
    families: () => [...errors].map(([family, list]) => summary(family, list)),
  };
}

function summary(family: string, list: readonly { image: number; error: number }[]): FamilyErrors {
  const worst = list.reduce((one, other) => (other.error > one.error ? other : one));
  return {
    family,
    images: list.length,
    medianError: median(Float64Array.from(list, ({ error }) => error)),
    worstError: worst.error,
    worstImage: worst.image,
  };
}
