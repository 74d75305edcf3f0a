/** What a measured value is against its limits, and in what words. */

import type { Finding } from '../kind.ts';
import type { Agreement } from './agreement.ts';
import type { Limits } from './parameters.ts';

/** The finding on a value; NaN is out of limits. */
export function judge(check: string, value: number, limits: Limits, detail: string): Finding {
  const finding = !(value <= limits.limit)
    ? 'out of limits'
    : value <= limits.marginal
      ? 'within limits'
      : 'marginal';
  return { check, finding, value, marginal: limits.marginal, limit: limits.limit, detail };
}

/** The label with the largest scatter among those with at least three values; of all, when none has three. */
export function worstLabel({
  byLabel,
}: Agreement): { label: string; scatter: number; values: number } | undefined {
  const all = [...byLabel].map(([label, squares]) => ({
    label,
    scatter: Math.sqrt(squares.reduce((sum, value) => sum + value, 0) / squares.length),
    values: squares.length,
  }));
  const often = all.filter(({ values }) => values >= 3);
  return (often.length > 0 ? often : all).sort(
    (a, b) => b.scatter - a.scatter || (a.label < b.label ? -1 : 1),
  )[0];
}

/** Why the run stops or the plates are marked; undefined when no finding is out of limits. */
export function outOfLimitsText(findings: readonly Finding[]): string | undefined {
  const out = findings.filter(({ finding }) => finding === 'out of limits');
  if (out.length === 0) return undefined;
  const list = out.map(({ check, value, limit }) => `${check} is ${value.toPrecision(3)}, limit ${limit}`);
  return `Calibration out of limits: ${list.join('; ')}.`;
}
