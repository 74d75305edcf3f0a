/** The error budget: what every amplitude and phase needs, beyond its noise, for values that must agree to scatter by
 *  their errors. From co-located stations; where these give too few values, from the differences to another band or
 *  hand. Those give a lower bound for hands: errors that both have in common cancel in them. Between bands the source's
 *  own difference enters too, which the warning says. The budget's own uncertainty is an interval of 68 %, by inverting
 *  the chi-square test (agreement.ts). */

import type { Visibilities } from '../data.ts';
import { agreement, budget, type Group } from './agreement.ts';
import type { Measured } from './checks.ts';
import type { OtherMeasured } from './other-agreement.ts';
import type { CheckParameters } from './parameters.ts';

/** No estimate goes beyond: an amplitude error of 100 %, a phase error of half a turn. */
const MOST = { amplitude: 1, phase: Math.PI } as const;
/** Hands of one observation may differ by so much in (u,v), where one lacks some records; bands differ by more. */
const SAME_UV = 1e-3;

export interface BudgetPart {
  readonly value: number;
  /** 68 %; null when the recipe gives the value. */
  readonly interval: readonly [number, number] | null;
  /** On how many independent values it was estimated; null when the recipe gives it. */
  readonly from: number | null;
  readonly isLowerBound: boolean;
}

export interface ErrorBudget {
  /** Fraction of the amplitude. */
  readonly amplitude: BudgetPart;
  /** Radians. */
  readonly phase: BudgetPart;
  readonly warnings: readonly string[];
}

/** @param other  the comparison that the budget may fall back on: the first of those made */
export function estimateBudget(
  measured: Measured,
  other: OtherMeasured | undefined,
  { amplitudeBudget, phaseBudget, least }: CheckParameters,
): ErrorBudget {
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
    amplitude,
    phase,
    warnings: both.flatMap(([what, found]) => warningOf(what, found, least, other?.rows.uvDifference ?? 0)),
  };
}

function estimate(
  groups: readonly Group[],
  otherGroups: readonly Group[],
  given: number | 'estimate',
  most: number,
  least: number,
): BudgetPart {
  if (given !== 'estimate') return { value: given, interval: null, from: null, isLowerBound: false };
  const { degrees } = agreement(groups);
  if (degrees >= least) return partOf(groups, most, degrees, false);
  const others = agreement(otherGroups).degrees;
  if (others >= least) return partOf(otherGroups, most, others, true);
  return { value: 0, interval: null, from: degrees, isLowerBound: false };
}

function partOf(groups: readonly Group[], most: number, from: number, isLowerBound: boolean): BudgetPart {
  const { value, low, high } = budget(groups, most);
  return { value, interval: [low, high], from, isLowerBound };
}

function warningOf(
  what: string,
  { from, isLowerBound }: BudgetPart,
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

/** What the report says of it. */
export function budgetReport({ amplitude, phase }: ErrorBudget, hasOther: boolean) {
  const degrees = (radians: number) => (radians * 180) / Math.PI;
  const lowerBounds = [
    ...(amplitude.isLowerBound ? ['amplitude'] : []),
    ...(phase.isLowerBound ? ['phase'] : []),
  ];
  return {
    amplitudeFraction: amplitude.value,
    phaseDegrees: degrees(phase.value),
    /** 68 %. */
    amplitudeInterval: amplitude.interval,
    phaseIntervalDegrees: phase.interval?.map(degrees) ?? null,
    amplitudeEstimatedFrom: amplitude.from,
    phaseEstimatedFrom: phase.from,
    ...(hasOther ? { lowerBounds } : {}),
  };
}

/** The budget in quadrature: amplitude·|V| on sigma, phase on sigmaPhase. */
export function withBudget(visibilities: Visibilities, budget: ErrorBudget): Visibilities {
  const { re, im } = visibilities;
  const [amplitude, phase] = [budget.amplitude.value, budget.phase.value];
  return {
    ...visibilities,
    sigma: visibilities.sigma.map((sigma, k) =>
      Math.sqrt(sigma * sigma + amplitude * amplitude * (re[k] * re[k] + im[k] * im[k])),
    ),
    sigmaPhase: visibilities.sigmaPhase.map((sigma) => Math.sqrt(sigma * sigma + phase * phase)),
  };
}
