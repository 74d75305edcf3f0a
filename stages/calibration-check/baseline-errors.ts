/** The one error of one baseline, the same in every scan, that explains the differences of closures from a model best: a
 *  test for outliers after station phases and gains have been set free (Baarda 1968, A testing procedure for use in
 *  geodetic networks, Netherlands Geodetic Commission, Publications on Geodesy 2(5)). With d the differences of an
 *  independent set of closures of a scan, C their covariance, a the signs with which baseline ij enters them:
 *    estimate = Σ aᵀC⁻¹d / Σ aᵀC⁻¹a,   error = 1 / sqrt(Σ aᵀC⁻¹a),   sums over scans.
 *  An error of one baseline stands in the estimates of its neighbours by a part, so the largest over its error is named. */

import {
  type Closure,
  type ClosureData,
  type ClosureSet,
  closurePhase,
  logClosureAmplitude,
  wrapPhase,
} from '../numerics/closures.ts';
import { choleskyNearby, solveLower } from '../numerics/linear.ts';
import { median, normalQuantile } from '../numerics/statistics.ts';

export interface BaselineError {
  readonly station1: number;
  readonly station2: number;
  /** Radians, or log amplitude. */
  readonly estimate: number;
  /** With the scatter of all differences where that is above the stated errors. */
  readonly error: number;
  readonly scans: number;
}

export interface BaselineErrors {
  readonly errors: readonly BaselineError[];
  /** Independent closures. */
  readonly closures: number;
  /** Of all differences over their errors, by their median size. */
  readonly scatter: number;
  /** The same when the error of the most significant baseline is taken out: near 1 where that was all. */
  readonly remaining: number;
}

/** The estimate over its error, without its sign. */
export function significance({ estimate, error }: BaselineError): number {
  return Math.abs(estimate) / error;
}

interface Values {
  readonly re: Float64Array;
  readonly im: Float64Array;
}

/** Independent closures of one scan with their covariance, row by row. */
export interface ClosuresOfScan {
  readonly closures: readonly Closure[];
  readonly covariance: Float64Array;
}

/** Phase errors by baseline, radians. @param model  visibilities of the model by row of the data */
export function baselinePhases(
  data: ClosureData,
  sets: readonly ClosureSet[],
  model: Values,
): BaselineErrors {
  const difference = (closure: Closure) =>
    wrapPhase(closurePhase(closure, data.re, data.im) - closurePhase(closure, model.re, model.im));
  return errorsOf(
    data,
    sets.map((set) => ({ closures: set.triangles, covariance: set.phaseCovariance })),
    difference,
  );
}

/** Log amplitude errors by baseline. */
export function baselineAmplitudes(
  data: ClosureData,
  sets: readonly ClosureSet[],
  model: Values,
): BaselineErrors {
  const difference = (closure: Closure) =>
    logClosureAmplitude(closure, data.re, data.im) - logClosureAmplitude(closure, model.re, model.im);
  return errorsOf(
    data,
    sets.map((set) => ({ closures: set.quadrangles, covariance: set.logAmplitudeCovariance })),
    difference,
  );
}

interface WhitenedScan {
  /** Differences over their errors, independent. */
  readonly d: Float64Array;
  /** How an error of one enters them, by baseline. */
  readonly signs: ReadonlyMap<string, Float64Array>;
}

/** Errors by baseline of what differs in closures. */
export function errorsOf(
  data: Pick<ClosureData, 'station1' | 'station2'>,
  sets: readonly ClosuresOfScan[],
  difference: (closure: Closure) => number,
): BaselineErrors {
  const sums = new Map<string, { i: number; j: number; along: number; weight: number; scans: number }>();
  const scans: WhitenedScan[] = [];
  for (const { closures, covariance } of sets) {
    const L = choleskyNearby(covariance, closures.length);
    if (L === null || closures.length === 0) continue;
    const d = solveLower(L, Float64Array.from(closures, difference));
    const signs = new Map<string, Float64Array>();
    scans.push({ d, signs });
    for (const row of new Set(closures.flatMap(({ rows }) => rows))) {
      const a = solveLower(
        L,
        Float64Array.from(closures, (closure) => signOf(closure, row)),
      );
      const [i, j] = [data.station1[row], data.station2[row]];
      signs.set(`${i}-${j}`, a);
      const sum = sums.get(`${i}-${j}`) ?? { i, j, along: 0, weight: 0, scans: 0 };
      for (let k = 0; k < a.length; k++) {
        sum.along += a[k] * d[k];
        sum.weight += a[k] * a[k];
      }
      sum.scans++;
      sums.set(`${i}-${j}`, sum);
    }
  }
  const scatter = scatterOf(scans.map(({ d }) => d));
  const errors = [...sums.values()].map(({ i, j, along, weight, scans }) => ({
    station1: i,
    station2: j,
    estimate: along / weight,
    error: Math.max(1, scatter) / Math.sqrt(weight),
    scans,
  }));
  const remaining = errors.length === 0 ? scatter : scatterWithout(scans, mostSignificant(errors));
  return { errors, closures: scans.reduce((count, { d }) => count + d.length, 0), scatter, remaining };
}

export function mostSignificant(errors: readonly BaselineError[]): BaselineError {
  return errors.reduce((a, b) => (significance(b) > significance(a) ? b : a));
}

/** By the median size of independent values; 0 of none. */
function scatterOf(values: readonly Float64Array[]): number {
  const sizes = values.flatMap((d) => Array.from(d, Math.abs));
  return sizes.length === 0 ? 0 : median(sizes) / normalQuantile(0.75);
}

function scatterWithout(
  scans: readonly WhitenedScan[],
  { station1, station2, estimate }: BaselineError,
): number {
  return scatterOf(
    scans.map(({ d, signs }) => {
      const a = signs.get(`${station1}-${station2}`);
      return a === undefined ? d : d.map((value, k) => value - estimate * a[k]);
    }),
  );
}

function signOf({ rows, signs }: Closure, row: number): number {
  const at = rows.indexOf(row);
  return at < 0 ? 0 : signs[at];
}
