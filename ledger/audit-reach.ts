/** What a damage reaches: every plate and published number that depends on a damaged entry or file. Read from the ledger
 *  alone, in one pass, because an index may have been made from what is damaged. */

import { existsSync } from 'node:fs';
import type { Problem } from './audit-ledger.ts';
import type { Entry } from './entry.ts';
import { ledgerPath, linesOf, sizeOf, withFile } from './ledger-file.ts';
import { type Reached, reachedInRun, reachedPlate } from './reach.ts';
import { referencesOf } from './references.ts';

/** With more problems than this, what each of them reaches is told together only. */
const MOST_APART = 200;

export interface Damage extends Problem {
  /** The file of the store that is damaged or missing, where it is one. */
  readonly digest?: string;
}

/** For each damage what it reaches, in the order of entries; and the same of all together. */
export function reachOfDamages(
  directory: string,
  damages: readonly Damage[],
): { apart: Reached[][]; together: Reached[]; isApart: boolean } {
  const isApart = damages.length <= MOST_APART;
  const groups = isApart ? damages.map((_, i) => i) : damages.map(() => 0);
  const count = isApart ? damages.length : 1;
  const apart = Array.from({ length: count }, () => new Map<string, Reached>());
  const byEntry = new Map<number, Set<number>>();
  const byDigest = new Map<string, Set<number>>();
  for (const [i, { entry, through = entry, digest, beside }] of damages.entries()) {
    if (beside === true) continue;
    if (digest !== undefined) addTo(byDigest, digest, groups[i] as number);
    else for (let number = entry; number <= through; number += 1) addTo(byEntry, number, groups[i] as number);
  }
  if ((byEntry.size > 0 || byDigest.size > 0) && existsSync(ledgerPath(directory))) {
    withFile(ledgerPath(directory), (descriptor) => {
      let number = 0;
      for (const { bytes } of linesOf(descriptor, 0, sizeOf(descriptor))) {
        number += 1;
        spread(number, entryIn(bytes), byEntry, byDigest, apart);
      }
    });
  }
  const together = new Map(apart.flatMap((each) => [...each]));
  return { apart: apart.map((each) => [...each.values()]), together: [...together.values()], isApart };
}

/** Marks an entry with the damages of all that it names, and notes what it publishes under each. */
function spread(
  number: number,
  entry: Entry | null,
  byEntry: Map<number, Set<number>>,
  byDigest: ReadonlyMap<string, Set<number>>,
  apart: readonly Map<string, Reached>[],
): void {
  if (entry === null) return;
  const { files, entries } = referencesOf(entry);
  const isResult = entry.type !== 'withdrawal' && entry.type !== 'countersignature' && entry.type !== 'rerun';
  for (const group of new Set(files.flatMap(({ digest }) => [...(byDigest.get(digest) ?? [])])))
    addTo(byEntry, number, group);
  if (!isResult) return;
  /** Damages of the entry itself, not only of what it names. */
  const own = new Set(byEntry.get(number) ?? []);
  for (const named of entries)
    for (const group of byEntry.get(named.number) ?? []) addTo(byEntry, number, group);
  for (const group of byEntry.get(number) ?? []) {
    const isReached = (named: number) =>
      named === number ? own.has(group) : byEntry.get(named)?.has(group) === true;
    for (const reached of publishedBy(entry, isReached)) apart[group]?.set(keyOf(reached), reached);
  }
}

function publishedBy(entry: Entry, isReached: (entry: number) => boolean): Reached[] {
  if (entry.type === 'run') return reachedInRun(entry, isReached);
  return entry.type === 'plate' ? [reachedPlate(entry)] : [];
}

function keyOf({ type, entry, name, run }: Reached): string {
  return type === 'number' ? `${type} ${name} ${run}` : `${type} ${entry}`;
}

function addTo<K>(groups: Map<K, Set<number>>, key: K, group: number): void {
  const set = groups.get(key) ?? new Set();
  groups.set(key, set.add(group));
}

function entryIn(bytes: Buffer): Entry | null {
  try {
    const entry = JSON.parse(bytes.toString('utf8')) as Entry;
    referencesOf(entry);
    return entry;
  } catch {
    return null;
  }
}
