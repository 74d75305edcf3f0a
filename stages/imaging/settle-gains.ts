/** Solves a fit together with the priors of its gains: see gain-check.ts for the rule. */

import type { Minimum } from '../numerics/gauss-newton.ts';
import { amplitudeTermOf, type FitProblem, makeTerms, solveFrom } from './fit-problem.ts';
import { findFarOff, type StationGains, summariseGains, type Widening } from './gain-check.ts';
import { predict } from './linear-model.ts';
import type { ScanGains } from './scan-gains.ts';
import type { FitSettings } from './settings.ts';

/** Stations whose prior may be widened before the data rather than the stations are in doubt. */
const MOST_WIDENINGS = 3;

export interface Settled {
  /** The problem with the priors as they were widened. */
  readonly problem: FitProblem;
  readonly best: Minimum;
  readonly gains: readonly ScanGains[];
  readonly stationGains: readonly StationGains[];
  readonly widenings: readonly Widening[];
}

/** Solves, looks at the gains, widens the prior of the station furthest off, and solves again. */
export function settleGains(
  problem: FitProblem,
  starts: readonly Float64Array[],
  settings: FitSettings,
  before: readonly Widening[] = [],
): Settled {
  let current = problem;
  const widenings = [...before];
  let { best } = solveFrom(current, starts);
  for (;;) {
    const term = amplitudeTermOf(current.terms);
    const gains = term ? term.gains(predict(current.model, best.x)) : [];
    const stationGains = summariseGains(current.data, gains, current.deviations);
    const named = settings.gainPriors.stations;
    const widening = widenings.length < MOST_WIDENINGS ? findFarOff(current.data, stationGains, named) : null;
    if (!widening) return { problem: current, best, gains, stationGains, widenings };
    widenings.push(widening);
    current = widened(current, widening, settings);
    ({ best } = solveFrom(current, [best.x]));
  }
}

function widened(problem: FitProblem, { index, to }: Widening, settings: FitSettings): FitProblem {
  const deviations = problem.deviations.map((value, station) => (station === index ? to : value));
  const { data, sets } = problem;
  const terms = makeTerms(settings.data, data, sets, deviations, settings.minimumSnr);
  return { ...problem, deviations, terms };
}
