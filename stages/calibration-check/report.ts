/** The output `report`. */

import type { Visibilities } from '../data.ts';
import { closureSets } from '../numerics/closures.ts';
import { exp } from '../numerics/elementary.ts';
import type { AfterFit } from './after-fit.ts';
import { agreement } from './agreement.ts';
import type { Measured } from './checks.ts';
import { budgetReport, type ErrorBudget } from './error-budget.ts';
import { type Judged, plain } from './findings.ts';
import { type OtherMeasured, otherReport } from './other-agreement.ts';
import type { CheckParameters } from './parameters.ts';
import { type Trends, trendsReport } from './trends.ts';

export interface Reported {
  readonly measured: Measured;
  readonly trends: Trends;
  readonly others: readonly OtherMeasured[];
  readonly afterFit: AfterFit;
  readonly findings: readonly Judged[];
  readonly errorBudget: ErrorBudget;
  readonly warnings: readonly string[];
}

export function reportOf(visibilities: Visibilities, found: Reported, { minimumSnr }: CheckParameters) {
  const { measured, others, findings, afterFit } = found;
  const name = (station: number) => visibilities.stations[station].name;
  return {
    target: visibilities.target.name,
    remark: visibilities.remark,
    findings: findings.map(plain),
    falseAlarms: falseAlarmsOf(findings),
    errorBudget: budgetReport(found.errorBudget, others.length > 0),
    rows: countRows(visibilities, minimumSnr),
    closures: countClosures(visibilities, measured),
    pairs: measured.pairs.map((pair) => ({
      stations: [name(pair.a), name(pair.b)],
      distanceMetres: pair.distance,
    })),
    gainRatios: measured.pairGains.map(({ pair, scans, logRatio, sigma, offset, scatter }) => ({
      stations: [name(pair.a), name(pair.b)],
      meanLogRatio: offset,
      scatter,
      scans,
      logRatio,
      sigma,
    })),
    stationGains: measured.stationGains.map(({ station, logGain }) => ({
      station: name(station),
      gain: exp(logGain),
      logGain,
    })),
    trends: trendsReport(found.trends),
    ...(others.length === 1 ? { otherAgreement: otherReport(others[0]) } : {}),
    ...(others.length > 1 ? { otherAgreements: others.map(otherReport) } : {}),
    ...(afterFit.stationGains ? { gainsOverTime: afterFit.stationGains } : {}),
    ...(afterFit.baselines ? { baselines: afterFit.baselines } : {}),
    warnings: found.warnings,
  };
}

/** How often sound data would be marginal or out of limits, and give a value as large as this one, by noise alone. */
function falseAlarmsOf(findings: readonly Judged[]) {
  return findings.flatMap(({ check, chance }) =>
    chance ? [{ check, marginal: chance.marginal, outOfLimits: chance.limit, asLarge: chance.value }] : [],
  );
}

/** Rows too faint for the checks on co-located stations, where phases and log amplitudes are no longer Gaussian. */
function countRows({ count, re, im, sigma }: Visibilities, minimumSnr: number) {
  let faint = 0;
  for (let k = 0; k < count; k++) {
    if (!(re[k] * re[k] + im[k] * im[k] >= minimumSnr * minimumSnr * sigma[k] * sigma[k])) faint++;
  }
  return { all: count, belowMinimumSnr: faint };
}

function countClosures(visibilities: Visibilities, measured: Measured) {
  const sets = closureSets(visibilities, { minimumSnr: 0, minimumAmplitudeSnr: 0 });
  const count = (lists: readonly (readonly unknown[])[]) => lists.reduce((sum, list) => sum + list.length, 0);
  return {
    scans: sets.length,
    triangles: count(sets.map((set) => set.triangles)),
    quadrangles: count(sets.map((set) => set.quadrangles)),
    trivialTriangles: measured.triangles.length,
    trivialQuadrangles: agreement(measured.amplitudeGroups).degrees,
  };
}
