/** Agreement with the same observation in another band or hand, or on another day. The source is the same, and so are
 *  closures: closure phases and log closure amplitudes of both must differ by their errors only. Of days scans of like
 *  sidereal time are compared; a source that changes from day to day is then among what differs.
 *
 *  Two hands have the same (u,v). Two bands do not: (u,v) differ by the ratio of the frequencies, and the source itself
 *  differs with them, most of all beside a null of its visibility. Rows are compared only where (u,v) differ by less
 *  than a stated fraction; where none is left the check is not possible, and its warning says so. */

import type { Visibilities } from '../data.ts';
import type { Outcome } from './checks.ts';
import {
  type Differences,
  differencesTail,
  logAmplitudeDifferences,
  phaseDifferences,
  worstBaseline,
} from './closure-differences.ts';
import { type CommonRows, commonRows } from './common-rows.ts';
import { judge } from './findings.ts';
import type { CheckName, CheckParameters } from './parameters.ts';

export interface OtherMeasured {
  readonly rows: CommonRows;
  /** Null where both are the same numbers: one measurement, which agrees with itself. */
  readonly phases: Differences | null;
  readonly amplitudes: Differences | null;
}

/** @throws InputProblem when the two do not have one target */
export function measureOther(
  visibilities: Visibilities,
  other: Visibilities,
  { uvDifference, minimumSnr }: CheckParameters,
): OtherMeasured {
  const rows = commonRows(visibilities, other, uvDifference, minimumSnr);
  return isOneMeasurement(rows)
    ? { rows, phases: null, amplitudes: null }
    : { rows, phases: phaseDifferences(rows), amplitudes: logAmplitudeDifferences(rows) };
}

function isOneMeasurement({ first, other }: CommonRows): boolean {
  return (
    first.count > 0 &&
    first.re.every((value, k) => value === other.re[k]) &&
    first.im.every((value, k) => value === other.im[k])
  );
}

const CHECK: CheckName = 'otherAgreement';

/** The finding: its value is the larger of the scatter of all and that of the worst baseline, less what the largest of
 *  so many may have above 1 by chance, of closure phases and log closure amplitudes.
 *  @param name  tells several inputs apart; empty for one */
export function checkOther(
  { rows, phases, amplitudes }: OtherMeasured,
  parameters: CheckParameters,
  name = '',
): Outcome[] {
  const whole = name === '' ? {} : { on: name };
  const impossible = reasonAgainst(rows, parameters);
  if (impossible !== null) return [{ check: CHECK, ...whole, tooLittle: impossible }];
  if (phases === null || amplitudes === null) {
    const tooLittle = 'both inputs hold the same numbers, one measurement written twice';
    return [{ check: CHECK, ...whole, tooLittle }];
  }
  const parts = [
    { quantity: 'closure phases', differences: phases },
    { quantity: 'log closure amplitudes', differences: amplitudes },
  ];
  const { least } = parameters;
  const enough = parts.filter(({ differences }) => differences.independent >= least);
  const missing = parts
    .filter((part) => !enough.includes(part))
    .map(({ quantity, differences }) => ({
      check: CHECK,
      on: name === '' ? quantity : `${quantity} of ${name}`,
      tooLittle: `${differences.independent} independent ones are in both inputs, at least ${least} are needed`,
    }));
  if (enough.length === 0) return missing;
  const value = Math.max(...enough.map(({ differences }) => largestScatter(differences)));
  const details = enough.map(({ quantity, differences }) => describe(quantity, differences));
  const days = rows.days === 0 ? '' : ` ${describeDays(rows.days)}`;
  const input = name === '' ? 'the input other' : `the input ${name}`;
  const detail = `Scatter of differences to ${input}${days}, over the errors of both: ${details.join('; ')}.`;
  const exceeds = (limit: number) =>
    enough.reduce((sum, { differences }) => {
      const p = differencesTail(differences, limit);
      return sum + p - sum * p;
    }, 0);
  return [judge(CHECK, value, parameters.limits.otherAgreement, detail, exceeds), ...missing];
}

function describeDays(days: number): string {
  const count = Math.round(Math.abs(days));
  return `of ${count} ${count === 1 ? 'day' : 'days'} ${days > 0 ? 'later' : 'before'}, at like sidereal time`;
}

function reasonAgainst(rows: CommonRows, { uvDifference, minimumSnr }: CheckParameters): string | null {
  if (rows.found === 0) {
    return `no baseline is in both inputs at the same time with a signal-to-noise ratio of ${minimumSnr}`;
  }
  if (rows.first.count > 0) return null;
  const percent = (fraction: number) => `${(100 * fraction).toPrecision(3)} %`;
  return (
    `(u,v) of the ${rows.found} common rows differ by ${percent(rows.uvDifference)}, more than the ` +
    `${percent(uvDifference)} within which the source itself counts as the same`
  );
}

function largestScatter(differences: Differences): number {
  return Math.max(differences.scatter, worstBaseline(differences)?.value ?? 0);
}

function describe(name: string, differences: Differences): string {
  const all = `${differences.scatter.toFixed(2)} of ${differences.independent} independent ${name}`;
  const worst = worstBaseline(differences);
  if (worst === undefined) return `${all}, too few to tell baselines apart`;
  return (
    `${all}, worst for ${worst.baseline}, ${worst.scatter.toFixed(2)} in ${worst.normalised.length} scans ` +
    `(by chance up to ${worst.expected.toFixed(2)} of ${differences.baselines.length} baselines)`
  );
}

/** What the report says of the comparison. */
export function otherReport({ rows, phases, amplitudes }: OtherMeasured) {
  const part = (differences: Differences | null) =>
    differences && {
      independent: differences.independent,
      scatter: differences.scatter,
      medianDifference: differences.offset,
      baselines: differences.baselines.map(({ baseline, normalised, scatter }) => ({
        baseline,
        scans: normalised.length,
        scatter,
      })),
    };
  return {
    rowsInCommon: rows.found,
    rowsCompared: rows.first.count,
    medianUvDifference: rows.uvDifference,
    ...(rows.days === 0 ? {} : { daysLater: rows.days }),
    /** Radians. */
    closurePhases: part(phases),
    logClosureAmplitudes: part(amplitudes),
  };
}
