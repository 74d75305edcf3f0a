/** Findings as text: the value with the limits by which it was judged. */

import type { RecordedFinding } from '../ledger/entry.ts';
import { withMinus } from '../stages/formats/drawing/minus.ts';
import { counted } from './text-table.ts';

type Judged = Pick<RecordedFinding, 'value' | 'marginal' | 'limit'>;

/** `1.62 (marginal 1.5, limit 2.5)`. */
export function againstLimits({ value, marginal, limit }: Judged): string {
  return `${rounded(value)} (marginal ${marginal}, limit ${limit})`;
}

/** Lines for the terminal: what is not within its limits with its detail, one line for all that is. */
export function findingTexts(findings: readonly RecordedFinding[]): string[] {
  const good = findings.filter(({ finding }) => finding === 'within limits');
  const others = findings.filter(({ finding }) => finding !== 'within limits');
  const list = good.map(({ check, value, limit }) => `${check} ${rounded(value)} (${limit})`).join(', ');
  return [
    ...others.map((each) => `${each.finding}: ${each.check} ${againstLimits(each)}: ${each.detail}`),
    ...(good.length === 0
      ? []
      : [`${counted(good.length, 'check', 'checks')} within limits, value (limit): ${list}`]),
  ];
}

/** Three significant digits, without trailing zeros. */
function rounded(value: number): string {
  return withMinus(String(Number(value.toPrecision(3))));
}
