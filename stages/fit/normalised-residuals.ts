/** Every measurement of a fit as one residual over its error, with the stations and baselines that it is of. */

import type { Visibilities } from '../data.ts';
import { complexSigma } from '../imaging/complex-term.ts';
import { type DataTerm, termsOf } from '../imaging/data-terms.ts';
import { type FitProblem, triplesFor } from '../imaging/fit-problem.ts';
import type { ModelVisibilities } from '../imaging/linear-model.ts';
import { productAt } from '../imaging/optical-terms.ts';
import { pointsOf } from '../imaging/points.ts';
import { riceMean } from '../imaging/rice.ts';
import type { ScanGains } from '../imaging/scan-gains.ts';
import type { FitSettings } from '../imaging/settings.ts';
import { type Closure, closurePhase, logClosureAmplitude, wrapPhase } from '../numerics/closures.ts';
import { exp } from '../numerics/elementary.ts';

/** `i-j`, i < j. */
export type Baseline = `${number}-${number}`;

export interface NormalisedResidual {
  /** Number of the term in the parameter `data`. */
  readonly term: number;
  /** Pairs of indices of stations, the lower first. */
  readonly baselines: readonly Baseline[];
  readonly value: number;
}

/** @param gainErrors  whether the errors of the gains count: where the row itself had no part in finding them */
export function normalisedResiduals(
  problem: Pick<FitProblem, 'data' | 'sets' | 'deviations'>,
  settings: Pick<FitSettings, 'data' | 'minimumSnr'>,
  at: ModelVisibilities,
  gains: readonly ScanGains[],
  gainErrors = false,
): NormalisedResidual[] {
  return termsOf(settings.data).flatMap((term, number) =>
    residualsOf(term, problem, settings.minimumSnr, at, gains, gainErrors).map((each) => ({
      term: number,
      ...each,
    })),
  );
}

type Residual = Omit<NormalisedResidual, 'term'>;

function residualsOf(
  term: DataTerm,
  { data, sets, deviations }: Pick<FitProblem, 'data' | 'sets' | 'deviations'>,
  minimumSnr: number,
  at: ModelVisibilities,
  gains: readonly ScanGains[],
  gainErrors: boolean,
): Residual[] {
  switch (term) {
    case 'complex-visibilities':
      return complexResiduals(data, at);
    case 'amplitudes':
      return amplitudeResiduals(data, at, gains, gainErrors ? deviations : null);
    case 'closure-phases':
      return sets.flatMap(({ triangles, phaseCovariance }) =>
        closureResiduals(data, triangles, phaseCovariance, (closure) =>
          wrapPhase(closurePhase(closure, data.re, data.im) - closurePhase(closure, at.re, at.im)),
        ),
      );
    case 'log-closure-amplitudes':
      return sets.flatMap(({ quadrangles, logAmplitudeCovariance }) =>
        closureResiduals(
          data,
          quadrangles,
          logAmplitudeCovariance,
          (closure) =>
            logClosureAmplitude(closure, data.re, data.im) - logClosureAmplitude(closure, at.re, at.im),
        ),
      );
    case 'squared-visibilities':
      return squaredResiduals(data, at);
    case 'triple-phases':
      return tripleResiduals(data, at, 'phase', minimumSnr);
    case 'triple-amplitudes':
      return tripleResiduals(data, at, 'amplitude', minimumSnr);
  }
}

function complexResiduals(data: Visibilities, at: ModelVisibilities): Residual[] {
  const sigma = complexSigma(data);
  return Array.from(sigma).flatMap((error, r) => {
    const baselines = [baselineOf(data.station1[r], data.station2[r])];
    return [
      { baselines, value: (data.re[r] - at.re[r]) / error },
      { baselines, value: (data.im[r] - at.im[r]) / error },
    ];
  });
}

function amplitudeResiduals(
  data: Visibilities,
  at: ModelVisibilities,
  gains: readonly ScanGains[],
  priors: Float64Array | null,
): Residual[] {
  const byScan = new Map(gains.map((scan) => [scan.scan, scan]));
  const gainOf = (scan: number, station: number) => {
    const found = byScan.get(scan);
    const place = found ? found.stations.indexOf(station) : -1;
    const error = priors === null ? 0 : priors[station];
    if (!found || place < 0) return { log: 0, error };
    return { log: found.logGains[place], error: priors === null ? 0 : found.deviations[place] };
  };
  return Array.from(data.sigma, (sigma, r) => {
    const stations = [data.station1[r], data.station2[r]];
    const [first, second] = stations.map((station) => gainOf(data.scan[r], station));
    const size = Math.sqrt(at.re[r] * at.re[r] + at.im[r] * at.im[r]) * exp(first.log + second.log);
    const [mean, slope] = riceMean(size / sigma);
    const spread = size * slope * Math.sqrt(first.error * first.error + second.error * second.error);
    const amplitude = Math.sqrt(data.re[r] * data.re[r] + data.im[r] * data.im[r]);
    const baselines = [baselineOf(stations[0], stations[1])];
    return { baselines, value: (amplitude - sigma * mean) / Math.sqrt(sigma * sigma + spread * spread) };
  });
}

function closureResiduals(
  data: Visibilities,
  closures: readonly Closure[],
  covariance: Float64Array,
  difference: (closure: Closure) => number,
): Residual[] {
  return closures.map((closure, t) => ({
    baselines: closure.rows.map((row) => baselineOf(data.station1[row], data.station2[row])),
    value: difference(closure) / Math.sqrt(covariance[t * closures.length + t]),
  }));
}

function squaredResiduals(data: Visibilities, at: ModelVisibilities): Residual[] {
  const { squared } = data;
  if (!squared) return [];
  const { squared: from, origin } = pointsOf(data);
  return Array.from(squared.value, (value, m) => {
    const model = productAt({ points: [from + m, origin], powers: [2, -2] }, at, 'amplitude');
    return {
      baselines: [baselineOf(squared.station1[m], squared.station2[m])],
      value: (value - model) / squared.sigma[m],
    };
  });
}

function tripleResiduals(
  data: Visibilities,
  at: ModelVisibilities,
  part: 'phase' | 'amplitude',
  minimumSnr: number,
): Residual[] {
  const { triples } = data;
  if (!triples) return [];
  const { triples: from, origin } = pointsOf(data);
  return triplesFor(part, data, minimumSnr).chosen.map((t) => {
    const sides = [from + 3 * t, from + 3 * t + 1, from + 3 * t + 2];
    const [a, b, c] = [triples.station1[t], triples.station2[t], triples.station3[t]];
    const baselines = [baselineOf(a, b), baselineOf(b, c), baselineOf(a, c)];
    if (part === 'phase') {
      const model = productAt({ points: sides, powers: [1, 1, -1] }, at, 'phase');
      return { baselines, value: wrapPhase(triples.phase[t] - model) / triples.sigmaPhase[t] };
    }
    const model = productAt({ points: [...sides, origin], powers: [1, 1, 1, -3] }, at, 'amplitude');
    return { baselines, value: (triples.amplitude[t] - model) / triples.sigmaAmplitude[t] };
  });
}

export function baselineOf(a: number, b: number): Baseline {
  return `${Math.min(a, b)}-${Math.max(a, b)}`;
}

/** Indices of the stations of a residual, each once. */
export function stationsIn(baselines: readonly Baseline[]): number[] {
  return [...new Set(baselines.flatMap((baseline) => baseline.split('-').map(Number)))];
}
