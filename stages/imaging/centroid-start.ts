/** Where the search for the centroid starts. For an image with visibilities M, moved to s, at the flux that suits best,
 *
 *    chi-square(s) = sum w |V|^2 - C(s)^2 / sum w |M|^2,   C(s) = sum w Re[conj(M) V exp(+2 pi i (u s_e + v s_n))]
 *
 *  so the best place is the peak of C. It has side peaks as high as the (u,v) coverage makes them, and Gauss-Newton steps
 *  find the nearest only: the peak is searched on a grid, then on a finer one about it. */

import type { Visibilities } from '../data.ts';
import { cos, sin } from '../numerics/elementary.ts';
import type { Place } from './centroid.ts';
import { complexSigma } from './complex-term.ts';
import type { ModelVisibilities } from './linear-model.ts';

/** Steps in the finest fringe's period: the peak is as wide as half of it. */
const STEPS_PER_FRINGE = 4;
/** Steps to either side at most: bounds the cost where baselines are long for the field. */
const MOST_STEPS = 128;
/** The second grid divides a step of the first by this. */
const FINER = 4;

/** Returns the place at which an image agrees best with complex visibilities.
 *  @param at     visibilities of the image, its centroid at the phase centre
 *  @param reach  how far to search on either axis, radians
 *  Cost: rows times points of the grid, 3e6 for 1,000 rows, 9e9 wavelengths and 160 uas. */
export function findPlace(data: Visibilities, at: ModelVisibilities, reach: number): Place {
  const product = weightedProduct(data, at);
  let longest = 0;
  for (let r = 0; r < data.count; r++) longest = Math.max(longest, Math.abs(data.u[r]), Math.abs(data.v[r]));
  const steps = Math.min(MOST_STEPS, Math.max(1, Math.ceil(STEPS_PER_FRINGE * longest * reach)));
  const coarse = peakOnGrid(data, product, { east: 0, north: 0 }, reach / steps, steps);
  return peakOnGrid(data, product, coarse, reach / steps / FINER, FINER);
}

/** w conj(M) V by row. */
function weightedProduct(data: Visibilities, at: ModelVisibilities): ModelVisibilities {
  const sigma = complexSigma(data);
  const weight = sigma.map((value) => 1 / (value * value));
  return {
    re: weight.map((w, r) => w * (at.re[r] * data.re[r] + at.im[r] * data.im[r])),
    im: weight.map((w, r) => w * (at.re[r] * data.im[r] - at.im[r] * data.re[r])),
  };
}

/** The point of a square grid about a centre with the largest C; the first of several. */
function peakOnGrid(
  { u, v }: Visibilities,
  product: ModelVisibilities,
  centre: Place,
  step: number,
  steps: number,
): Place {
  const offsets = Array.from({ length: 2 * steps + 1 }, (_, k) => (k - steps) * step);
  const northRamps = offsets.map((offset) => rampOf(v, centre.north + offset));
  let best: Place = centre;
  let highest = Number.NEGATIVE_INFINITY;
  for (const offset of offsets) {
    const east = centre.east + offset;
    const { re, im } = times(product, rampOf(u, east));
    northRamps.forEach((north, k) => {
      let sum = 0;
      for (let r = 0; r < re.length; r++) sum += re[r] * north.re[r] - im[r] * north.im[r];
      if (!(sum > highest)) return;
      highest = sum;
      best = { east, north: centre.north + offsets[k] };
    });
  }
  return best;
}

/** exp(+2 pi i q s) by row. */
function rampOf(q: Float64Array, s: number): ModelVisibilities {
  const phase = q.map((value) => 2 * Math.PI * value * s);
  return { re: phase.map(cos), im: phase.map(sin) };
}

function times(a: ModelVisibilities, b: ModelVisibilities): ModelVisibilities {
  return {
    re: a.re.map((value, r) => value * b.re[r] - a.im[r] * b.im[r]),
    im: a.re.map((value, r) => value * b.im[r] + a.im[r] * b.re[r]),
  };
}
