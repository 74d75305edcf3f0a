/** Gains of stations and scans as parameters beside flux and coefficients, for the sampler. */

import type { Visibilities } from '../data.ts';
import { exp } from '../numerics/elementary.ts';
import type { ModelVisibilities } from './linear-model.ts';
import { riceMean } from './rice.ts';
import type { Scan, ScanGains } from './scan-gains.ts';

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

export function explicitGains(
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
export function addAmplitudeSlope(
  out: ModelVisibilities,
  at: ModelVisibilities,
  r: number,
  pull: number,
): void {
  const square = at.re[r] * at.re[r] + at.im[r] * at.im[r];
  if (!(square > 0)) return;
  out.re[r] += (pull * at.re[r]) / square;
  out.im[r] += (pull * at.im[r]) / square;
}
