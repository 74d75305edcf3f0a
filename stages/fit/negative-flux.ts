/** How much of an image's flux stands in negative pixels: it cannot be there. */

import type { Posterior } from '../data.ts';
import { imageAt } from '../imaging/linear-model.ts';
import { drawImage } from '../imaging/measure-draws.ts';
import type { FitResult } from '../imaging/run-fit.ts';
import { quantiles } from '../numerics/statistics.ts';

export interface NegativeFlux {
  /** Of the image at the optimum, over its total. */
  readonly optimum: number;
  /** Of the draws: median, and what 95 % stay below. */
  readonly median: number;
  readonly high95: number;
}

/** Draws that are looked at. */
const MOST_DRAWS = 100;

export function negativeFlux({ problem, best }: FitResult, posterior: Posterior): NegativeFlux {
  const { basis, model } = problem;
  const count = Math.min(MOST_DRAWS, posterior.count);
  const draws = Array.from({ length: count }, (_, s) =>
    negativeFraction(drawImage(basis, posterior, Math.floor((s * posterior.count) / count)).pixels),
  );
  const [median, high95] = quantiles(draws, [0.5, 0.95]);
  return { optimum: negativeFraction(imageAt(model, basis, best.x)), median, high95 };
}

/** Flux in negative pixels over the total. */
export function negativeFraction(pixels: Float64Array): number {
  let negative = 0;
  let total = 0;
  for (const value of pixels) {
    total += value;
    if (value < 0) negative -= value;
  }
  return total > 0 ? negative / total : 1;
}
