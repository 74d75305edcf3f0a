/** The whole fit, from visibilities and basis in memory to the optimum with its curvature. Knows no file. */

import type { Basis, Visibilities } from '../data.ts';
import type { ClosureSet } from '../numerics/closures.ts';
import type { Minimum } from '../numerics/gauss-newton.ts';
import { median } from '../numerics/statistics.ts';
import { InputProblem } from '../problem.ts';
import { withPlace } from './centroid.ts';
import { findPlace } from './centroid-start.ts';
import { type ComponentChoice, chooseComponents } from './component-choice.ts';
import { requirePresent } from './data-terms.ts';
import {
  type FitProblem,
  fitClosures,
  gainDeviations,
  makeTerms,
  resized,
  solveFrom,
} from './fit-problem.ts';
import { type LibraryMatch, matchByTerms, matchLibrary, pickStarts, startOf } from './library-starts.ts';
import {
  type BasisVisibilities,
  basisVisibilities,
  type ModelVisibilities,
  makeLinearModel,
  predict,
  predictUnmoved,
} from './linear-model.ts';
import { type Mode, modesOf } from './modes.ts';
import { pointsOf } from './points.ts';
import { makePositivityTerm } from './positivity-term.ts';
import { longestBaseline, type Selection, selectRows, wantedData } from './select-rows.ts';
import { type FitSettings, fitsCentroid, measuresFlux } from './settings.ts';
import { type Settled, settleGains } from './settle-gains.ts';

export interface StartOutcome {
  readonly start: string;
  readonly cost: number;
  readonly steps: number;
  readonly converged: boolean;
}

export interface FitResult extends Settled {
  readonly selection: Selection;
  readonly fluxSource: string;
  readonly choice: ComponentChoice | null;
  /** The model's visibilities at the optimum. */
  readonly at: ModelVisibilities;
  readonly starts: readonly StartOutcome[];
  /** Where they ended. */
  readonly modes: readonly Mode[];
}

/** Components of the first fit, from which the choice by held-out data starts. */
const FIRST_COMPONENTS = 20;
/** Relative width of the flux where no data term sees it: free, it would fall until the coefficients' prior is content,
 *  since the image may be scaled at will. The draws get their spread by `withStatedFlux`. */
const HELD_FLUX = 1e-3;
/** A library image's flux is uncertain by its fit; the median of so many of the best is the prior's mean. */
const FLUX_MATCHES = 10;

/** What a fit of like data has computed already, and how much of the library is looked at. */
export interface FitHints {
  /** Of the basis at the (u,v) of the rows that enter: the same for other data on the same rows. */
  readonly visibilities?: BasisVisibilities;
  /** One image in so many of the library is tried as a start. Default 1. */
  readonly libraryStride?: number;
}

export function runFit(
  visibilities: Visibilities,
  basis: Basis,
  settings: FitSettings,
  progress: (fraction: number) => void = () => {},
  { visibilities: known, libraryStride = 1 }: FitHints = {},
): FitResult {
  const longest = longestBaseline(basis.resolutionRadians);
  const wanted = wantedData(visibilities, settings.data);
  requirePresent(settings.data, wanted);
  const selection = selectRows(wanted, settings.shortest * 1e9, longest);
  const sets = fitClosures(selection.data, settings.minimumSnr);
  const points = pointsOf(selection.data);
  const B = known ?? basisVisibilities(basis, points.u, points.v);
  const matches = findMatches(basis, B, selection.data, sets, settings, libraryStride);
  progress(0.1);
  const { flux, fluxSource } = fluxPrior(settings, selection, matches);
  const problem = makeProblem(selection.data, sets, basis, B, flux, settings);
  const picked = pickStarts(matches, settings.starts - 1);
  const first = firstColumns(settings, basis);
  const firstStarts = makeStarts(problem, picked, first);
  const firstSolved = solveFrom(problem, placesOf(firstStarts));
  const settled = settleGains(problem, [firstSolved.best.x], settings);
  progress(0.2);
  const choice =
    settings.components === 'by-data'
      ? chooseComponents(settled.problem, settled.best.x, (fraction) => progress(0.2 + 0.6 * fraction))
      : null;
  const again = choice === null ? null : searchAgain(settled, picked, 1 + choice.components);
  const starts = again?.starts ?? firstStarts;
  const minima = again?.minima ?? firstSolved.minima;
  const last =
    again === null ? settled : settleGains(settled.problem, [again.best.x], settings, settled.widenings);
  progress(0.95);
  return {
    selection,
    fluxSource,
    choice,
    ...last,
    at: predict(last.problem.model, last.best.x),
    starts: minima.map((minimum, k) => outcomeOf(starts[k].start, minimum)),
    modes: modesOf(minima),
  };
}

/** The search with the number of components that was chosen, from all starts and from the fit before. */
function searchAgain(settled: Settled, picked: readonly LibraryMatch[], columns: number) {
  const before = {
    start: 'fit before the choice',
    x: resized(settled.problem.model, settled.best.x, columns),
  };
  const starts = [...makeStarts(settled.problem, picked, columns), before];
  return { starts, ...solveFrom(settled.problem, placesOf(starts)) };
}

interface Start {
  readonly start: string;
  readonly x: Float64Array;
}

function firstColumns({ components }: FitSettings, basis: Basis): number {
  return 1 + (components === 'by-data' ? Math.min(FIRST_COMPONENTS, basis.components.length) : components);
}

/** Starts, each at the place where it agrees best when the centroid is a parameter. */
function makeStarts(problem: FitProblem, picked: readonly LibraryMatch[], columns: number): Start[] {
  const { model, data } = problem;
  const placed = (start: Start): Start => {
    if (!model.ramp) return start;
    const place = findPlace(data, predictUnmoved(model, start.x), model.ramp.scale);
    return { ...start, x: withPlace(model, start.x, place) };
  };
  const fromLibrary = picked.map((match) => ({
    start: `library image ${match.image}, family ${match.family}`,
    x: startOf(match, problem.basis, problem.model, columns),
  }));
  return [{ start: 'mean of the prior', x: new Float64Array(columns) }, ...fromLibrary].map(placed);
}

function placesOf(starts: readonly Start[]): Float64Array[] {
  return starts.map(({ x }) => x);
}

function findMatches(
  basis: Basis,
  B: BasisVisibilities,
  data: Visibilities,
  sets: readonly ClosureSet[],
  settings: FitSettings,
  stride: number,
): LibraryMatch[] {
  if (data.count > 0 || settings.flux === undefined) return matchLibrary(basis, B, data, sets, stride);
  const terms = makeTerms(settings.data, data, sets, new Float64Array(0), settings.minimumSnr);
  return matchByTerms(basis, B, terms, settings.flux, stride);
}

function fluxPrior(settings: FitSettings, { totalFlux }: Selection, matches: readonly LibraryMatch[]) {
  if (settings.flux !== undefined) return { flux: settings.flux, fluxSource: 'stated' };
  const estimate = matches.length > 0 ? median(matches.slice(0, FLUX_MATCHES).map(({ flux }) => flux)) : 0;
  if (!(estimate > 0)) {
    throw new InputProblem({
      code: 'flux-needed',
      place: 'parameter flux',
      expected: 'the compact flux, because no library image agrees with the amplitudes at a flux above 0',
      found: 'no value',
      advice: 'State the flux, such as `flux: 0.6 Jy`.',
    });
  }
  const library = 'estimated: median flux of the library images that agree best with the data';
  return totalFlux !== null && totalFlux > 0 && totalFlux < estimate
    ? { flux: totalFlux, fluxSource: 'estimated: amplitude of the baselines shorter than `shortest`' }
    : { flux: estimate, fluxSource: library };
}

function makeProblem(
  data: Visibilities,
  sets: readonly ClosureSet[],
  basis: Basis,
  B: BasisVisibilities,
  flux: number,
  settings: FitSettings,
): FitProblem {
  const fluxWidth = measuresFlux(settings) ? settings.fluxPrior : HELD_FLUX;
  const prior = { flux, fluxWidth, priorWidth: settings.priorWidth };
  const linear = makeLinearModel(B, basis.eigenvalues, prior);
  const { u, v } = pointsOf(data);
  const ramp = { scale: basis.nx * basis.pixelRadians, u, v };
  const model = fitsCentroid(settings) ? { ...linear, ramp } : linear;
  const deviations = gainDeviations(data, settings.gainPriors);
  return {
    data,
    sets,
    basis,
    visibilities: B,
    model,
    deviations,
    terms: makeTerms(settings.data, data, sets, deviations, settings.minimumSnr),
    positivity: settings.positivity > 0 ? makePositivityTerm(basis, model, settings.positivity) : null,
  };
}

function outcomeOf(start: string, { cost, steps, converged }: Minimum): StartOutcome {
  return { start, cost, steps, converged };
}
