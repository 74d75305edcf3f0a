/** Slow sums that tests compare with: the formulas as they stand, with the platform's own functions. */

import type { PixelGrid } from '../../../stages/numerics/fourier.ts';

export const UAS = Math.PI / 180 / 3600e6;

/** Offset of column i to the east and of row j to the north, radians: CONVENTIONS. */
export function offset({ nx, ny, pixelRadians }: PixelGrid, i: number, j: number): { x: number; y: number } {
  return { x: ((nx - 1) / 2 - i) * pixelRadians, y: (j - (ny - 1) / 2) * pixelRadians };
}

/** sum I exp(-2 pi i (u x + v y)). */
export function directVisibility(
  grid: PixelGrid,
  pixels: Float64Array,
  u: number,
  v: number,
): [number, number] {
  let re = 0;
  let im = 0;
  for (let j = 0; j < grid.ny; j++) {
    for (let i = 0; i < grid.nx; i++) {
      const { x, y } = offset(grid, i, j);
      const phase = -2 * Math.PI * (u * x + v * y);
      re += (pixels[j * grid.nx + i] as number) * Math.cos(phase);
      im += (pixels[j * grid.nx + i] as number) * Math.sin(phase);
    }
  }
  return [re, im];
}

/** Numbers between -1 and 1 that look like none in particular; the same for the same seed. */
export function someNumbers(count: number, seed = 1): Float64Array {
  let state = seed * 2654435761;
  return Float64Array.from({ length: count }, () => {
    state = (Math.imul(state, 1664525) + 1013904223) >>> 0;
    return state / 2 ** 31 - 1;
  });
}

export function dot(a: ArrayLike<number>, b: ArrayLike<number>): number {
  let sum = 0;
  for (let k = 0; k < a.length; k++) sum += (a[k] as number) * (b[k] as number);
  return sum;
}

/** The largest |a - b|; NaN when one is, infinite for unequal lengths. */
export function largestDifference(a: ArrayLike<number>, b: ArrayLike<number>): number {
  let largest = a.length === b.length ? 0 : Number.POSITIVE_INFINITY;
  for (let k = 0; k < a.length; k++) {
    const difference = Math.abs((a[k] as number) - (b[k] as number));
    largest = Math.max(largest, difference);
  }
  return largest;
}
