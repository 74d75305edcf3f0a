/** What a measured value is against its limits, in what words, and how often sound data exceed them by chance. */

import type { Finding } from '../kind.ts';
import type { Agreement } from './agreement.ts';
import type { Limits } from './parameters.ts';

/** The probability that sound data give a value above this one. */
export type Exceeds = (value: number) => number;

/** What chance alone does: of a value as large as the one measured, and of values above each limit. */
export interface Chance {
  readonly value: number;
  readonly marginal: number;
  readonly limit: number;
}

/** A finding. `chance` is absent where noise does not decide, as with the size of gains. */
export interface Judged extends Finding {
  readonly chance?: Chance;
}

/** The finding on a value; NaN is out of limits. */
export function judge(
  check: string,
  value: number,
  limits: Limits,
  detail: string,
  exceeds?: Exceeds,
): Judged {
  const finding = !(value <= limits.limit)
    ? 'out of limits'
    : value <= limits.marginal
      ? 'within limits'
      : 'marginal';
  const found = { check, finding, value, marginal: limits.marginal, limit: limits.limit, detail } as const;
  if (exceeds === undefined) return found;
  const chance = {
    value: exceeds(value),
    marginal: exceeds(limits.marginal),
    limit: exceeds(limits.limit),
  };
  return { ...found, chance };
}

/** The finding as entries have it. */
export function plain({ check, finding, value, marginal, limit, detail }: Judged): Finding {
  return { check, finding, value, marginal, limit, detail };
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
