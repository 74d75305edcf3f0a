/** In how many different places the starts of a search ended. */

import type { Minimum } from '../numerics/gauss-newton.ts';

export interface Mode {
  readonly cost: number;
  /** Cost above that of the best. */
  readonly above: number;
  /** How far from the best, in standard deviations of the Gaussian of its curvature. */
  readonly distance: number;
  /** Numbers of the starts that ended here. */
  readonly starts: readonly number[];
}

/** Nearer than this, in standard deviations, is the same place. */
const SAME = 0.5;

/** Best first. */
export function modesOf(minima: readonly Minimum[]): Mode[] {
  const order = minima.map((minimum, start) => ({ minimum, start })).sort(byCost);
  const modes: { at: Minimum; starts: number[] }[] = [];
  for (const { minimum, start } of order) {
    const known = modes.find(({ at }) => distance(at, minimum) < SAME);
    if (known) known.starts.push(start);
    else modes.push({ at: minimum, starts: [start] });
  }
  const best = modes[0].at;
  return modes.map(({ at, starts }) => ({
    cost: at.cost,
    above: at.cost - best.cost,
    distance: distance(best, at),
    starts: starts.sort((a, b) => a - b),
  }));
}

function byCost(a: { minimum: Minimum; start: number }, b: { minimum: Minimum; start: number }): number {
  return a.minimum.cost - b.minimum.cost || a.start - b.start;
}

/** The root of (x - y)^T H (x - y), H the curvature at x. */
function distance({ x, curvature }: Minimum, { x: y }: Minimum): number {
  const n = x.length;
  let sum = 0;
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < n; j++) sum += curvature[i * n + j] * (x[i] - y[i]) * (x[j] - y[j]);
  }
  return Math.sqrt(Math.max(0, sum));
}
