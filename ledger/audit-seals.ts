/** The part of an audit that holds the ledger's tree against every seal that was kept: each must be a seal of this book,
 *  signed by a key of the book, with the root that the first so many entries have. All of them being heads of one tree,
 *  each is a continuation of those before it. */

import type { AuditedTree, Problem, Report } from './audit-ledger.ts';
import { keptNotes } from './kept-seals.ts';
import { parseSeal } from './seal.ts';
import { signatureFault } from './seal-keys.ts';
import type { VerifierKey } from './signed-note.ts';

interface Kept {
  readonly keys: readonly VerifierKey[];
  readonly tree: AuditedTree;
  /** Lines of the ledger. */
  readonly count: number;
  /** The entries that are runs. */
  readonly runs: readonly number[];
  readonly book: string | undefined;
  /** What was found so far. */
  readonly problems: ReadonlyMap<number, Problem>;
  readonly report: Report;
}

/** Reports what does not agree. @returns remarks. Cost: a signature and log n hashes for each kept seal. */
export function auditKept(
  directory: string,
  { keys, tree, count, runs, book, problems, report }: Kept,
): string[] {
  const beside = { beside: true } as const;
  const sealed = new Set<number>();
  // A changed line changes every root after it: that is one damage, not one for every seal.
  const firstChanged = Math.min(...problems.keys(), Number.POSITIVE_INFINITY);
  let agreed = 0;
  let place = 0;
  for (const note of keptNotes(directory)) {
    place += 1;
    const seal = parseSeal(note);
    const fault = seal === null ? 'is no seal' : signatureFault(seal, keys);
    if (seal === null || fault !== null) {
      report(seal?.entries ?? Math.max(agreed, 1), `seals/kept, seal ${place}: ${fault}`, beside);
      continue;
    }
    const { entries, root } = seal;
    sealed.add(entries);
    if (entries >= firstChanged) continue;
    if (seal.book !== book && book !== undefined)
      report(entries, `seals/kept, seal ${place} names the book "${seal.book}"`, beside);
    else if (entries > count)
      report(count + 1, `a kept seal says ${entries} entries, the ledger has ${count}`, { through: entries });
    else if (tree.rootAt(entries) !== root) {
      report(agreed + 1, rewritten(agreed + 1, entries), { through: entries });
      break;
    } else agreed = Math.max(agreed, entries);
  }
  // The seal of a run that is the last entry is the latest, and not kept yet.
  const without = runs.filter((run) => run < count && !sealed.has(run)).length;
  return without === 0 ? [] : [`seals/kept has no seal for ${without} of ${runs.length} runs`];
}

function rewritten(from: number, to: number): string {
  const what = from === to ? `entry ${from} was` : `one of entries ${from} to ${to} was`;
  return `${what} rewritten: the tree has another root than the kept seal of ${to} entries says`;
}
