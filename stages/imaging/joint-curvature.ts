/** The curvature of the cost by x and by the gains together, nothing eliminated: what the sampler whitens with, and what the
 *  errors are while the gains are held. */

import { expandLinear, linearPart, slopesAt } from './centroid.ts';
import { amplitudeTermOf, type FitProblem } from './fit-problem.ts';
import { predict } from './linear-model.ts';
import type { ScanGains } from './scan-gains.ts';
import { logDerivatives, makeExpansion, mirror } from './term.ts';

/** Returns H by (x, h), square, x.length + gains on a side, by Gauss and Newton; prior and positivity included. */
export function jointCurvature(
  { model, terms, positivity }: FitProblem,
  x: Float64Array,
  gains: readonly ScanGains[],
): Float64Array {
  const columns = x.length;
  const amplitudes = amplitudeTermOf(terms);
  const explicit = amplitudes?.explicit() ?? null;
  const n = columns + (explicit?.count ?? 0);
  const at = predict(model, x);
  const slopes = slopesAt(model, x, at);
  const own = makeExpansion(columns);
  for (const term of terms) if (term !== amplitudes) term.expand(at, slopes, own);
  if (positivity) expandLinear(positivity.expand, linearPart(model, x), own);
  const H = new Float64Array(n * n);
  for (let i = 0; i < columns; i++) {
    for (let j = 0; j <= i; j++) H[i * n + j] = own.curvature[i * columns + j];
  }
  const J = new Float64Array(columns);
  explicit?.visit(at, explicit.whitened(gains), (row, slope, first, second, [a, b]) => {
    logDerivatives(J, null, at, slopes, row, columns);
    const ofGains: readonly (readonly [number, number])[] = [
      [columns + first, a],
      [columns + second, b],
    ];
    const square = slope * slope;
    for (let i = 0; i < columns; i++) {
      for (let j = 0; j <= i; j++) H[i * n + j] += square * J[i] * J[j];
    }
    for (const [g, scale] of ofGains) {
      for (let j = 0; j < columns; j++) H[g * n + j] += square * scale * J[j];
      for (const [other, otherScale] of ofGains)
        if (other <= g) H[g * n + other] += square * scale * otherScale;
    }
  });
  for (let k = 0; k < n; k++) H[k * n + k] += 1;
  mirror({ gradient: new Float64Array(n), curvature: H });
  return H;
}
