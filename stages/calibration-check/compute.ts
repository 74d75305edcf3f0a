/** The computation of `calibration-check`: measure, judge, budget, write. */

import type { Visibilities } from '../data.ts';
import { writeJson } from '../formats/json.ts';
import { readVisibilities, writeVisibilities } from '../formats/visibilities.ts';
import type { Finding, StageReport, StageTask } from '../kind.ts';
import { closureSets } from '../numerics/closures.ts';
import { exp } from '../numerics/elementary.ts';
import { checkAfterFit } from './after-fit.ts';
import { agreement } from './agreement.ts';
import { type Measured, measure, type Outcome, runChecks } from './checks.ts';
import { type ErrorBudget, estimateBudget, withBudget } from './error-budget.ts';
import { outOfLimitsText } from './findings.ts';
import { checkOther, measureOther, type OtherMeasured, otherReport } from './other-agreement.ts';
import { readParameters } from './parameters.ts';
import { checkStatedNoise } from './stated-noise.ts';

export function compute(task: StageTask): StageReport {
  const parameters = readParameters(task.parameters);
  const visibilities = readVisibilities(task.inputs.visibilities[0]);
  const measured = measure(visibilities, parameters);
  task.note('measured', { pairs: measured.pairs.length, triangles: measured.triangles.length });
  const otherSource = task.inputs.other?.[0];
  const other = otherSource && measureOther(visibilities, readVisibilities(otherSource), parameters);
  task.progress(0.4);
  const outcomes = [
    ...runChecks(visibilities, measured, parameters),
    ...checkStatedNoise(task.inputs.report?.[0], parameters),
    ...(other ? checkOther(other, parameters) : []),
    ...checkAfterFit(task.inputs.fitReport?.[0], task.inputs.residuals?.[0], parameters),
  ];
  const errorBudget = estimateBudget(measured, other, parameters);
  const findings = outcomes.filter((outcome): outcome is Finding => 'finding' in outcome);
  const warnings = [...outcomes.flatMap(tooLittleWarning), ...errorBudget.warnings];
  writeVisibilities(task.outputs.visibilities, withBudget(visibilities, errorBudget));
  writeJson(task.outputs.report, reportOf(visibilities, measured, other, findings, errorBudget, warnings));
  const out = outOfLimitsText(findings);
  return {
    findings,
    warnings,
    ...(out === undefined ? {} : parameters.outOfLimits === 'stop' ? { stop: out } : { mark: out }),
  };
}

function tooLittleWarning(outcome: Outcome): string[] {
  if (!('tooLittle' in outcome)) return [];
  const on = outcome.on === undefined ? '' : ` on ${outcome.on}`;
  return [`Check ${outcome.check} was not made${on}: ${outcome.tooLittle}.`];
}

function reportOf(
  visibilities: Visibilities,
  measured: Measured,
  other: OtherMeasured | undefined,
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
      ...(other ? { lowerBounds: errorBudget.lowerBounds } : {}),
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
    ...(other ? { otherAgreement: otherReport(other) } : {}),
    warnings,
  };
}
