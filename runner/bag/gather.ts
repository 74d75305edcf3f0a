/** What goes into a bag: the entry that is asked for, everything that it depends on, the run that it belongs to, and
 *  whatever was said of any of them later (withdrawals, countersignatures). */

import type { Book } from '../../ledger/book.ts';
import { canonicalJson } from '../../ledger/canonical.ts';
import type { Entry, Json, RunEntry, WithdrawalEntry } from '../../ledger/entry.ts';
import { runsNaming } from '../../ledger/link-bundles.ts';
import { findSubject } from '../../ledger/subject.ts';
import { lineageOf } from '../../ledger/trace.ts';
import { badBagCall } from './problem.ts';

const SAID_LATER = `
  SELECT entry FROM withdrawals WHERE withdraws = ?1 UNION SELECT entry FROM countersignatures WHERE signs = ?1
  ORDER BY entry`;

export interface GatheredEntry {
  readonly entry: Entry;
  readonly digest: string;
  /** Canonical, without line feed. */
  readonly line: string;
}

export interface Gathered {
  readonly book: string;
  readonly subject: number;
  /** What the subject is called, such as `run 12` or `plate 8d-JABYN4`. */
  readonly title: string;
  /** By number. */
  readonly entries: readonly GatheredEntry[];
  /** The run that the subject is, or belongs to. */
  readonly run: RunEntry | null;
}

/** @throws LedgerProblem 'not-found'; RunnerProblem 'bad-call' when it is nothing that can be bagged */
export function gather(book: Book, words: readonly string[], cwd: string): Gathered {
  const asked = findSubject(book, words, cwd);
  const subject =
    asked.type === 'file'
      ? asked.entries[0]
      : asked.type === 'number'
        ? asked.number.entry
        : asked.entries[0];
  if (subject === undefined) throw nothingToBag(asked.asked, 'a file that came from outside');
  const entry = book.entry(subject);
  if (entry.type !== 'run' && entry.type !== 'plate' && entry.type !== 'stage') {
    throw nothingToBag(asked.asked, `a ${entry.type}`);
  }
  const lineage = lineageOf(book, [subject]).map(({ number }) => number);
  const run = entry.type === 'run' ? entry : firstRunOf(book, subject);
  const numbers = new Set([...lineage, ...(run === null ? [] : [run.number])]);
  for (const number of numbers) for (const later of saidLater(book, number)) numbers.add(later);
  const entries = [...numbers].sort((a, b) => a - b).map((number) => gatherEntry(book, number));
  return { book: book.name, subject, title: titleOf(entry), entries, run };
}

/** Withdrawals that stand: those that no other withdrawal takes back. */
export function withdrawalsIn(entries: Iterable<{ readonly entry: Entry }>): WithdrawalEntry[] {
  const all = [...entries].flatMap(({ entry }) => (entry.type === 'withdrawal' ? [entry] : []));
  const standing = new Set<number>();
  // A withdrawal names an earlier entry, so the last word is known before the word that it takes back.
  const newestFirst = all.toSorted((a, b) => b.number - a.number);
  for (const { number } of newestFirst) {
    if (!newestFirst.some((later) => later.withdraws === number && standing.has(later.number)))
      standing.add(number);
  }
  const own = new Set(all.map(({ number }) => number));
  return all.filter(({ number, withdraws }) => standing.has(number) && !own.has(withdraws));
}

function nothingToBag(place: string, found: string) {
  return badBagCall(
    `${place}: expected a run, a plate or something that a stage made, got ${found}. Name one of these.`,
  );
}

/** The first run that holds an entry: unlike the newest it stays the same while the book grows. */
function firstRunOf(book: Book, number: number): RunEntry | null {
  const [first] = book.ask((index) => [...runsNaming(index, number).take(1)]);
  return first === undefined ? null : (book.entry(first) as RunEntry);
}

function saidLater(book: Book, number: number): number[] {
  return book.ask((index) => index.all<{ entry: number }>(SAID_LATER, number)).map(({ entry }) => entry);
}

function gatherEntry(book: Book, number: number): GatheredEntry {
  const entry = book.entry(number);
  return {
    entry,
    digest: book.digestOf(number),
    line: canonicalJson(entry as unknown as Json, `entry ${number}`),
  };
}

function titleOf(entry: Entry): string {
  if (entry.type === 'run') return `run ${entry.run}`;
  if (entry.type === 'plate') return `plate ${entry.plate}`;
  return entry.type === 'stage' ? `entry ${entry.number} (stage ${entry.name})` : `entry ${entry.number}`;
}
