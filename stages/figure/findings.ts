/** Reads what the figures say of the calibration: how many checks are within their limits, and which are not. */

import { z } from 'zod';
import type { ByteSource } from '../bytes.ts';
import { readDocument } from '../formats/document.ts';

const reportSchema = z.object({
  findings: z.array(
    z.object({ check: z.string(), finding: z.enum(['within limits', 'marginal', 'out of limits']) }),
  ),
});

/** Where a calibration report is meant. */
export const ADVICE = 'Give the output report of a calibration check.';

export type CalibrationFindings = z.infer<typeof reportSchema>['findings'];

/** Reads the findings of a calibration report. @throws InputProblem when it has none. */
export function readFindings(source: ByteSource): CalibrationFindings {
  const expected = 'a report with findings, as the calibration check writes it';
  return readDocument(reportSchema, source, expected, ADVICE).findings;
}

/** Returns one line such as `Calibration: 4 checks within limits, marginal: closure-scatter`. */
export function describeFindings(findings: CalibrationFindings): string {
  if (findings.length === 0) return 'Calibration: no check was made';
  const named = (finding: string) =>
    findings.filter((each) => each.finding === finding).map(({ check }) => check);
  const within = named('within limits').length;
  const parts = within === 0 ? [] : [`${within} ${within === 1 ? 'check' : 'checks'} within limits`];
  for (const finding of ['marginal', 'out of limits']) {
    const checks = named(finding);
    if (checks.length > 0) parts.push(`${finding}: ${checks.join(', ')}`);
  }
  return `Calibration: ${parts.join('; ')}`;
}
