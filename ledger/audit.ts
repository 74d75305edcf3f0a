/** Is every entry and every stored byte what the ledger says? Reads the whole ledger and the whole store, trusts
 *  nothing that is derived, changes nothing. */

import { existsSync, statSync } from 'node:fs';
import { join } from 'node:path';
import { objectionsTo } from './acceptance.ts';
import { auditIndex } from './audit-index.ts';
import { auditLedger, type LedgerLine, type Problem } from './audit-ledger.ts';
import { sha256File } from './digest.ts';
import type { Entry, StoredFile } from './entry.ts';
import { bookUnreadable } from './problem.ts';
import { referencesOf } from './references.ts';
import { listStore } from './store.ts';

export interface AuditDocument {
  readonly verdict: 'sound' | 'damaged';
  readonly entries: number;
  readonly problems: readonly Problem[];
  /** What is no damage and still worth knowing. */
  readonly remarks: readonly string[];
  readonly files: number;
  /** Bytes of the store that were read. */
  readonly bytes: number;
}

/** Audits the book in a directory. Cost: the store is read once. @throws LedgerProblem 'book-unreadable'. */
export function audit({ directory }: { readonly directory: string }): AuditDocument {
  try {
    return auditDirectory(directory);
  } catch (cause) {
    if ((cause as NodeJS.ErrnoException).code === undefined || (cause as Error).name === 'LedgerProblem')
      throw cause;
    throw bookUnreadable(directory, cause);
  }
}

function auditDirectory(directory: string): AuditDocument {
  const { lines, problems: inLedger, remarks } = auditLedger(directory);
  const whole = lines.filter((line): line is LedgerLine & { entry: Entry } => line.entry !== null);
  const makers = makersOf(whole);
  const store = auditStore(join(directory, 'store'), makers);
  const blamed = new Set(inLedger.map(({ entry }) => entry));
  const inReferences = auditReferences(whole, store.sizes, blamed);
  const inIndex = auditIndex(directory, lines, blamed);
  const problems = [...inLedger, ...inReferences, ...store.problems, ...inIndex.problems];
  problems.sort((a, b) => a.entry - b.entry);
  return {
    verdict: problems.length === 0 ? 'sound' : 'damaged',
    entries: lines.length,
    problems,
    remarks: [...remarks, ...store.remarks, ...inIndex.remarks],
    files: store.sizes.size,
    bytes: store.bytes,
  };
}

interface Maker {
  readonly entry: number;
  readonly as: string;
}

/** By digest, the entry that brought a file into the store: the first that names it as anything but an input. */
function makersOf(lines: readonly { entry: Entry }[]): Map<string, Maker> {
  const makers = new Map<string, Maker>();
  for (const { entry } of lines) {
    for (const { digest, role, name } of referencesOf(entry).files) {
      // Of an input only the copy, if one was kept.
      if (!makers.has(digest)) makers.set(digest, { entry: entry.number, as: `${role} ${name}`.trim() });
    }
  }
  return makers;
}

interface StoreAudit {
  readonly problems: Problem[];
  readonly remarks: string[];
  /** Digest in the name to size, of every file whose bytes are as its name says, and of those that are not: -1. */
  readonly sizes: Map<string, number>;
  bytes: number;
}

function auditStore(directory: string, makers: ReadonlyMap<string, Maker>): StoreAudit {
  const result: StoreAudit = { problems: [], remarks: [], sizes: new Map(), bytes: 0 };
  const { digests, others } = existsSync(directory) ? listStore(directory) : { digests: [], others: [] };
  for (const digest of digests) {
    const path = join(directory, digest.slice(0, 3), digest);
    const { size } = statSync(path);
    const found = sha256File(path);
    const maker = makers.get(digest);
    const at = `store/${digest.slice(0, 3)}/${digest}`;
    result.bytes += size;
    result.sizes.set(digest, found === digest ? size : -1);
    if (maker === undefined)
      result.remarks.push(
        `${at}: no entry names it${found === digest ? '' : ', and its bytes are not its name'}`,
      );
    else if (found !== digest)
      result.problems.push({ entry: maker.entry, what: `${maker.as}: ${at} has bytes of digest ${found}` });
  }
  for (const other of others) result.remarks.push(`store/${other}: not a file of the store`);
  return result;
}

/** Whether what each entry names is there. Entries that are damaged themselves are not questioned again. */
function auditReferences(
  lines: readonly { entry: Entry; digest: string }[],
  sizes: ReadonlyMap<string, number>,
  blamed: ReadonlySet<number>,
): Problem[] {
  const known = new Map(lines.map((line) => [line.entry.number, line]));
  const hasFile = ({ digest, bytes }: StoredFile) => {
    const size = sizes.get(digest);
    // Bytes that are not their name were reported with the store.
    return size === bytes || size === -1;
  };
  const problems: Problem[] = [];
  for (const { entry } of lines) {
    if (blamed.has(entry.number)) continue;
    const earlier = (number: number) => (number < entry.number ? known.get(number) : undefined);
    for (const what of objectionsTo(entry, { hasFile, entry: earlier }))
      problems.push({ entry: entry.number, what });
  }
  return problems;
}
