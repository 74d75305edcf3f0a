/** What the cuts at low signal-to-noise take out, counted: visibilities, and closures that could have been independent. */

import type { Visibilities } from '../data.ts';
import type { ClosureSet } from '../numerics/closures.ts';
import { type DataTerm, termsOf } from './data-terms.ts';
import { type FitProblem, fitClosures, triplesFor } from './fit-problem.ts';
import { type FitSettings, LEAST_AMPLITUDE_SNR } from './settings.ts';

export interface Cut {
  readonly term: DataTerm;
  /** What is done with little signal. */
  readonly rule: string;
  /** Visibilities, or triple products, that the rule concerns. */
  readonly rows: number;
  readonly ofRows: number;
  /** Independent closures that are left, and without the cut. */
  readonly closures?: number;
  readonly ofClosures?: number;
}

/** By term, in the order of the parameter. Cost: the closures of all scans once more. */
export function countCuts({ data, sets }: FitProblem, settings: FitSettings): Cut[] {
  const closing = termsOf(settings.data).some((term) => term.includes('closure'));
  const uncut = closing ? fitClosures(data, 0, 0) : [];
  return termsOf(settings.data).flatMap((term) => cutOf(term, data, sets, uncut, settings.minimumSnr) ?? []);
}

function cutOf(
  term: DataTerm,
  data: Visibilities,
  sets: readonly ClosureSet[],
  uncut: readonly ClosureSet[],
  minimumSnr: number,
): Cut | null {
  const total = (of: readonly ClosureSet[], kind: 'triangles' | 'quadrangles') =>
    of.reduce((sum, set) => sum + set[kind].length, 0);
  const limit = Math.max(minimumSnr, LEAST_AMPLITUDE_SNR);
  switch (term) {
    case 'closure-phases':
      return {
        term,
        rule: `visibilities below a signal-to-noise of ${minimumSnr} stay out`,
        rows: below(data, minimumSnr),
        ofRows: data.count,
        closures: total(sets, 'triangles'),
        ofClosures: total(uncut, 'triangles'),
      };
    case 'log-closure-amplitudes':
      return {
        term,
        rule: `visibilities below a signal-to-noise of ${limit} stay out`,
        rows: below(data, limit),
        ofRows: data.count,
        closures: total(sets, 'quadrangles'),
        ofClosures: total(uncut, 'quadrangles'),
      };
    case 'amplitudes':
      return {
        term,
        rule: `none stays out; below ${LEAST_AMPLITUDE_SNR} the mean of the Rice distribution is not the amplitude, and is what the model is compared with`,
        rows: below(data, LEAST_AMPLITUDE_SNR),
        ofRows: data.count,
      };
    case 'triple-phases': {
      const { noisy, dependent, chosen } = triplesFor('phase', data, minimumSnr);
      return {
        term,
        rule: `errors ${minimumSnr > 0 ? `above ${(1 / minimumSnr).toFixed(2)} rad` : 'without a number'} stay out, and what follows from more precise ones of the scan`,
        rows: noisy + dependent,
        ofRows: noisy + dependent + chosen.length,
      };
    }
    case 'triple-amplitudes': {
      const { noisy, dependent, chosen } = triplesFor('amplitude', data, minimumSnr);
      return {
        term,
        rule: 'products without an error stay out, and what follows from more precise ones of the scan',
        rows: noisy + dependent,
        ofRows: noisy + dependent + chosen.length,
      };
    }
    default:
      return null;
  }
}

/** Rows of a signal-to-noise below a limit. */
function below({ count, re, im, sigma }: Visibilities, limit: number): number {
  let sum = 0;
  for (let r = 0; r < count; r++) {
    if (re[r] * re[r] + im[r] * im[r] < limit * limit * sigma[r] * sigma[r]) sum++;
  }
  return sum;
}
