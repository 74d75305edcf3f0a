/** The computation of `calibration-check`: measure, judge, budget, write. */

import { writeJson } from '../formats/json.ts';
import { readVisibilities } from '../formats/visibilities.ts';
import { writeVisibilities } from '../formats/visibilities-write.ts';
import type { StageReport, StageTask } from '../kind.ts';
import { checkAfterFit } from './after-fit.ts';
import { measure, type Outcome, runChecks } from './checks.ts';
import { estimateBudget, withBudget } from './error-budget.ts';
import { type Judged, outOfLimitsText, plain } from './findings.ts';
import { checkOther, measureOther } from './other-agreement.ts';
import { readParameters } from './parameters.ts';
import { reportOf } from './report.ts';
import { checkStatedNoise } from './stated-noise.ts';
import { checkTrends, measureTrends } from './trends.ts';

export function compute(task: StageTask): StageReport {
  const parameters = readParameters(task.parameters);
  const visibilities = readVisibilities(task.inputs.visibilities[0]);
  const isOptical = visibilities.count === 0 && Boolean(visibilities.squared ?? visibilities.triples);
  const measured = measure(visibilities, parameters);
  const trends = measureTrends(visibilities, measured);
  task.note('measured', { pairs: measured.pairs.length, triangles: measured.triangles.length });
  const otherSources = task.inputs.other ?? [];
  const others = otherSources.map((source) =>
    measureOther(visibilities, readVisibilities(source), parameters),
  );
  task.progress(0.4);
  const name = (k: number) => (others.length > 1 ? otherSources[k].name : '');
  const afterFit = checkAfterFit(task.inputs.fitReport?.[0], task.inputs.residuals?.[0], parameters);
  const outcomes = [
    ...runChecks(visibilities, measured, parameters),
    checkTrends(trends, parameters),
    ...checkStatedNoise(task.inputs.report?.[0], parameters),
    ...others.flatMap((other, k) => checkOther(other, parameters, name(k))),
    ...afterFit.outcomes,
  ];
  const errorBudget = estimateBudget(measured, others[0], parameters);
  const findings = outcomes.filter((outcome): outcome is Judged => 'finding' in outcome);
  const warnings = isOptical
    ? [NOTHING_TO_CHECK]
    : [...outcomes.flatMap(tooLittleWarning), ...errorBudget.warnings];
  writeVisibilities(task.outputs.visibilities, withBudget(visibilities, errorBudget));
  const found = { measured, trends, others, afterFit, findings, errorBudget, warnings };
  writeJson(task.outputs.report, reportOf(visibilities, found, parameters));
  const out = outOfLimitsText(findings);
  return {
    findings: findings.map(plain),
    warnings,
    ...(out === undefined ? {} : parameters.outOfLimits === 'stop' ? { stop: out } : { mark: out }),
  };
}

/** No gain of a station enters squared visibilities and triple products, and what they share with others is not known. */
const NOTHING_TO_CHECK =
  'No check was made and no error budget estimated: squared visibilities and triple products hold no gains of stations.';

function tooLittleWarning(outcome: Outcome): string[] {
  if (!('tooLittle' in outcome)) return [];
  const on = outcome.on === undefined ? '' : ` on ${outcome.on}`;
  return [`Check ${outcome.check} was not made${on}: ${outcome.tooLittle}.`];
}
