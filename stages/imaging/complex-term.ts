/** Complex visibilities as a data term: real and imaginary parts with one standard deviation. */

import type { Visibilities } from '../data.ts';
import { addResidual, type Term } from './term.ts';

/** Standard deviation of each part, Jy: of the amplitude, or of the phase times the amplitude where an error budget
 *  makes that larger. */
export function complexSigma(data: Visibilities): Float64Array {
  return data.sigma.map((sigma, r) => {
    const amplitude = Math.sqrt(data.re[r] * data.re[r] + data.im[r] * data.im[r]);
    return Math.max(sigma, data.sigmaPhase[r] < Math.PI ? amplitude * data.sigmaPhase[r] : 0);
  });
}

export function makeComplexTerm(data: Visibilities, rows = allRows(data)): Term {
  const sigma = complexSigma(data);
  const chiSquare: Term['chiSquare'] = (at) => {
    let sum = 0;
    for (const r of rows) {
      const a = (at.re[r] - data.re[r]) / sigma[r];
      const b = (at.im[r] - data.im[r]) / sigma[r];
      sum += a * a + b * b;
    }
    return sum;
  };
  return {
    name: 'complex visibilities',
    count: 2 * rows.length,
    scans: [...new Set(rows.map((r) => data.scan[r]))].sort((a, b) => a - b),
    chiSquare,
    nuisances: () => 0,
    cost: (at) => chiSquare(at) / 2,
    expand(at, slopes, out) {
      const columns = out.gradient.length;
      const J = new Float64Array(columns);
      for (const r of rows) {
        const start = r * slopes.columns;
        for (let k = 0; k < columns; k++) J[k] = slopes.re[start + k] / sigma[r];
        addResidual(out, (at.re[r] - data.re[r]) / sigma[r], J, 0);
        for (let k = 0; k < columns; k++) J[k] = slopes.im[start + k] / sigma[r];
        addResidual(out, (at.im[r] - data.im[r]) / sigma[r], J, 0);
      }
      return chiSquare(at) / 2;
    },
    adjoint(at, out) {
      for (const r of rows) {
        out.re[r] += (at.re[r] - data.re[r]) / (sigma[r] * sigma[r]);
        out.im[r] += (at.im[r] - data.im[r]) / (sigma[r] * sigma[r]);
      }
      return chiSquare(at) / 2;
    },
    only: (scans) =>
      makeComplexTerm(
        data,
        rows.filter((r) => scans.has(data.scan[r])),
      ),
  };
}

function allRows(data: Visibilities): number[] {
  return Array.from({ length: data.count }, (_, r) => r);
}
