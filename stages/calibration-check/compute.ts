/** The computation of `calibration-check`: measure, judge, budget, write. */

import type { Visibilities } from '../data.ts';
import { writeJson } from '../formats/json.ts';
import { readVisibilities, writeVisibilities } from '../formats/visibilities.ts';
import type { Finding, StageReport, StageTask } from '../kind.ts';
import { closureSets } from '../numerics/closures.ts';
import { exp } from '../numerics/elementary.ts';
import { agreement, budget, type Group } from './agreement.ts';
import { type Measured, measure, type Outcome, runChecks } from './checks.ts';
import { outOfLimitsText } from './findings.ts';
import { type CheckParameters, readParameters } from './parameters.ts';
import { checkStatedNoise } from './stated-noise.ts';

/** No estimate goes beyond: an amplitude error of 100 %, a phase error of half a turn. */
const MOST = { amplitude: 1, phase: Math.PI } as const;

export function compute(task: StageTask): StageReport {
  const parameters = readParameters(task.parameters);
  const visibilities = readVisibilities(task.inputs.visibilities[0]);
  const measured = measure(visibilities, parameters);
  task.note('measured', { pairs: measured.pairs.length, triangles: measured.triangles.length });
  task.progress(0.4);
  const outcomes = [
    ...runChecks(visibilities, measured, parameters),
    ...checkStatedNoise(task.inputs.report?.[0], parameters),
  ];
  const errorBudget = estimateBudget(measured, parameters);
  const findings = outcomes.filter((outcome): outcome is Finding => 'finding' in outcome);
  const warnings = [...outcomes.flatMap(tooLittleWarning), ...errorBudget.warnings];
  writeVisibilities(task.outputs.visibilities, withBudget(visibilities, errorBudget));
  writeJson(task.outputs.report, reportOf(visibilities, measured, findings, errorBudget, warnings));
  const out = outOfLimitsText(findings);
  return {
    findings,
    warnings,
    ...(out === undefined ? {} : parameters.outOfLimits === 'stop' ? { stop: out } : { mark: out }),
  };
}

function tooLittleWarning(outcome: Outcome): string[] {
  return 'tooLittle' in outcome ? [`Check ${outcome.check} was not made: ${outcome.tooLittle}.`] : [];
}

export interface ErrorBudget {
  /** Fraction of the amplitude. */
  readonly amplitude: number;
  /** Radians. */
  readonly phase: number;
  /** On how many independent values each was estimated; null when the recipe gives it. */
  readonly amplitudeFrom: number | null;
  readonly phaseFrom: number | null;
  readonly warnings: readonly string[];
}

function estimateBudget(measured: Measured, parameters: CheckParameters): ErrorBudget {
  const { amplitudeBudget, phaseBudget, least } = parameters;
  const amplitude = estimate(measured.amplitudeGroups, amplitudeBudget, MOST.amplitude, least);
  const phase = estimate(measured.triangleGroups, phaseBudget, MOST.phase, least);
  const warn = (what: string, { from }: Estimate) =>
    from !== null && from < least
      ? [`The ${what} of the error budget is 0: ${from} values are too few to estimate it.`]
      : [];
  return {
    amplitude: amplitude.value,
    phase: phase.value,
    amplitudeFrom: amplitude.from,
    phaseFrom: phase.from,
    warnings: [...warn('amplitude', amplitude), ...warn('phase', phase)],
  };
}

interface Estimate {
  readonly value: number;
  readonly from: number | null;
}

function estimate(
  groups: readonly Group[],
  given: number | 'estimate',
  most: number,
  least: number,
): Estimate {
  if (given !== 'estimate') return { value: given, from: null };
  const { degrees } = agreement(groups);
  return { value: degrees < least ? 0 : budget(groups, most), from: degrees };
}

/** The budget in quadrature: amplitude·|V| on sigma, phase on sigmaPhase. */
function withBudget(visibilities: Visibilities, { amplitude, phase }: ErrorBudget): Visibilities {
  const { re, im } = visibilities;
  return {
    ...visibilities,
    sigma: visibilities.sigma.map((sigma, k) =>
      Math.sqrt(sigma * sigma + amplitude * amplitude * (re[k] * re[k] + im[k] * im[k])),
    ),
    sigmaPhase: visibilities.sigmaPhase.map((sigma) => Math.sqrt(sigma * sigma + phase * phase)),
  };
}

function reportOf(
  visibilities: Visibilities,
  measured: Measured,
  findings: readonly Finding[],
  errorBudget: ErrorBudget,
  warnings: readonly string[],
) {
  const { stations } = visibilities;
  const sets = closureSets(visibilities, { minimumSnr: 0, minimumAmplitudeSnr: 0 });
  const count = (lists: readonly (readonly unknown[])[]) => lists.reduce((sum, list) => sum + list.length, 0);
  return {
    target: visibilities.target.name,
    remark: visibilities.remark,
    findings,
    errorBudget: {
      amplitudeFraction: errorBudget.amplitude,
      phaseDegrees: (errorBudget.phase * 180) / Math.PI,
      amplitudeEstimatedFrom: errorBudget.amplitudeFrom,
      phaseEstimatedFrom: errorBudget.phaseFrom,
    },
    closures: {
      scans: sets.length,
      triangles: count(sets.map((set) => set.triangles)),
      quadrangles: count(sets.map((set) => set.quadrangles)),
      trivialTriangles: measured.triangles.length,
      trivialQuadrangles: agreement(measured.amplitudeGroups).degrees,
    },
    pairs: measured.pairs.map((pair) => ({
      stations: [stations[pair.a].name, stations[pair.b].name],
      distanceMetres: pair.distance,
    })),
    gainRatios: measured.pairGains.map(({ pair, scans, logRatio, sigma, offset, scatter }) => ({
      stations: [stations[pair.a].name, stations[pair.b].name],
      meanLogRatio: offset,
      scatter,
      scans,
      logRatio,
      sigma,
    })),
    stationGains: measured.stationGains.map(({ station, logGain }) => ({
      station: stations[station].name,
      gain: exp(logGain),
      logGain,
    })),
    warnings,
  };
}
