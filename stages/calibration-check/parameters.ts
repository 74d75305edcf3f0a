/** Parameters of `calibration-check` as the computation uses them. Ranges were checked against the declaration. */

import { InputProblem } from '../problem.ts';

export interface Limits {
  readonly marginal: number;
  readonly limit: number;
}

/** Names of the checks, as recipes, findings and reports have them. */
export const CHECKS = [
  'closureScatter',
  'redundantPhases',
  'redundantAmplitudes',
  'gainOffset',
  'gainScatter',
  'pairGainsOverTime',
  'stationAmplitudes',
  'closureTrends',
  'statedNoise',
  'noiseByBaseline',
  'otherAgreement',
  'gainsOverTime',
  'baselinePhases',
  'baselineAmplitudes',
] as const;

export type CheckName = (typeof CHECKS)[number];

export interface CheckParameters {
  /** Metres. */
  readonly colocated: number;
  readonly minimumSnr: number;
  readonly least: number;
  /** Relative, of (u,v) to those of the input `other`. */
  readonly uvDifference: number;
  readonly limits: Readonly<Record<CheckName, Limits>>;
  /** A fraction. */
  readonly amplitudeBudget: number | 'estimate';
  /** Radians. */
  readonly phaseBudget: number | 'estimate';
  readonly outOfLimits: 'stop' | 'mark';
}

type Declared = Omit<CheckParameters, 'limits'> & Readonly<Record<CheckName, Limits>>;

/** Reads the parameters. @throws InputProblem code `parameter` for a marginal value above its limit. */
export function readParameters(parameters: Readonly<Record<string, unknown>>): CheckParameters {
  const declared = parameters as unknown as Declared;
  const limits = Object.fromEntries(
    CHECKS.map((name) => [name, requireOrder(name, declared[name])]),
  ) as Record<CheckName, Limits>;
  const { colocated, minimumSnr, least, uvDifference, amplitudeBudget, phaseBudget, outOfLimits } = declared;
  return {
    colocated,
    minimumSnr,
    least,
    uvDifference,
    limits,
    amplitudeBudget,
    phaseBudget: phaseBudget === 'estimate' ? phaseBudget : (phaseBudget * Math.PI) / 180,
    outOfLimits,
  };
}

function requireOrder(name: string, limits: Limits): Limits {
  if (limits.marginal <= limits.limit) return limits;
  throw new InputProblem({
    code: 'parameter',
    place: `parameter ${name}`,
    expected: 'marginal no larger than limit',
    found: `${limits.marginal} and ${limits.limit}`,
    advice: 'Exchange them, or correct one.',
  });
}
