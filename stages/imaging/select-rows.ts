/** Which rows of the visibilities enter the fit, and what the others say about the total flux. */

import type { Visibilities } from '../data.ts';
import { ln } from '../numerics/elementary.ts';
import { median } from '../numerics/statistics.ts';
import { InputProblem } from '../problem.ts';

export interface Selection {
  /** Rows of the fit; scans and stations keep their numbers. */
  readonly data: Visibilities;
  /** Rows left out because their baseline is too short. */
  readonly tooShort: number;
  /** Rows left out because they see finer structure than the basis holds. */
  readonly tooLong: number;
  /** Median amplitude of those rows, Jy, debiased; null when there are none. It is the flux of all scales. */
  readonly totalFlux: number | null;
}

/** What the basis' resolution leaves of a visibility on the longest baseline that is fitted. Finer structure is not in
 *  the basis: it was built without frequencies of which less than 1 % is left. */
const LEAST_TAPER = 0.02;

/** Longest baseline, wavelengths, on which a basis of a resolution (FWHM, radians; 0 for none) says anything. */
export function longestBaseline(resolutionRadians: number): number {
  // exp(-(pi w)^2 q^2 / (4 ln 2)) = LEAST_TAPER
  return Math.sqrt(-4 * Math.LN2 * ln(LEAST_TAPER)) / (Math.PI * resolutionRadians);
}

/** @throws InputProblem when nothing is left, or a row holds what must never reach a computation */
export function selectRows(
  all: Visibilities,
  shortestWavelengths: number,
  longestWavelengths: number,
): Selection {
  requireSound(all);
  const kept: number[] = [];
  const short: number[] = [];
  let tooLong = 0;
  for (let r = 0; r < all.count; r++) {
    const length = Math.sqrt(all.u[r] * all.u[r] + all.v[r] * all.v[r]);
    if (length < shortestWavelengths) short.push(r);
    else if (length > longestWavelengths) tooLong++;
    else kept.push(r);
  }
  if (kept.length === 0) {
    throw new InputProblem({
      code: 'no-data',
      place: 'input visibilities',
      expected: `baselines from ${shortestWavelengths} to ${longestWavelengths} wavelengths`,
      found: `${all.count} rows, none of them between`,
      advice: 'Lower the parameter `shortest`, build the basis with a finer resolution, or give other data.',
    });
  }
  return { data: takeRows(all, kept), tooShort: short.length, tooLong, totalFlux: totalFlux(all, short) };
}

function requireSound(all: Visibilities): void {
  for (let r = 0; r < all.count; r++) {
    const numbers = [all.u[r], all.v[r], all.re[r], all.im[r], all.sigma[r], all.sigmaPhase[r]];
    if (!(numbers.every(Number.isFinite) && all.sigma[r] > 0 && all.sigmaPhase[r] > 0)) {
      throw new InputProblem({
        code: 'bad-row',
        place: `input visibilities, row ${r + 1}`,
        expected: 'finite numbers and errors above 0',
        found: `u ${all.u[r]}, v ${all.v[r]}, ${all.re[r]} ${all.im[r]} Jy, errors ${all.sigma[r]} Jy and ${all.sigmaPhase[r]} rad`,
        advice: 'Flagged and weightless samples are dropped by `ingest`: give its output, or drop them.',
      });
    }
  }
}

function totalFlux(all: Visibilities, rows: readonly number[]): number | null {
  if (rows.length === 0) return null;
  const debiased = rows.map((r) => {
    const square = all.re[r] * all.re[r] + all.im[r] * all.im[r] - 2 * all.sigma[r] * all.sigma[r];
    return Math.sqrt(Math.max(0, square));
  });
  return median(debiased);
}

/** The visibilities' rows at some places, in that order. */
export function takeRows(all: Visibilities, rows: readonly number[]): Visibilities {
  const take = (values: Float64Array) => Float64Array.from(rows, (r) => values[r]);
  const takeIndices = (values: Int32Array) => Int32Array.from(rows, (r) => values[r]);
  return {
    ...all,
    count: rows.length,
    station1: takeIndices(all.station1),
    station2: takeIndices(all.station2),
    scan: takeIndices(all.scan),
    timeMjd: take(all.timeMjd),
    integrationSeconds: take(all.integrationSeconds),
    u: take(all.u),
    v: take(all.v),
    re: take(all.re),
    im: take(all.im),
    sigma: take(all.sigma),
    sigmaPhase: take(all.sigmaPhase),
  };
}
