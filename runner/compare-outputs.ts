/** Compares what a rerun made with what the book records: byte for byte, and where bytes differ, published numbers
 *  against the tolerance that their recipe states. */

import type { Book } from '../ledger/book.ts';
import type { PublishedNumber, RerunDraft, StageEntry, Verdict } from '../ledger/entry.ts';
import { sourceOf } from '../stages/bytes.ts';
import { readNumbers } from '../stages/formats/json.ts';
import { convert } from '../stages/units.ts';
import type { Outcome } from './job.ts';

export type ComparedOutput = RerunDraft['outputs'][number];

/** Compares every output of one stage.
 *  @param published  the numbers that the recorded run published */
export function compareStage(
  recorded: StageEntry,
  outcome: Outcome,
  published: readonly PublishedNumber[],
  book: Book,
): ComparedOutput[] {
  return Object.entries(recorded.outputs).map(([output, was]) => {
    const is = outcome.outputs[output]?.digest ?? null;
    const base = { stage: recorded.name, output, was: was.digest, is };
    if (is === was.digest) return { ...base, verdict: 'identical' as const, largestDeviation: 0 };
    const own = published.filter((number) => number.entry === recorded.number && number.output === output);
    if (is === null || own.length === 0) {
      return { ...base, verdict: 'different' as const, largestDeviation: null };
    }
    return { ...base, ...compareNumbers(own, is, book) };
  });
}

/** The largest deviation in units of the tolerance that allows it, or of the value where none is stated. */
function compareNumbers(published: readonly PublishedNumber[], digest: string, book: Book) {
  const { values } = readNumbers(sourceOf(book.store.read(digest), digest.slice(0, 12)));
  let largestDeviation = 0;
  let within = true;
  for (const number of published) {
    const now = values[number.key];
    const deviation =
      now === undefined
        ? Number.POSITIVE_INFINITY
        : Math.abs(convert(now.value, now.unit, number.unit) - number.value);
    within = within && number.tolerance !== null && deviation <= number.tolerance;
    const scale = number.tolerance ?? Math.abs(number.value);
    largestDeviation = Math.max(largestDeviation, scale > 0 ? deviation / scale : deviation);
  }
  const verdict: Verdict = within ? 'within tolerance' : 'different';
  return { verdict, largestDeviation: Number.isFinite(largestDeviation) ? largestDeviation : null };
}

/** Of the whole: identical when every byte is; within tolerance when every published number is inside its own. */
export function overallVerdict(
  outputs: readonly ComparedOutput[],
  published: readonly PublishedNumber[],
): Verdict {
  if (outputs.every((output) => output.verdict === 'identical')) return 'identical';
  const held = published.map((number) => outputs.find((o) => o.output === number.output && holds(o, number)));
  const inside = held.length > 0 && held.every((o) => o !== undefined && o.verdict !== 'different');
  return inside && outputs.every((output) => output.is !== null) ? 'within tolerance' : 'different';
}

function holds(output: ComparedOutput, number: PublishedNumber): boolean {
  return output.output === number.output && output.largestDeviation !== null;
}
