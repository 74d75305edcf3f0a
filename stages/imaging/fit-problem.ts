/** One fit, ready to be solved with any number of components on any scans. */

import type { Basis, Visibilities } from '../data.ts';
import { type ClosureSet, closureSets } from '../numerics/closures.ts';
import { type GaussNewtonOptions, gaussNewton, type Minimum } from '../numerics/gauss-newton.ts';
import { type AmplitudeTerm, makeAmplitudeTerm } from './amplitude-term.ts';
import { linearPart, placeAt, withPlace } from './centroid.ts';
import { makeClosurePhaseTerm, makeLogClosureAmplitudeTerm } from './closure-terms.ts';
import { makeComplexTerm } from './complex-term.ts';
import { type DataKind, type DataTerm, termsOf } from './data-terms.ts';
import type { BasisVisibilities, LinearModel } from './linear-model.ts';
import { makeObjective } from './objective.ts';
import {
  chosenTriples,
  makeSquaredTerm,
  makeTripleAmplitudeTerm,
  makeTriplePhaseTerm,
} from './optical-terms.ts';
import type { PositivityTerm } from './positivity-term.ts';
import { type FitSettings, LEAST_AMPLITUDE_SNR } from './settings.ts';
import type { Term } from './term.ts';

export interface FitProblem {
  readonly data: Visibilities;
  readonly sets: readonly ClosureSet[];
  readonly basis: Basis;
  readonly visibilities: BasisVisibilities;
  readonly model: LinearModel;
  /** Prior standard deviation of every station's log gain. */
  readonly deviations: Float64Array;
  readonly terms: readonly Term[];
  readonly positivity: PositivityTerm | null;
}

/** The closures of the rows that enter the fit. */
export function fitClosures(
  data: Visibilities,
  minimumSnr: number,
  minimumAmplitudeSnr = Math.max(minimumSnr, LEAST_AMPLITUDE_SNR),
): ClosureSet[] {
  return closureSets(data, { minimumSnr, minimumAmplitudeSnr });
}

/** The data terms of a fit. @param deviations  prior of the log gains by station
 *  @param minimumSnr  triple phases of larger errors than its inverse stay out */
export function makeTerms(
  kind: DataKind,
  data: Visibilities,
  sets: readonly ClosureSet[],
  deviations: Float64Array,
  minimumSnr = 0,
): Term[] {
  return termsOf(kind).map((term) => makeTerm(term, data, sets, deviations, minimumSnr));
}

function makeTerm(
  term: DataTerm,
  data: Visibilities,
  sets: readonly ClosureSet[],
  deviations: Float64Array,
  minimumSnr: number,
): Term {
  switch (term) {
    case 'complex-visibilities':
      return makeComplexTerm(data);
    case 'amplitudes':
      return makeAmplitudeTerm(data, deviations);
    case 'closure-phases':
      return makeClosurePhaseTerm(data, sets);
    case 'log-closure-amplitudes':
      return makeLogClosureAmplitudeTerm(data, sets);
    case 'squared-visibilities':
      return makeSquaredTerm(data);
    case 'triple-phases':
      return makeTriplePhaseTerm(data, triplesFor('phase', data, minimumSnr).chosen);
    case 'triple-amplitudes':
      return makeTripleAmplitudeTerm(data, triplesFor('amplitude', data, minimumSnr).chosen);
  }
}

/** The triple products that enter a fit. Phases of larger errors are not Gaussian; amplitudes are unbiased at any. */
export function triplesFor(part: 'phase' | 'amplitude', { triples }: Visibilities, minimumSnr: number) {
  if (!triples) return { chosen: [], noisy: 0, dependent: 0 };
  return chosenTriples(triples, part, part === 'phase' && minimumSnr > 0 ? 1 / minimumSnr : Number.MAX_VALUE);
}

export function amplitudeTermOf(terms: readonly Term[]): AmplitudeTerm | null {
  const found = terms.find((term) => 'gains' in term);
  return found ? (found as AmplitudeTerm) : null;
}

/** Prior standard deviation of every station's log gain. */
export function gainDeviations(data: Visibilities, priors: FitSettings['gainPriors']): Float64Array {
  return Float64Array.from(data.stations, ({ name }) => priors.stations[name] ?? priors.usual);
}

/** The best minimum from several starts, and the costs of all. @param scans  those that enter; all when absent */
export function solveFrom(
  problem: FitProblem,
  starts: readonly Float64Array[],
  options: GaussNewtonOptions & { readonly scans?: ReadonlySet<number> } = {},
): { best: Minimum; minima: Minimum[] } {
  const { scans } = options;
  const terms = scans ? problem.terms.map((term) => term.only(scans)) : problem.terms;
  const objective = makeObjective(problem.model, terms, problem.positivity);
  const minima = starts.map((start) => gaussNewton(objective, start, options));
  const best = minima.reduce((a, b) => (b.cost < a.cost ? b : a));
  return { best, minima };
}

/** A start for more components, or fewer: zeros added, or the last ones cut. @param columns  1 + components */
export function resized(model: LinearModel, x: Float64Array, columns: number): Float64Array {
  const out = new Float64Array(columns);
  out.set(linearPart(model, x).subarray(0, columns));
  const place = placeAt(model, x);
  return place ? withPlace(model, out, place) : out;
}
