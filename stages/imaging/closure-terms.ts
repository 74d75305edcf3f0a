/** Closure phases and log closure amplitudes as data terms. Closures of one scan that share a baseline are correlated;
 *  the residuals are whitened with the Cholesky factor of their covariance: r = L^-1 (model - observed), phases wrapped
 *  to (-pi, pi]. No gain or phase of a station enters. */

import type { Visibilities } from '../data.ts';
import {
  type Closure,
  type ClosureSet,
  closurePhase,
  logClosureAmplitude,
  wrapPhase,
} from '../numerics/closures.ts';
import { atan, atan2, cos, ln, sin } from '../numerics/elementary.ts';
import { applyInverse, applyInverseTransposed, cholesky, profileOf, solveLower } from '../numerics/linear.ts';
import { InternalError } from '../problem.ts';
import type { ModelVisibilities } from './linear-model.ts';
import { addResidual, logDerivatives, type Term } from './term.ts';

/** The closures of one kind in one scan, ready for use. */
interface Block {
  readonly scan: number;
  readonly closures: readonly Closure[];
  readonly observed: Float64Array;
  readonly L: Float64Array;
  /** Rows of the visibilities that the closures touch. */
  readonly rows: readonly number[];
  /** L^-1 A, closures by rows: turns derivatives of phases or log amplitudes into those of whitened residuals. */
  readonly whitening: Float64Array;
  /** Of L, for solving in place. */
  readonly profile: Int32Array;
  /** Visibilities to a closure; their places in `rows` and their signs, closure by closure. */
  readonly arity: number;
  readonly places: Int32Array;
  readonly signs: Float64Array;
  /** Cosine and minus the sine of every observed phase. */
  readonly turns: Float64Array;
  /** For `addBlockSlope`, by closure and by row. */
  readonly pull: Float64Array;
  readonly sums: Float64Array;
}

export function makeClosurePhaseTerm(data: Visibilities, sets: readonly ClosureSet[]): Term {
  const blocks = sets
    .filter((set) => set.triangles.length > 0)
    .map((set) =>
      makeBlock(set.scan, set.triangles, set.phaseCovariance, (c) => closurePhase(c, data.re, data.im)),
    );
  return closureTerm('closure phases', blocks, closurePhase, wrapPhase, 'phase');
}

export function makeLogClosureAmplitudeTerm(data: Visibilities, sets: readonly ClosureSet[]): Term {
  const blocks = sets
    .filter((set) => set.quadrangles.length > 0)
    .map((set) =>
      makeBlock(set.scan, set.quadrangles, set.logAmplitudeCovariance, (c) =>
        logClosureAmplitude(c, data.re, data.im),
      ),
    );
  return closureTerm('log closure amplitudes', blocks, logClosureAmplitude, (value) => value, 'amplitude');
}

function makeBlock(
  scan: number,
  closures: readonly Closure[],
  covariance: Float64Array,
  observe: (closure: Closure) => number,
): Block {
  const n = closures.length;
  const L = cholesky(covariance, n);
  if (!L)
    throw new InternalError('makeBlock', `the closures' covariance of scan ${scan} is not positive definite`);
  const rows = [...new Set(closures.flatMap((closure) => closure.rows))].sort((a, b) => a - b);
  const whitening = new Float64Array(n * rows.length);
  rows.forEach((row, m) => {
    const column = Float64Array.from(closures, (closure) => {
      const place = closure.rows.indexOf(row);
      return place < 0 ? 0 : closure.signs[place];
    });
    solveLower(L, column).forEach((value, t) => {
      whitening[t * rows.length + m] = value;
    });
  });
  const place = new Map(rows.map((row, m) => [row, m]));
  const values = Float64Array.from(closures, observe);
  return {
    scan,
    closures,
    observed: values,
    turns: Float64Array.from(Array.from(values).flatMap((value) => [cos(value), -sin(value)])),
    L,
    rows,
    whitening,
    profile: profileOf(L, n),
    arity: closures[0].rows.length,
    places: Int32Array.from(
      closures.flatMap((closure) => closure.rows),
      (row) => place.get(row) ?? -1,
    ),
    signs: Float64Array.from(closures.flatMap((closure) => closure.signs)),
    pull: new Float64Array(n),
    sums: new Float64Array(rows.length),
  };
}

function closureTerm(
  name: string,
  blocks: readonly Block[],
  evaluate: (closure: Closure, re: Float64Array, im: Float64Array) => number,
  wrap: (value: number) => number,
  part: 'phase' | 'amplitude',
): Term {
  const residuals = (block: Block, re: Float64Array, im: Float64Array) =>
    solveLower(
      block.L,
      Float64Array.from(block.closures, (closure, t) => wrap(evaluate(closure, re, im) - block.observed[t])),
    );
  const chiSquare: Term['chiSquare'] = (at) => {
    let sum = 0;
    for (const block of blocks) {
      for (const value of residuals(block, at.re, at.im)) sum += value * value;
    }
    return sum;
  };
  return {
    name,
    count: blocks.reduce((sum, block) => sum + block.closures.length, 0),
    scans: blocks.map((block) => block.scan),
    chiSquare,
    nuisances: () => 0,
    cost: (at) => chiSquare(at) / 2,
    expand(at, slopes, out) {
      const columns = out.gradient.length;
      const slope = new Float64Array(columns);
      for (const block of blocks) {
        const n = block.closures.length;
        const J = new Float64Array(n * columns);
        block.rows.forEach((row, m) => {
          logDerivatives(
            part === 'phase' ? null : slope,
            part === 'phase' ? slope : null,
            at,
            slopes,
            row,
            columns,
          );
          addWhitened(J, block, m, slope);
        });
        const r = residuals(block, at.re, at.im);
        for (let t = 0; t < n; t++) addResidual(out, r[t], J, t * columns);
      }
      return chiSquare(at) / 2;
    },
    adjoint: (at, out) =>
      blocks.reduce((cost, block) => cost + addBlockSlope(block, at, out, part === 'phase'), 0),
    only: (scans) =>
      closureTerm(
        name,
        blocks.filter((block) => scans.has(block.scan)),
        evaluate,
        wrap,
        part,
      ),
  };
}

/** Adds a block's derivatives by its visibilities; returns its cost. */
function addBlockSlope(
  block: Block,
  at: ModelVisibilities,
  out: ModelVisibilities,
  isPhase: boolean,
): number {
  const { rows, arity, places, signs, L, profile, pull, sums } = block;
  if (isPhase) writePhaseDifferences(block, at);
  else writeLogDifferences(block, at);
  applyInverse(L, pull, profile);
  let cost = 0;
  for (let t = 0; t < pull.length; t++) cost += (pull[t] * pull[t]) / 2;
  applyInverseTransposed(L, pull, profile);
  sums.fill(0);
  for (let t = 0; t < pull.length; t++) {
    for (let k = t * arity; k < (t + 1) * arity; k++) sums[places[k]] += signs[k] * pull[t];
  }
  for (let m = 0; m < rows.length; m++) {
    const row = rows[m];
    const re = at.re[row];
    const im = at.im[row];
    const square = re * re + im * im;
    const scale = square > 0 ? sums[m] / square : 0;
    // d arg V = (re d im - im d re) / |V|^2, d ln|V| = (re d re + im d im) / |V|^2.
    out.re[row] += isPhase ? -scale * im : scale * re;
    out.im[row] += isPhase ? scale * re : scale * im;
  }
  return cost;
}

/** pull[t] = model less observed phase in (-pi, pi]: the angle of the product of the visibilities, or their conjugates, with
 *  one of the observed phase taken off. */
function writePhaseDifferences(
  { rows, arity, places, signs, pull, turns }: Block,
  { re, im }: ModelVisibilities,
): void {
  for (let t = 0; t < pull.length; t++) {
    let a = turns[2 * t];
    let b = turns[2 * t + 1];
    for (let k = t * arity; k < (t + 1) * arity; k++) {
      const row = rows[places[k]];
      const c = re[row];
      const d = signs[k] > 0 ? im[row] : -im[row];
      const real = a * c - b * d;
      b = a * d + b * c;
      a = real;
    }
    pull[t] = a > 0 ? atan(b / a) : atan2(b, a);
  }
}

/** Each visibility is in several closures: its logarithm is taken once. */
function writeLogDifferences(
  { rows, arity, places, signs, pull, sums, observed }: Block,
  { re, im }: ModelVisibilities,
): void {
  for (let m = 0; m < rows.length; m++) {
    const [a, b] = [re[rows[m]], im[rows[m]]];
    sums[m] = ln(a * a + b * b) / 2;
  }
  for (let t = 0; t < pull.length; t++) {
    let sum = -observed[t];
    for (let k = t * arity; k < (t + 1) * arity; k++) sum += signs[k] * sums[places[k]];
    pull[t] = sum;
  }
}

/** J[t] += whitening[t, m] * slope for every closure t. */
function addWhitened(J: Float64Array, block: Block, m: number, slope: Float64Array): void {
  const columns = slope.length;
  for (let t = 0; t < block.closures.length; t++) {
    const weight = block.whitening[t * block.rows.length + m];
    if (weight === 0) continue;
    for (let k = 0; k < columns; k++) J[t * columns + k] += weight * slope[k];
  }
}
