/** The error budget: what every amplitude and phase needs, beyond its noise, for values that must agree to scatter by
 *  their errors. From co-located stations; where these give too few values, from the differences to another band or
 *  hand. Those give a lower bound for hands: errors that both have in common cancel in them. Between bands the source's
 *  own difference enters too, which the warning says. */

import type { Visibilities } from '../data.ts';
import { agreement, budget, type Group } from './agreement.ts';
import type { Measured } from './checks.ts';
import type { OtherMeasured } from './other-agreement.ts';
import type { CheckParameters } from './parameters.ts';

/** No estimate goes beyond: an amplitude error of 100 %, a phase error of half a turn. */
const MOST = { amplitude: 1, phase: Math.PI } as const;
/** Hands of one observation may differ by so much in (u,v), where one lacks some records; bands differ by more. */
const SAME_UV = 1e-3;

export interface ErrorBudget {
  /** Fraction of the amplitude. */
  readonly amplitude: number;
  /** Radians. */
  readonly phase: number;
  /** On how many independent values each was estimated; null when the recipe gives it. */
  readonly amplitudeFrom: number | null;
  readonly phaseFrom: number | null;
  /** Which of the two are lower bounds. */
  readonly lowerBounds: readonly string[];
  readonly warnings: readonly string[];
}

export function estimateBudget(
  measured: Measured,
  other: OtherMeasured | undefined,
  parameters: CheckParameters,
): ErrorBudget {
  const { amplitudeBudget, phaseBudget, least } = parameters;
  const amplitude = estimate(
    measured.amplitudeGroups,
    other?.amplitudes?.groups ?? [],
    amplitudeBudget,
    MOST.amplitude,
    least,
  );
  const phase = estimate(
    measured.triangleGroups,
    other?.phases?.groups ?? [],
    phaseBudget,
    MOST.phase,
    least,
  );
  const both = [
    ['amplitude', amplitude],
    ['phase', phase],
  ] as const;
  return {
    amplitude: amplitude.value,
    phase: phase.value,
    amplitudeFrom: amplitude.from,
    phaseFrom: phase.from,
    lowerBounds: both.filter(([, { isLowerBound }]) => isLowerBound).map(([what]) => what),
    warnings: both.flatMap(([what, found]) => warningOf(what, found, least, other?.rows.uvDifference ?? 0)),
  };
}

interface Estimate {
  readonly value: number;
  readonly from: number | null;
  readonly isLowerBound: boolean;
}

function estimate(
  groups: readonly Group[],
  otherGroups: readonly Group[],
  given: number | 'estimate',
  most: number,
  least: number,
): Estimate {
  if (given !== 'estimate') return { value: given, from: null, isLowerBound: false };
  const { degrees } = agreement(groups);
  if (degrees >= least) return { value: budget(groups, most), from: degrees, isLowerBound: false };
  const others = otherGroups.length;
  if (others >= least) return { value: budget(otherGroups, most), from: others, isLowerBound: true };
  return { value: 0, from: degrees, isLowerBound: false };
}

function warningOf(
  what: string,
  { from, isLowerBound }: Estimate,
  least: number,
  uvDifference: number,
): string[] {
  if (isLowerBound) {
    const source =
      uvDifference > SAME_UV
        ? ` It holds what the source changes between (u,v) that differ by ${(100 * uvDifference).toPrecision(2)} %.`
        : '';
    return [
      `The ${what} of the error budget comes from ${from} differences to the input other, for want of co-located stations: a lower bound, since errors that both have in common cancel.${source}`,
    ];
  }
  return from !== null && from < least
    ? [`The ${what} of the error budget is 0: ${from} values are too few to estimate it.`]
    : [];
}

/** The budget in quadrature: amplitude·|V| on sigma, phase on sigmaPhase. */
export function withBudget(visibilities: Visibilities, { amplitude, phase }: ErrorBudget): Visibilities {
  const { re, im } = visibilities;
  return {
    ...visibilities,
    sigma: visibilities.sigma.map((sigma, k) =>
      Math.sqrt(sigma * sigma + amplitude * amplitude * (re[k] * re[k] + im[k] * im[k])),
    ),
    sigmaPhase: visibilities.sigmaPhase.map((sigma) => Math.sqrt(sigma * sigma + phase * phase)),
  };
}
