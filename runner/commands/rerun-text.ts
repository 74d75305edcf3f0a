/** A rerun as text: what became of every output, what differs, the verdict. */

import type { RerunDraft, Verdict } from '../../ledger/entry.ts';
import type { ComparedOutput } from '../compare-outputs.ts';
import type { Outcome } from '../job.ts';
import { wrapped } from '../wrapped.ts';
import type { RerunSubject } from './rerun-subject.ts';

/** @param where  where the record is, such as `entry 12` for the comparison's own entry, or the bag */
export function rerunText(
  subject: RerunSubject,
  draft: RerunDraft,
  where: string,
  outcomes: readonly Outcome[],
): string {
  const name = (output: ComparedOutput) => `${output.stage}.${output.output}`;
  const width = Math.max(...draft.outputs.map((output) => name(output).length));
  const lines = draft.outputs.map((output) => {
    const digests =
      output.is === output.was
        ? output.was.slice(0, 12)
        : `${output.was.slice(0, 12)} → ${output.is?.slice(0, 12) ?? 'none'}`;
    return `  ${name(output).padEnd(width)}   ${output.verdict.padEnd(16)}   ${digests}`;
  });
  const seconds = outcomes.reduce((sum, outcome) => sum + outcome.seconds, 0).toFixed(1);
  const what =
    subject.of.type === 'run' ? `run ${subject.of.run}` : `${subject.of.type} entry ${subject.of.number}`;
  const differences = draft.differences.map((text) => wrapped(text, 100, 2, 2));
  return [
    '',
    ...lines,
    '',
    ...(differences.length > 0 ? [...differences, ''] : []),
    `${verdictSentence(draft.verdict)} (${what}, ${outcomes.length} stages, ${seconds} s; ${where})`,
    '',
  ].join('\n');
}

function verdictSentence(verdict: Verdict): string {
  if (verdict === 'identical') return 'identical: every output has the recorded bytes';
  if (verdict === 'within tolerance')
    return 'within tolerance: every published number is inside its tolerance';
  return 'different';
}
