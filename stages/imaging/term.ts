/** What a data term is: half a sum of squares of whitened residuals, with its expansion to second order (curvature by
 *  Gauss and Newton). */

import type { ModelVisibilities, Slopes } from './linear-model.ts';

export interface Expansion {
  /** length columns */
  readonly gradient: Float64Array;
  /** columns on a side; terms add to the lower triangle only. */
  readonly curvature: Float64Array;
}

/** Visibilities that a term has been given do not change afterwards: what it found out about them it may keep. */
export interface Term {
  readonly name: string;
  /** Number of measurements. */
  readonly count: number;
  /** Numbers of the scans that it holds, rising. */
  readonly scans: readonly number[];
  cost(at: ModelVisibilities): number;
  /** Adds gradient and curvature by x; returns the cost. @param slopes  derivatives of `at` */
  expand(at: ModelVisibilities, slopes: Slopes, out: Expansion): number;
  /** Adds the derivatives of the cost by real and imaginary part of every visibility; returns the cost. Nuisances are at
   *  their optimum, as in `cost`. */
  adjoint(at: ModelVisibilities, out: ModelVisibilities): number;
  /** The term on some of its scans. */
  only(scans: ReadonlySet<number>): Term;
  /** Chi-square of the measurements alone, without penalties of nuisances. */
  chiSquare(at: ModelVisibilities): number;
  /** How many parameters the term's nuisances take up; 0 when it has none. */
  nuisances(at: ModelVisibilities): number;
}

export function makeExpansion(columns: number): Expansion {
  return { gradient: new Float64Array(columns), curvature: new Float64Array(columns * columns) };
}

/** Adds one whitened residual r with derivatives J[start …]: gradient += r J, curvature += J J^T (lower triangle). */
export function addResidual(out: Expansion, residual: number, J: Float64Array, start: number): void {
  const columns = out.gradient.length;
  const { gradient, curvature } = out;
  for (let i = 0; i < columns; i++) {
    const slope = J[start + i];
    gradient[i] += residual * slope;
    const row = i * columns;
    for (let j = 0; j <= i; j++) curvature[row + j] += slope * J[start + j];
  }
}

/** Copies the lower triangle to the upper one. */
export function mirror({ gradient, curvature }: Expansion): void {
  const n = gradient.length;
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < i; j++) curvature[j * n + i] = curvature[i * n + j];
  }
}

/** Writes the derivatives of ln V_r, length columns: real part d ln|V|, imaginary part d arg V. Zero where V is. */
export function logDerivatives(
  outRe: Float64Array | null,
  outIm: Float64Array | null,
  at: ModelVisibilities,
  slopes: Slopes,
  r: number,
  columns: number,
): void {
  const a = at.re[r];
  const b = at.im[r];
  const square = a * a + b * b;
  const scale = square > 0 ? 1 / square : 0;
  const start = r * slopes.columns;
  for (let k = 0; k < columns; k++) {
    const p = slopes.re[start + k];
    const q = slopes.im[start + k];
    if (outRe) outRe[k] = (a * p + b * q) * scale;
    if (outIm) outIm[k] = (a * q - b * p) * scale;
  }
}
