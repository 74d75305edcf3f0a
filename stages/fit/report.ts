/** The output `report`: chi-squares with their degrees of freedom, by term and by station, choice of components, gains,
 *  starts, cuts, what is left out and held out, assumptions; and the warnings that go to the entry. */

import type { Posterior } from '../data.ts';
import { placeAt, slopesAt } from '../imaging/centroid.ts';
import { countCuts } from '../imaging/cuts.ts';
import { componentsOf, type Slopes } from '../imaging/linear-model.ts';
import type { FitResult } from '../imaging/run-fit.ts';
import type { SamplerReport } from '../imaging/sampler.ts';
import { type FitSettings, isLinear, measuresFlux } from '../imaging/settings.ts';
import { makeExpansion, mirror, type Term } from '../imaging/term.ts';
import { cholesky, invertCholesky } from '../numerics/linear.ts';
import { UAS_PER_RADIAN } from './flux-numbers.ts';
import type { HeldOut, LeftOutStation } from './left-out.ts';
import { negativeFlux } from './negative-flux.ts';
import { stationReports } from './station-report.ts';
import { cutWarnings, findWarnings, leftOutWarnings, samplerWarnings } from './warnings.ts';

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

/** What was looked at besides the fit itself. */
export interface Checks {
  readonly sampler?: SamplerReport | null;
  readonly leftOut?: readonly LeftOutStation[];
  readonly heldOut?: HeldOut | null;
}

export function makeReport(
  result: FitResult,
  settings: FitSettings,
  posterior: Posterior,
  { sampler = null, leftOut = [], heldOut = null }: Checks = {},
) {
  const { problem, selection, best, choice } = result;
  const terms = termReports(result);
  const negative = negativeFlux(result, posterior);
  const cuts = countCuts(problem, settings);
  const warnings = [
    ...findWarnings(result, settings, terms, posterior, negative),
    ...cutWarnings(cuts),
    ...leftOutWarnings(leftOut),
    ...samplerWarnings(sampler),
  ];
  return {
    data: settings.data,
    /** What a fit of like data needs to be made the same way. */
    settings: usedSettings(result, settings),
    remark: problem.data.remark,
    rows: {
      fitted: selection.data.count,
      squaredVisibilities: selection.data.squared?.count ?? 0,
      tripleProducts: selection.data.triples?.count ?? 0,
      tooShort: selection.tooShort,
      tooLong: selection.tooLong,
    },
    cuts,
    resolutionRadians: problem.basis.resolutionRadians,
    components: componentsOf(problem.model, best.x),
    choice,
    terms,
    optimum: { cost: best.cost, converged: best.converged, negativeFraction: negative.optimum },
    negativeFlux: negative,
    starts: result.starts,
    modes: result.modes.map(({ starts, ...mode }) => ({
      ...mode,
      starts: starts.map((start) => result.starts[start].start),
    })),
    flux: {
      priorMean: problem.model.flux,
      priorDeviation: problem.model.flux * settings.fluxPrior,
      /** Else it is what was stated, and its interval that of the prior. */
      measured: measuresFlux(settings),
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
    stations: stationReports(result, settings, terms),
    leftOut,
    heldOut,
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
