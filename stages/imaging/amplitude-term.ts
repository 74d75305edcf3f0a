/** Amplitudes as a data term, with one gain per station and scan as a nuisance:
 *
 *    residual   (E|e^{g_i + g_j} M + n| - A) / sigma,   the mean under noise from rice.ts
 *    penalty    g_i^2 / tau_i^2 / 2                     Gaussian prior on the logarithm of each gain
 *
 *  For given model visibilities M the gains of a scan are set to their optimum; their curvature is taken out of that of
 *  the parameters by the Schur complement (variable projection: Golub and Pereyra 1973, SIAM J. Numer. Anal. 10, 413),
 *  which in the Gaussian approximation is the marginalisation over them. */

import type { Visibilities } from '../data.ts';
import { invertCholesky, solveLower } from '../numerics/linear.ts';
import { addAmplitudeSlope, type ExplicitGains, explicitGains } from './explicit-gains.ts';
import type { ModelVisibilities, Slopes } from './linear-model.ts';
import {
  effectiveGains,
  groupByScan,
  type Scan,
  type ScanGains,
  type Solved,
  scanCost,
  solveGains,
  squares,
} from './scan-gains.ts';
import { addResidual, type Expansion, logDerivatives, type Term } from './term.ts';

export interface AmplitudeTerm extends Term {
  gains(at: ModelVisibilities): ScanGains[];
  /** The same term with the gains as parameters. */
  explicit(): ExplicitGains;
  only(scans: ReadonlySet<number>): AmplitudeTerm;
}

/** @param deviations  prior standard deviation of each station's log gain, by station index */
export function makeAmplitudeTerm(data: Visibilities, deviations: Float64Array): AmplitudeTerm {
  const amplitudes = data.re.map((re, r) => Math.sqrt(re * re + data.im[r] * data.im[r]));
  return amplitudeTerm(data, amplitudes, deviations, groupByScan(data));
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
