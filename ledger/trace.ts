/** Where something comes from: its lineage, back to the files. Nearest first: an entry comes after every entry of the
 *  lineage that depends on it, by the length of the longest way to it; entries equally far, the newer first. Each
 *  entry stands once, however many ways lead to it. Beside it: what of the lineage was withdrawn, and who signed it. */

import type { Book } from './book.ts';
import { countersignaturesOf } from './countersignature.ts';
import type { CountersignatureEntry, Entry, WithdrawalEntry } from './entry.ts';
import { referencesOf } from './references.ts';
import type { Subject } from './subject.ts';
import { withdrawalsOf, withdrawalsUpstream } from './withdrawal.ts';

/** An entry with the digest of its line. */
export type TracedEntry = Entry & { readonly digest: string };

export interface TraceDocument {
  readonly subject: Subject;
  readonly lineage: readonly TracedEntry[];
  /** Those that stand, of entries of the lineage and of the run that published a number; nearest first. */
  readonly withdrawals: readonly (WithdrawalEntry & { readonly digest: string })[];
  /** Under entries of the lineage, oldest first. */
  readonly countersignatures: readonly (CountersignatureEntry & { readonly digest: string })[];
}

/** The lineage of a subject. Cost: one line read per entry.
 *  @throws LedgerProblem 'ledger-damaged' when an entry of it is not what was written. */
export function trace(book: Book, subject: Subject): TraceDocument {
  const lineage = lineageOf(book, subject.entries);
  const publisher = subject.type === 'number' ? [book.findRun(subject.run)?.number ?? 0] : [];
  const withdrawals = new Set([
    ...publisher.flatMap((number) => withdrawalsOf(book, number)),
    ...subject.entries.flatMap((number) => withdrawalsUpstream(book, number)),
  ]);
  const signed = [...publisher, ...lineage.map(({ number }) => number)];
  return {
    subject,
    lineage,
    withdrawals: [...withdrawals].map(
      (number) => traced(book, number) as TraceDocument['withdrawals'][number],
    ),
    countersignatures: countersignaturesOf(book, signed).map((entry) => ({
      ...entry,
      digest: book.digestOf(entry.number),
    })),
  };
}

/** Entries and all that they depend on. Cost: one line read per entry. */
export function lineageOf(book: Book, from: readonly number[]): TracedEntry[] {
  const found = new Map<number, TracedEntry>();
  const waiting = [...from];
  for (let number = waiting.pop(); number !== undefined; number = waiting.pop()) {
    if (found.has(number)) continue;
    const entry = traced(book, number);
    found.set(number, entry);
    for (const named of referencesOf(entry).entries) waiting.push(named.number);
  }
  const distance = new Map(from.map((number) => [number, 0]));
  // An entry names only earlier ones, so going down by number settles every distance before it is used.
  for (const number of [...found.keys()].sort((a, b) => b - a)) {
    const far = distance.get(number) ?? 0;
    for (const { number: earlier } of referencesOf(found.get(number) as TracedEntry).entries) {
      distance.set(earlier, Math.max(far + 1, distance.get(earlier) ?? 0));
    }
  }
  const far = ({ number }: TracedEntry) => distance.get(number) ?? 0;
  return [...found.values()].sort((a, b) => far(a) - far(b) || b.number - a.number);
}

function traced(book: Book, number: number): TracedEntry {
  return { ...book.entry(number), digest: book.digestOf(number) };
}
