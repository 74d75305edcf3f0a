/** The method's own error from trials: for each quantity, measured less true is
 *
 *    error_i = a + b (measured_i - centre) + scatter + the posterior's own error,
 *
 *  a and b by weighted least squares with a prior on the slope, the scatter so that chi-square is its degrees of freedom
 *  (Paule and Mandel 1982, J. Res. Natl. Bur. Stand. 87, 377). A value is corrected by a + b (value - centre); what the
 *  correction does not know is the scatter, and the error of a and b. */

import { leastSquares } from '../numerics/linear.ts';
import { angleDifference, mean } from '../numerics/statistics.ts';
import { LEAST_RINGS } from './ring-numbers.ts';
import { QUANTITIES, type Quantity, type Trial } from './trial.ts';

export interface BiasOfQuantity {
  /** Measured less true, at the centre and per unit of what was measured. */
  readonly offset: number;
  readonly slope: number;
  readonly centre: number;
  /** Variances and covariance of offset and slope. */
  readonly covariance: readonly [number, number, number];
  /** Standard deviation of the error beyond the posterior's own. */
  readonly scatter: number;
  readonly trials: number;
}

export type MethodBias = Readonly<Record<Quantity, BiasOfQuantity>>;

/** Prior standard deviation of the slope: a fraction of what was measured. */
const SLOPE_PRIOR = 0.2;
const LEAST_TRIALS = 4;

/** Null with fewer than four trials that have a ring in truth and in most of the draws. */
export function biasOf(trials: readonly Trial[]): MethodBias | null {
  const used = trials.filter(
    ({ truth, measured, ringFraction }) => truth !== null && measured !== null && ringFraction >= LEAST_RINGS,
  );
  if (used.length < LEAST_TRIALS) return null;
  return Object.fromEntries(QUANTITIES.map((name) => [name, biasOfQuantity(used, name)])) as MethodBias;
}

function biasOfQuantity(trials: readonly Trial[], name: Quantity): BiasOfQuantity {
  const rows = trials.map(({ truth, measured }) => {
    const [m, t] = [
      (measured as NonNullable<Trial['measured']>)[name],
      (truth as NonNullable<Trial['truth']>)[name],
    ];
    const error = name === 'position-angle' ? angleDifference(m.value, t) : m.value - t;
    return { value: m.value, error, variance: m.deviation * m.deviation };
  });
  // An angle's error does not depend on the angle.
  const hasSlope = name !== 'position-angle';
  const centre = hasSlope ? mean(rows.map(({ value }) => value)) : 0;
  let [low, high] = [0, mean(rows.map(({ error }) => error * error)) * 4 + 1e-12];
  const at = (extra: number) => solve(rows, centre, hasSlope, extra);
  const degrees = rows.length - 1;
  if (at(0).chiSquare <= degrees) high = 0;
  // Bisection: chi-square falls with the scatter.
  for (let k = 0; k < 50 && high > 0; k++) {
    const middle = (low + high) / 2;
    if (at(middle).chiSquare > degrees) low = middle;
    else high = middle;
  }
  const { offset, slope, covariance } = at(high);
  return { offset, slope, centre, covariance, scatter: Math.sqrt(high), trials: rows.length };
}

interface Row {
  readonly value: number;
  readonly error: number;
  readonly variance: number;
}

function solve(rows: readonly Row[], centre: number, hasSlope: boolean, extra: number) {
  const n = 2;
  const A = new Float64Array((rows.length + 1) * n);
  const b = new Float64Array(rows.length + 1);
  rows.forEach(({ value, error, variance }, i) => {
    const weight = 1 / Math.sqrt(variance + extra + 1e-18);
    A[i * n] = weight;
    A[i * n + 1] = hasSlope ? weight * (value - centre) : 0;
    b[i] = weight * error;
  });
  A[rows.length * n + 1] = 1 / SLOPE_PRIOR;
  const found = leastSquares(A, b, n);
  if (found === null) return { offset: 0, slope: 0, covariance: [0, 0, 0] as const, chiSquare: 0 };
  const [offset, slope] = found.solution;
  const [a, c, , d] = found.inverse;
  return {
    offset,
    slope,
    covariance: hasSlope ? ([a, d, c] as const) : ([a, 0, 0] as const),
    chiSquare: found.residualSquares,
  };
}

/** What to take from a value, and the standard deviation of what is left. */
export function correctionAt(
  bias: BiasOfQuantity,
  value: number,
): { readonly shift: number; readonly deviation: number } {
  const from = value - bias.centre;
  const [varianceOfOffset, varianceOfSlope, covariance] = bias.covariance;
  const ofLine = varianceOfOffset + from * from * varianceOfSlope + 2 * from * covariance;
  return {
    shift: bias.offset + bias.slope * from,
    deviation: Math.sqrt(bias.scatter * bias.scatter + Math.max(0, ofLine)),
  };
}
