/** The centroid as a nuisance of complex visibilities. Images of a basis have theirs at the origin; a source whose
 *  centroid lies at (x0, y0), east and north of the phase centre, has
 *
 *    V(u,v) = M(u,v) exp(-2 pi i (u x0 + v y0))         M of the image; shift theorem: Bracewell, ch. 6; sign: CONVENTIONS
 *    dV/dx0 = -2 pi i u V,   dV/dy0 = -2 pi i v V
 *
 *  x0 and y0 stand at the end of the whitened parameters, over the standard deviation of their prior. Closures and
 *  amplitudes do not change with them. */

import { cos, sin } from '../numerics/elementary.ts';
import type { LinearModel, ModelVisibilities, Slopes } from './linear-model.ts';
import { type Expansion, makeExpansion } from './term.ts';

/** What turns an image's visibilities into those of the source at its place. */
export interface Ramp {
  /** Standard deviation of the prior of either coordinate, radians. */
  readonly scale: number;
  /** Wavelengths, by row. */
  readonly u: Float64Array;
  readonly v: Float64Array;
}

/** Radians, east and north of the phase centre. */
export interface Place {
  readonly east: number;
  readonly north: number;
}

const TURN = 2 * Math.PI;

/** The parameters of flux and coefficients: all, or all but the last two. */
export function linearPart({ ramp }: LinearModel, x: Float64Array): Float64Array {
  return ramp ? x.subarray(0, x.length - 2) : x;
}

/** The place that parameters stand for; null where it is no parameter. */
export function placeAt({ ramp }: LinearModel, x: Float64Array): Place | null {
  return ramp && { east: ramp.scale * x[x.length - 2], north: ramp.scale * x[x.length - 1] };
}

/** Parameters with those of a place behind them; `linear` itself where the place is no parameter. */
export function withPlace({ ramp }: LinearModel, linear: Float64Array, place: Place): Float64Array {
  return ramp ? Float64Array.of(...linear, place.east / ramp.scale, place.north / ramp.scale) : linear;
}

/** Visibilities of the image moved to a place. */
export function moved(
  { re, im }: ModelVisibilities,
  { u, v }: Ramp,
  { east, north }: Place,
): ModelVisibilities {
  const outRe = new Float64Array(re.length);
  const outIm = new Float64Array(re.length);
  for (let r = 0; r < re.length; r++) {
    const phase = -TURN * (u[r] * east + v[r] * north);
    const [c, s] = [cos(phase), sin(phase)];
    outRe[r] = re[r] * c - im[r] * s;
    outIm[r] = re[r] * s + im[r] * c;
  }
  return { re: outRe, im: outIm };
}

/** Derivatives of the visibilities by the parameters, at x: the model's own columns, or those turned by the ramp with
 *  two more for the place. @param at  visibilities at x */
export function slopesAt(model: LinearModel, x: Float64Array, at: ModelVisibilities): Slopes {
  const place = placeAt(model, x);
  const { ramp } = model;
  if (!(ramp && place)) return model;
  const columns = x.length;
  const re = new Float64Array(model.count * columns);
  const im = new Float64Array(model.count * columns);
  for (let r = 0; r < model.count; r++) {
    const phase = -TURN * (ramp.u[r] * place.east + ramp.v[r] * place.north);
    const [c, s] = [cos(phase), sin(phase)];
    const [from, to] = [r * model.columns, r * columns];
    for (let k = 0; k < columns - 2; k++) {
      re[to + k] = model.re[from + k] * c - model.im[from + k] * s;
      im[to + k] = model.re[from + k] * s + model.im[from + k] * c;
    }
    [ramp.u[r], ramp.v[r]].forEach((q, axis) => {
      const k = to + columns - 2 + axis;
      re[k] = TURN * q * ramp.scale * at.im[r];
      im[k] = -TURN * q * ramp.scale * at.re[r];
    });
  }
  return { columns, re, im };
}

/** Adds to `out` what depends on flux and coefficients alone; returns its cost. */
export function expandLinear(
  expand: (linear: Float64Array, out: Expansion) => number,
  linear: Float64Array,
  out: Expansion,
): number {
  const [n, columns] = [linear.length, out.gradient.length];
  if (n === columns) return expand(linear, out);
  const own = makeExpansion(n);
  const cost = expand(linear, own);
  for (let i = 0; i < n; i++) {
    out.gradient[i] += own.gradient[i];
    for (let j = 0; j <= i; j++) out.curvature[i * columns + j] += own.curvature[i * n + j];
  }
  return cost;
}
