/** The gains of one scan at their optimum, for given visibilities of the model; amplitude-term.ts has the cost. */

import type { Visibilities } from '../data.ts';
import { exp } from '../numerics/elementary.ts';
import { applyInverse, applyInverseTransposed, factorise, invertCholesky } from '../numerics/linear.ts';
import type { ModelVisibilities } from './linear-model.ts';
import { riceMean } from './rice.ts';

/** Log gains of the stations of one scan at the optimum, with their conditional standard deviations. */
export interface ScanGains {
  readonly scan: number;
  /** Indices of the stations. */
  readonly stations: readonly number[];
  readonly logGains: Float64Array;
  readonly deviations: Float64Array;
}

export interface Scan {
  readonly scan: number;
  readonly rows: readonly number[];
  readonly stations: readonly number[];
  /** Places of the two stations of each row in `stations`. */
  readonly first: Int32Array;
  readonly second: Int32Array;
}

export interface Solved {
  readonly g: Float64Array;
  /** Whitened residuals by row of the scan. */
  readonly residuals: Float64Array;
  /** d residual / d ln(e^{g_i+g_j}|M|). */
  readonly slopes: Float64Array;
  /** Cholesky factor of the gains' curvature. */
  readonly L: Float64Array;
}

/** Newton steps for the gains of a scan; from zero five are usual. */
const MOST_STEPS = 40;

/** Largest change of a log gain in one step: keeps the first steps inside the region of convergence. */
const LARGEST_STEP = 0.5;

const TOLERANCE = 1e-10;

export function groupByScan(data: Visibilities): Scan[] {
  const rowsOf = new Map<number, number[]>();
  for (let r = 0; r < data.count; r++) {
    const rows = rowsOf.get(data.scan[r]);
    if (rows) rows.push(r);
    else rowsOf.set(data.scan[r], [r]);
  }
  const scans = [...rowsOf].sort(([a], [b]) => a - b);
  return scans.map(([scan, rows]) => {
    const present = rows.flatMap((r) => [data.station1[r], data.station2[r]]);
    const stations = [...new Set(present)].sort((a, b) => a - b);
    const places = (list: Int32Array) => Int32Array.from(rows, (r) => stations.indexOf(list[r]));
    return { scan, rows, stations, first: places(data.station1), second: places(data.station2) };
  });
}

/** The gains that minimise the scan's cost, by damped Newton steps from zero; by Gauss and Newton's curvature where the whole
 *  one is not positive definite. */
export function solveGains(
  scan: Scan,
  at: ModelVisibilities,
  sigma: Float64Array,
  amplitudes: Float64Array,
  deviations: Float64Array,
): Solved {
  const { rows, stations, first, second } = scan;
  const n = stations.length;
  const g = new Float64Array(n);
  const residuals = new Float64Array(rows.length);
  const slopes = new Float64Array(rows.length);
  const sizes = Float64Array.from(
    rows,
    (r) => Math.sqrt(at.re[r] * at.re[r] + at.im[r] * at.im[r]) / sigma[r],
  );
  const L = new Float64Array(n * n);
  const whole = new Float64Array(n * n);
  const change = new Float64Array(n);
  const profile = new Int32Array(n);
  const factors = new Float64Array(n);
  for (let step = 0; step < MOST_STEPS; step++) {
    L.fill(0);
    whole.fill(0);
    for (let i = 0; i < n; i++) {
      const weight = 1 / (deviations[stations[i]] * deviations[stations[i]]);
      L[i * n + i] = weight;
      whole[i * n + i] = weight;
      change[i] = weight * g[i];
      factors[i] = exp(g[i]);
    }
    for (let m = 0; m < rows.length; m++) {
      const r = rows[m];
      const i = first[m];
      const j = second[m];
      const nu = sizes[m] * factors[i] * factors[j];
      const [mean, slope] = riceMean(nu);
      const residual = mean - amplitudes[r] / sigma[r];
      residuals[m] = residual;
      const d = nu * slope;
      slopes[m] = d;
      change[i] += residual * d;
      change[j] += residual * d;
      const square = d * d;
      const place = i > j ? i * n + j : j * n + i;
      L[i * n + i] += square;
      L[j * n + j] += square;
      L[place] += square;
      // d (nu slope) / d ln nu by the equation of rice.ts.
      const curved = square + residual * nu * nu * (mean - nu * slope);
      whole[i * n + i] += curved;
      whole[j * n + j] += curved;
      whole[place] += curved;
    }
    // Of a model that is no number; its cost is none either.
    if (!factorise(L, n)) break;
    const factor = factorise(whole, n) ? whole : L;
    applyInverse(factor, change, profile);
    applyInverseTransposed(factor, change, profile);
    let largest = 0;
    for (let i = 0; i < n; i++) largest = Math.max(largest, Math.abs(change[i]));
    if (!(largest > TOLERANCE)) break;
    const scale = Math.min(1, LARGEST_STEP / largest);
    for (let i = 0; i < n; i++) g[i] -= scale * change[i];
  }
  return { g, residuals, slopes, L };
}

export function scanCost(scan: Scan, { g, residuals }: Solved, deviations: Float64Array): number {
  let sum = squares(residuals);
  for (let i = 0; i < g.length; i++) {
    const scaled = g[i] / deviations[scan.stations[i]];
    sum += scaled * scaled;
  }
  return sum / 2;
}

/** Sum over stations of 1 - posterior variance / prior variance. */
export function effectiveGains(scan: Scan, L: Float64Array, deviations: Float64Array): number {
  const n = scan.stations.length;
  const inverse = invertCholesky(L, n);
  let sum = 0;
  for (let i = 0; i < n; i++) {
    const tau = deviations[scan.stations[i]];
    sum += 1 - inverse[i * n + i] / (tau * tau);
  }
  return sum;
}

/** The sum of squares. */
export function squares(values: Float64Array): number {
  let sum = 0;
  for (const value of values) sum += value * value;
  return sum;
}
