/** The output `report`: chi-squares with their degrees of freedom, choice of components, gains, starts, assumptions; and
 *  the warnings that go to the entry. */

import type { Posterior } from '../data.ts';
import { placeAt, slopesAt } from '../imaging/centroid.ts';
import { componentsOf, imageAt, type Slopes } from '../imaging/linear-model.ts';
import type { FitResult } from '../imaging/run-fit.ts';
import type { SamplerReport } from '../imaging/sampler.ts';
import { type FitSettings, fitsCentroid, isLinear } from '../imaging/settings.ts';
import { makeExpansion, mirror, type Term } from '../imaging/term.ts';
import { cholesky, invertCholesky } from '../numerics/linear.ts';
import { normalQuantile, quantiles } from '../numerics/statistics.ts';
import { UAS_PER_RADIAN } from './flux-numbers.ts';
import type { FitResiduals } from './residuals.ts';

export interface TermReport {
  readonly term: string;
  readonly measurements: number;
  readonly chiSquare: number;
  /** Parameters that the term takes up: trace of its curvature times the posterior covariance, plus its gains. */
  readonly parameters: number;
  /** Measurements less parameters. */
  readonly degreesOfFreedom: number;
  readonly reducedChiSquare: number;
}

/** Reduced chi-square above which the components are too few (common practice). */
const LARGEST_CHI_SQUARE = 1.5;
/** Part of the flux in negative pixels above which a warning is given. */
const LARGEST_NEGATIVE = 0.05;
/** Starts that end so much above the best are false minima. */
const FALSE_MINIMUM = 1;

export function makeReport(
  result: FitResult,
  settings: FitSettings,
  posterior: Posterior,
  residuals: FitResiduals,
  sampler: SamplerReport | null,
) {
  const { problem, selection, best, choice } = result;
  const terms = termReports(result);
  const negative = negativeFraction(imageAt(problem.model, problem.basis, best.x));
  const warnings = [
    ...findWarnings(result, settings, terms, posterior, negative),
    ...samplerWarnings(sampler),
  ];
  return {
    data: settings.data,
    /** What a fit of like data needs to be made the same way. */
    settings: usedSettings(result, settings),
    remark: problem.data.remark,
    rows: { fitted: selection.data.count, tooShort: selection.tooShort, tooLong: selection.tooLong },
    resolutionRadians: problem.basis.resolutionRadians,
    components: componentsOf(problem.model, best.x),
    choice,
    terms,
    optimum: { cost: best.cost, converged: best.converged, negativeFraction: negative },
    starts: result.starts,
    flux: {
      priorMean: problem.model.flux,
      priorDeviation: problem.model.scales[0],
      source: result.fluxSource,
      totalMeasured: selection.totalFlux,
    },
    ...centroidReport(result),
    posterior: posteriorMethod(settings),
    sampler,
    gains: {
      stations: result.stationGains,
      widened: result.widenings.map(({ station, median, from, to }) => ({ station, median, from, to })),
      scans: result.gains.map(({ scan, stations, logGains, deviations }) => ({
        scan,
        stations: stations.map((index) => problem.data.stations[index].name),
        gains: logGains,
        deviations,
      })),
    },
    stationResiduals: stationResiduals(residuals),
    warnings,
  };
}

/** The settings as they were in the end: so many components, that flux, priors as they were widened. */
function usedSettings({ problem, best }: FitResult, settings: FitSettings) {
  const stations = Object.fromEntries(
    problem.data.stations
      .map(({ name }, k) => [name, problem.deviations[k]] as const)
      .filter(([, deviation]) => deviation !== settings.gainPriors.usual),
  );
  return {
    data: settings.data,
    components: componentsOf(problem.model, best.x),
    priorWidth: settings.priorWidth,
    flux: problem.model.flux,
    fluxPrior: settings.fluxPrior,
    shortest: settings.shortest,
    gainPriors: { usual: settings.gainPriors.usual, stations },
    minimumSnr: settings.minimumSnr,
    centroid: settings.centroid ?? 'fixed',
    positivity: settings.positivity,
  };
}

/** Microarcseconds; nothing where the centroid is no parameter. */
function centroidReport({ problem, best }: FitResult) {
  const place = placeAt(problem.model, best.x);
  if (!(place && problem.model.ramp)) return {};
  const [east, north, prior] = [place.east, place.north, problem.model.ramp.scale].map(
    (radians) => radians * UAS_PER_RADIAN,
  );
  return { centroid: { east, north, priorDeviation: prior } };
}

function termReports({ problem, best, at }: FitResult): TermReport[] {
  const n = best.x.length;
  const L = cholesky(best.curvature, n);
  const covariance = L ? invertCholesky(L, n) : new Float64Array(n * n);
  const slopes = slopesAt(problem.model, best.x, at);
  return problem.terms.map((term) => termReport(term, slopes, at, covariance));
}

function termReport(term: Term, slopes: Slopes, at: FitResult['at'], covariance: Float64Array): TermReport {
  const n = Math.sqrt(covariance.length);
  const own = makeExpansion(n);
  term.expand(at, slopes, own);
  mirror(own);
  let parameters = term.nuisances(at);
  for (let k = 0; k < n * n; k++) parameters += own.curvature[k] * covariance[k];
  const chiSquare = term.chiSquare(at);
  const degreesOfFreedom = term.count - parameters;
  return {
    term: term.name,
    measurements: term.count,
    chiSquare,
    parameters,
    degreesOfFreedom,
    reducedChiSquare: degreesOfFreedom > 0 ? chiSquare / degreesOfFreedom : 0,
  };
}

function posteriorMethod(settings: FitSettings): string {
  if (settings.posterior === 'sampled' && !isLinear(settings))
    return 'sampled by Hamiltonian chains, gains among the parameters; the image is the maximum of the posterior';
  return isLinear(settings)
    ? 'exact: the model is linear and errors and prior are Gaussian; the image is mean and maximum of the posterior'
    : 'Gaussian of the Gauss-Newton curvature at the maximum (Laplace); the image is the maximum of the posterior';
}

function samplerWarnings(sampler: SamplerReport | null): string[] {
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

/** Flux in negative pixels over the total. */
export function negativeFraction(pixels: Float64Array): number {
  let negative = 0;
  let total = 0;
  for (const value of pixels) {
    total += value;
    if (value < 0) negative -= value;
  }
  return total > 0 ? negative / total : 1;
}

function findWarnings(
  result: FitResult,
  settings: FitSettings,
  terms: readonly TermReport[],
  posterior: Posterior,
  negative: number,
): string[] {
  const { best, widenings, starts, stationGains } = result;
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
  const isFixed = settings.data === 'complex-visibilities' && !fitsCentroid(settings);
  const offCentre = isFixed ? ', or one off the phase centre, where `centroid: fixed` holds it' : '';
  for (const { term, reducedChiSquare } of terms) {
    if (reducedChiSquare > LARGEST_CHI_SQUARE) {
      warnings.push(
        `reduced chi-square of the ${term} is ${reducedChiSquare.toFixed(2)}: too few components, errors stated too small, or a source that the library does not hold${offCentre}`,
      );
    }
  }
  if (negative > LARGEST_NEGATIVE) {
    warnings.push(`${percent(negative)} of the flux stands in negative pixels: raise \`positivity\``);
  }
  const lowest = Math.min(...starts.map(({ cost }) => cost));
  const high = starts.filter(({ cost }) => cost > lowest + FALSE_MINIMUM).length;
  if (high > 0) warnings.push(`${high} of ${starts.length} starts ended in a minimum above the best`);
  return warnings;
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

/** Rms of the normalised residuals of amplitudes and closure phases that a station takes part in. */
function stationResiduals(residuals: FitResiduals) {
  const { visibilities: rows, closurePhases: phases } = residuals;
  return residuals.stations.flatMap((station, index) => {
    const amplitude: number[] = [];
    rows.amplitude.forEach((value, r) => {
      if (rows.station1[r] === index || rows.station2[r] === index) {
        amplitude.push((value - rows.modelAmplitude[r]) / rows.sigma[r]);
      }
    });
    const phase = phases.residualDegrees
      .map((value, t) => value / phases.sigmaDegrees[t])
      .filter((_, t) => phases.stations[t].includes(index));
    if (amplitude.length === 0) return [];
    return [
      {
        station,
        amplitudes: amplitude.length,
        amplitudeRms: rms(amplitude),
        closurePhases: phase.length,
        closurePhaseRms: phase.length > 0 ? rms(phase) : null,
      },
    ];
  });
}

function rms(values: readonly number[]): number {
  return Math.sqrt(values.reduce((sum, value) => sum + value * value, 0) / values.length);
}
