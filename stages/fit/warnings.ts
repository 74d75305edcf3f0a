/** What the user must know of a fit: the warnings that go to the entry. */

import type { Posterior } from '../data.ts';
import type { Cut } from '../imaging/cuts.ts';
import { type DataTerm, termsOf } from '../imaging/data-terms.ts';
import type { FitResult } from '../imaging/run-fit.ts';
import type { SamplerReport } from '../imaging/sampler.ts';
import { type FitSettings, fitsCentroid } from '../imaging/settings.ts';
import { normalQuantile, quantiles } from '../numerics/statistics.ts';
import type { LeftOutStation } from './left-out.ts';
import type { NegativeFlux } from './negative-flux.ts';
import type { TermReport } from './report.ts';

/** Reduced chi-square above which the components are too few (common practice). */
const LARGEST_CHI_SQUARE = 1.5;
/** Part of the flux in negative pixels above which a warning is given. */
const LARGEST_NEGATIVE = 0.05;
/** Starts that end so much above the best are false minima. */
const FALSE_MINIMUM = 1;
/** A flux that moves by so many of the deviations that it should have, when a station is left out, and by so much of itself:
 *  very precise data see what the basis lacks, which moves it by less. */
const LARGEST_SHIFT = 4;
const LARGEST_RELATIVE_SHIFT = 0.05;

export function samplerWarnings(sampler: SamplerReport | null): string[] {
  if (sampler === null) return [];
  const { rHat, essBulk, essTail, targets, met, divergences, draws } = sampler;
  const warnings: string[] = [];
  if (!met) {
    warnings.push(
      `the chains do not meet their targets after ${draws} draws: R-hat ${rHat.toFixed(3)} (at most ${targets.rHat}), ` +
        `effective draws ${essBulk.toFixed(0)} of the bulk and ${essTail.toFixed(0)} of the tails (at least ${targets.ess})`,
    );
  }
  if (divergences > 0) warnings.push(`${divergences} of ${draws} trajectories of the sampler went astray`);
  return warnings;
}

export function findWarnings(
  result: FitResult,
  settings: FitSettings,
  terms: readonly TermReport[],
  posterior: Posterior,
  { optimum: negative, median: negativeMedian }: NegativeFlux,
): string[] {
  const { best, widenings, stationGains } = result;
  const warnings: string[] = [];
  const percent = (value: number) => `${(100 * value).toFixed(0)} %`;
  if (!best.converged) warnings.push('the search for the optimum did not converge within its limit of steps');
  for (const { station, median, from, to } of widenings) {
    warnings.push(
      `station ${station} lies far off: median log gain ${median.toFixed(3)} under a prior of ${from}; its prior was widened to ${to.toFixed(2)}`,
    );
  }
  for (const { station, median, prior } of stationGains) {
    if (Math.abs(median) > 2 * prior) {
      warnings.push(
        `station ${station}: median log gain ${median.toFixed(3)} exceeds twice its prior of ${prior}`,
      );
    }
  }
  if (result.selection.tooLong > 0) {
    warnings.push(
      `${result.selection.tooLong} rows were left out: their baselines see finer structure than the resolution of the basis`,
    );
  }
  const flux = fluxAboveTotal(result, settings, posterior);
  if (flux !== null) warnings.push(flux);
  const isFixed = termsOf(settings.data).includes('complex-visibilities') && !fitsCentroid(settings);
  const offCentre = isFixed ? ', or one off the phase centre, where `centroid: fixed` holds it' : '';
  for (const { term, reducedChiSquare } of terms) {
    if (reducedChiSquare > LARGEST_CHI_SQUARE) {
      warnings.push(
        `reduced chi-square of the ${term} is ${reducedChiSquare.toFixed(2)}: too few components, errors stated too small, or a source that the library does not hold${offCentre}`,
      );
    }
  }
  if (negative > LARGEST_NEGATIVE || negativeMedian > LARGEST_NEGATIVE) {
    warnings.push(
      `the image has negative flux: ${percent(negative)} of the total stands in negative pixels, ${percent(negativeMedian)} in half of the draws; raise \`positivity\``,
    );
  }
  if (termsOf(settings.data).every(isBlindToTurns)) {
    warnings.push('the data hold no phases: the image turned by 180 degrees fits them as well');
  }
  return [...warnings, ...modeWarnings(result)];
}

function isBlindToTurns(term: DataTerm): boolean {
  return term.endsWith('amplitudes') || term === 'squared-visibilities';
}

function modeWarnings({ starts, modes }: FitResult): string[] {
  const others = modes.slice(1).filter(({ above }) => above > FALSE_MINIMUM);
  const high = others.reduce((sum, mode) => sum + mode.starts.length, 0);
  if (high === 0) return [];
  const again = others.filter((mode) => mode.starts.length > 1);
  const nearest = Math.min(...again.map(({ above }) => above));
  const repeated =
    again.length === 0
      ? ''
      : `; ${again.length} of these minima ${again.length === 1 ? 'was' : 'were'} found more than once, the best of them ${nearest.toFixed(1)} above`;
  return [`${high} of ${starts.length} starts ended in a minimum above the best${repeated}`];
}

/** Cuts that take more than half of what there is. */
export function cutWarnings(cuts: readonly Cut[]): string[] {
  return cuts.flatMap(({ term, closures, ofClosures, rule }) => {
    if (closures === undefined || ofClosures === undefined || closures >= ofClosures / 2) return [];
    return [`of ${ofClosures} ${term.replaceAll('-', ' ')} only ${closures} are left: ${rule}`];
  });
}

export function leftOutWarnings(stations: readonly LeftOutStation[]): string[] {
  return stations
    .filter(
      ({ flux, fluxShift, fluxShiftDeviations }) =>
        Math.abs(fluxShiftDeviations) > LARGEST_SHIFT && Math.abs(fluxShift) > LARGEST_RELATIVE_SHIFT * flux,
    )
    .map(
      ({ station, flux, fluxShiftDeviations }) =>
        `without station ${station} the flux is ${flux.toFixed(3)} Jy, ${Math.abs(fluxShiftDeviations).toFixed(1)} times as far off as it should be`,
    );
}

/** The implied compact flux must not exceed the flux of all scales, which the shortest baselines measure up to the
 *  gains of two stations. */
function fluxAboveTotal(
  { selection }: FitResult,
  settings: FitSettings,
  posterior: Posterior,
): string | null {
  const { totalFlux } = selection;
  if (totalFlux === null) return null;
  const [low, median] = quantiles(posterior.flux, [(1 - 0.95) / 2, 0.5]);
  const upper = totalFlux * (1 + normalQuantile(0.975) * Math.SQRT2 * settings.gainPriors.usual);
  return low > totalFlux || median > upper
    ? `the implied compact flux of ${median.toFixed(3)} Jy exceeds the ${totalFlux.toFixed(3)} Jy that the shortest baselines measure in all: the image holds flux that is not there`
    : null;
}
