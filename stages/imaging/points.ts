/** The points of the Fourier plane at which a fit needs the model: the rows of the visibilities, then those of squared
 *  visibilities, then the three of every triple product, and last the origin, where the total flux stands: optical data
 *  are normalised with it. */

import type { Visibilities } from '../data.ts';

export interface Points {
  /** Wavelengths. */
  readonly u: Float64Array;
  readonly v: Float64Array;
  /** Number of the first point of the squared visibilities, of the triple products, and of the origin. */
  readonly squared: number;
  readonly triples: number;
  /** Past the end where there are no optical data. */
  readonly origin: number;
}

export function pointsOf({ count, u, v, squared, triples }: Visibilities): Points {
  const [squares, products] = [squared?.count ?? 0, triples?.count ?? 0];
  const origin = count + squares + 3 * products;
  const isOptical = squares + products > 0;
  if (!isOptical) return { u, v, squared: count, triples: count, origin };
  const [outU, outV] = [new Float64Array(origin + 1), new Float64Array(origin + 1)];
  outU.set(u);
  outV.set(v);
  if (squared) {
    outU.set(squared.u, count);
    outV.set(squared.v, count);
  }
  for (let t = 0; triples && t < products; t++) {
    const [a, b, c, d] = [triples.u1[t], triples.v1[t], triples.u2[t], triples.v2[t]];
    outU.set([a, c, a + c], count + squares + 3 * t);
    outV.set([b, d, b + d], count + squares + 3 * t);
  }
  return { u: outU, v: outV, squared: count, triples: count + squares, origin };
}
