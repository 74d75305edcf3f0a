/** Amplitudes as a data term, with one gain per station and scan as a nuisance:
 *
 *    residual   (E|e^{g_i + g_j} M + n| - A) / sigma,   the mean under noise from rice.ts
 *    penalty    g_i^2 / tau_i^2 / 2                     Gaussian prior on the logarithm of each gain
 *
 *  For given model visibilities M the gains of a scan are set to their optimum; their curvature is taken out of that of
 *  the parameters by the Schur complement (variable projection: Golub and Pereyra 1973, SIAM J. Numer. Anal. 10, 413),
 *  which in the Gaussian approximation is the marginalisation over them. */

import type { Visibilities } from '../data.ts';
import { exp } from '../numerics/elementary.ts';
import {
  applyInverse,
  applyInverseTransposed,
  factorise,
  invertCholesky,
  solveLower,
} from '../numerics/linear.ts';
import type { ModelVisibilities, Slopes } from './linear-model.ts';
import { riceMean } from './rice.ts';
import { addResidual, type Expansion, logDerivatives, type Term } from './term.ts';

/** Log gains of the stations of one scan at the optimum, with their conditional standard deviations. */
export interface ScanGains {
  readonly scan: number;
  /** Indices of the stations. */
  readonly stations: readonly number[];
  readonly logGains: Float64Array;
  readonly deviations: Float64Array;
}

export interface AmplitudeTerm extends Term {
  gains(at: ModelVisibilities): ScanGains[];
  /** The same term with the gains as parameters. */
  explicit(): ExplicitGains;
  only(scans: ReadonlySet<number>): AmplitudeTerm;
}

/** Gains as parameters h, one per station and scan: the log gain over the standard deviation of its prior, which is not
 *  part of the cost here. In the order of the scans and, in each, of its stations, as `gains` gives them. */
export interface ExplicitGains {
  readonly count: number;
  /** Standard deviation of each gain's prior. */
  readonly scales: Float64Array;
  /** From what `gains` gives. */
  whitened(gains: readonly ScanGains[]): Float64Array;
  /** The cost of the data; adds its derivatives by the visibilities and by h. */
  adjoint(at: ModelVisibilities, h: Float64Array, out: ModelVisibilities, outGains: Float64Array): number;
  /** Residuals' derivatives by ln|V| of their row and by the gains of its two stations, for the curvature. */
  visit(
    at: ModelVisibilities,
    h: Float64Array,
    use: (
      row: number,
      slope: number,
      first: number,
      second: number,
      scales: readonly [number, number],
    ) => void,
  ): void;
}

interface Scan {
  readonly scan: number;
  readonly rows: readonly number[];
  readonly stations: readonly number[];
  /** Places of the two stations of each row in `stations`. */
  readonly first: Int32Array;
  readonly second: Int32Array;
}

interface Solved {
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

/** @param deviations  prior standard deviation of each station's log gain, by station index */
export function makeAmplitudeTerm(data: Visibilities, deviations: Float64Array): AmplitudeTerm {
  const amplitudes = data.re.map((re, r) => Math.sqrt(re * re + data.im[r] * data.im[r]));
  return amplitudeTerm(data, amplitudes, deviations, groupByScan(data));
}

function groupByScan(data: Visibilities): Scan[] {
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

function amplitudeTerm(
  data: Visibilities,
  amplitudes: Float64Array,
  deviations: Float64Array,
  scans: readonly Scan[],
): AmplitudeTerm {
  // A step is costed first and expanded when it is taken: the gains at the same visibilities are the same.
  let last: { at: ModelVisibilities; solved: Map<Scan, Solved> } | null = null;
  const solve = (scan: Scan, at: ModelVisibilities) => {
    if (last?.at !== at) last = { at, solved: new Map() };
    const solved = last.solved.get(scan) ?? solveGains(scan, at, data.sigma, amplitudes, deviations);
    last.solved.set(scan, solved);
    return solved;
  };
  const sumOver = (value: (scan: Scan) => number) => scans.reduce((sum, scan) => sum + value(scan), 0);
  return {
    name: 'amplitudes with gains',
    count: sumOver((scan) => scan.rows.length),
    scans: scans.map(({ scan }) => scan),
    chiSquare: (at) => sumOver((scan) => squares(solve(scan, at).residuals)),
    cost: (at) => sumOver((scan) => scanCost(scan, solve(scan, at), deviations)),
    nuisances: (at) => sumOver((scan) => effectiveGains(scan, solve(scan, at).L, deviations)),
    gains: (at) =>
      scans.map((scan) => {
        const { g, L } = solve(scan, at);
        const n = g.length;
        const inverse = invertCholesky(L, n);
        const sd = Float64Array.from({ length: n }, (_, i) => Math.sqrt(inverse[i * n + i]));
        return { scan: scan.scan, stations: scan.stations, logGains: g, deviations: sd };
      }),
    expand: (at, slopes, out) =>
      sumOver((scan) => {
        const solved = solve(scan, at);
        expandScan(scan, solved, at, slopes, out);
        return scanCost(scan, solved, deviations);
      }),
    adjoint: (at, out) =>
      sumOver((scan) => {
        const solved = solve(scan, at);
        // At the gains' optimum the cost does not change with them.
        scan.rows.forEach((r, m) => {
          addAmplitudeSlope(out, at, r, solved.residuals[m] * solved.slopes[m]);
        });
        return scanCost(scan, solved, deviations);
      }),
    explicit: () => explicitGains(data, amplitudes, deviations, scans),
    only: (wanted) =>
      amplitudeTerm(
        data,
        amplitudes,
        deviations,
        scans.filter(({ scan }) => wanted.has(scan)),
      ),
  };
}

function explicitGains(
  data: Visibilities,
  amplitudes: Float64Array,
  deviations: Float64Array,
  scans: readonly Scan[],
): ExplicitGains {
  const links = linksOf(scans, deviations);
  const { count, row, first, second, scales } = links;
  const { sigma } = data;
  const factors = new Float64Array(count);
  return {
    count,
    scales,
    whitened: (gains) =>
      Float64Array.from(
        gains.flatMap(({ stations, logGains }) =>
          stations.map((station, i) => logGains[i] / deviations[station]),
        ),
      ),
    adjoint(at, h, out, outGains) {
      for (let i = 0; i < count; i++) factors[i] = exp(scales[i] * h[i]);
      let cost = 0;
      for (let m = 0; m < row.length; m++) {
        const r = row[m];
        const i = first[m];
        const j = second[m];
        const size = Math.sqrt(at.re[r] * at.re[r] + at.im[r] * at.im[r]) / sigma[r];
        const nu = size * factors[i] * factors[j];
        const [mean, slope] = riceMean(nu);
        const residual = mean - amplitudes[r] / sigma[r];
        const pull = residual * nu * slope;
        cost += (residual * residual) / 2;
        outGains[i] += scales[i] * pull;
        outGains[j] += scales[j] * pull;
        addAmplitudeSlope(out, at, r, pull);
      }
      return cost;
    },
    visit(at, h, use) {
      for (let m = 0; m < row.length; m++) {
        const [r, i, j] = [row[m], first[m], second[m]];
        const size = Math.sqrt(at.re[r] * at.re[r] + at.im[r] * at.im[r]) / sigma[r];
        const nu = size * exp(scales[i] * h[i] + scales[j] * h[j]);
        use(r, nu * riceMean(nu)[1], i, j, [scales[i], scales[j]]);
      }
    },
  };
}

/** Rows with the numbers of their two gains; and of each gain the standard deviation of its prior. */
function linksOf(scans: readonly Scan[], deviations: Float64Array) {
  const row: number[] = [];
  const first: number[] = [];
  const second: number[] = [];
  const scales: number[] = [];
  for (const scan of scans) {
    const start = scales.length;
    row.push(...scan.rows);
    for (const place of scan.first) first.push(start + place);
    for (const place of scan.second) second.push(start + place);
    for (const station of scan.stations) scales.push(deviations[station]);
  }
  return {
    count: scales.length,
    row: Int32Array.from(row),
    first: Int32Array.from(first),
    second: Int32Array.from(second),
    scales: Float64Array.from(scales),
  };
}

/** Adds pull * d ln|V|. */
function addAmplitudeSlope(out: ModelVisibilities, at: ModelVisibilities, r: number, pull: number): void {
  const square = at.re[r] * at.re[r] + at.im[r] * at.im[r];
  if (!(square > 0)) return;
  out.re[r] += (pull * at.re[r]) / square;
  out.im[r] += (pull * at.im[r]) / square;
}

/** The gains that minimise the scan's cost, by damped Newton steps from zero; by Gauss and Newton's curvature where the whole
 *  one is not positive definite. */
function solveGains(
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

function expandScan(scan: Scan, solved: Solved, at: ModelVisibilities, slopes: Slopes, out: Expansion): void {
  const columns = out.gradient.length;
  const n = scan.stations.length;
  const J = new Float64Array(columns);
  const cross = new Float64Array(n * columns);
  for (let m = 0; m < scan.rows.length; m++) {
    logDerivatives(J, null, at, slopes, scan.rows[m], columns);
    const d = solved.slopes[m];
    const i = scan.first[m] * columns;
    const j = scan.second[m] * columns;
    for (let k = 0; k < columns; k++) {
      J[k] *= d;
      cross[i + k] += d * J[k];
      cross[j + k] += d * J[k];
    }
    addResidual(out, solved.residuals[m], J, 0);
  }
  takeOut(out.curvature, solved.L, cross, n, columns);
}

/** curvature -= cross^T (L L^T)^-1 cross, lower triangle. */
function takeOut(
  curvature: Float64Array,
  L: Float64Array,
  cross: Float64Array,
  n: number,
  columns: number,
): void {
  const white = new Float64Array(n * columns);
  const column = new Float64Array(n);
  for (let k = 0; k < columns; k++) {
    for (let i = 0; i < n; i++) column[i] = cross[i * columns + k];
    solveLower(L, column).forEach((value, i) => {
      white[i * columns + k] = value;
    });
  }
  for (let i = 0; i < n; i++) {
    for (let k = 0; k < columns; k++) {
      const value = white[i * columns + k];
      for (let l = 0; l <= k; l++) curvature[k * columns + l] -= value * white[i * columns + l];
    }
  }
}

function scanCost(scan: Scan, { g, residuals }: Solved, deviations: Float64Array): number {
  let sum = squares(residuals);
  for (let i = 0; i < g.length; i++) {
    const scaled = g[i] / deviations[scan.stations[i]];
    sum += scaled * scaled;
  }
  return sum / 2;
}

/** Sum over stations of 1 - posterior variance / prior variance. */
function effectiveGains(scan: Scan, L: Float64Array, deviations: Float64Array): number {
  const n = scan.stations.length;
  const inverse = invertCholesky(L, n);
  let sum = 0;
  for (let i = 0; i < n; i++) {
    const tau = deviations[scan.stations[i]];
    sum += 1 - inverse[i * n + i] / (tau * tau);
  }
  return sum;
}

function squares(values: Float64Array): number {
  let sum = 0;
  for (const value of values) sum += value * value;
  return sum;
}
