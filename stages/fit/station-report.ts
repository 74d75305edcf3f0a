/** How well the fit agrees with each station's measurements. */

import { termsOf } from '../imaging/data-terms.ts';
import type { FitResult } from '../imaging/run-fit.ts';
import type { FitSettings } from '../imaging/settings.ts';
import { type NormalisedResidual, normalisedResiduals, stationsIn } from './normalised-residuals.ts';
import type { TermReport } from './report.ts';

export interface StationReport {
  readonly station: string;
  /** By data term. */
  readonly terms: readonly {
    readonly term: string;
    readonly measurements: number;
    /** Mean square of the residuals over their errors, over the term's degrees of freedom per measurement. Closures count
     *  with their own variances. */
    readonly reducedChiSquare: number;
  }[];
}

export function stationReports(
  { problem, at, gains }: FitResult,
  settings: FitSettings,
  reports: readonly TermReport[],
): StationReport[] {
  const residuals = normalisedResiduals(problem, settings, at, gains).map(({ baselines, ...rest }) => ({
    ...rest,
    stations: stationsIn(baselines),
  }));
  return problem.data.stations.flatMap(({ name }, index) => {
    const own = residuals.filter(({ stations }) => stations.includes(index));
    if (own.length === 0) return [];
    return [{ station: name, terms: termsOf(settings.data).map((_, k) => ofTerm(own, k, reports[k])) }];
  });
}

function ofTerm(own: readonly Pick<NormalisedResidual, 'term' | 'value'>[], k: number, report: TermReport) {
  const values = own.filter(({ term }) => term === k).map(({ value }) => value);
  const free = report.degreesOfFreedom / report.measurements;
  const square = values.reduce((sum, value) => sum + value * value, 0);
  return {
    term: report.term,
    measurements: values.length,
    reducedChiSquare: free > 0 && values.length > 0 ? square / values.length / free : 0,
  };
}
