/** Where something comes from: its lineage, back to the files. Nearest first: an entry comes after every entry of the
 *  lineage that depends on it, by the length of the longest way to it; entries equally far, the newer first. Each
 *  entry stands once, however many ways lead to it. */

import type { Book } from './book.ts';
import type { Entry } from './entry.ts';
import { referencesOf } from './references.ts';
import type { Subject } from './subject.ts';

/** An entry with the digest of its line. */
export type TracedEntry = Entry & { readonly digest: string };

export interface TraceDocument {
  readonly subject: Subject;
  readonly lineage: readonly TracedEntry[];
}

/** The lineage of a subject. Cost: one line read per entry.
 *  @throws LedgerProblem 'ledger-damaged' when an entry of it is not what was written. */
export function trace(book: Book, subject: Subject): TraceDocument {
  return { subject, lineage: lineageOf(book, subject.entries) };
}

/** Entries and all that they depend on. */
export function lineageOf(book: Book, from: readonly number[]): TracedEntry[] {
  const distance = new Map(from.map((number) => [number, 0]));
  const lineage: { entry: TracedEntry; distance: number }[] = [];
  // An entry names only earlier ones, so going down by number settles every distance before it is used.
  for (let number = Math.max(0, ...from); number >= 1; number -= 1) {
    const far = distance.get(number);
    if (far === undefined) continue;
    const entry = book.entry(number);
    lineage.push({ entry: { ...entry, digest: book.digestOf(number) }, distance: far });
    for (const { number: earlier } of referencesOf(entry).entries) {
      distance.set(earlier, Math.max(far + 1, distance.get(earlier) ?? 0));
    }
  }
  return lineage
    .sort((a, b) => a.distance - b.distance || b.entry.number - a.entry.number)
    .map(({ entry }) => entry);
}
