/** Is every entry and every stored byte what the ledger says? Reads the whole ledger and the whole store, trusts
 *  nothing that is derived, changes nothing; names what is damaged and what each damage reaches. In memory lie some 150
 *  bytes for each entry and for each file of the store. */

import { existsSync, statSync } from 'node:fs';
import { join } from 'node:path';
import { auditIndex } from './audit-index.ts';
import { auditLedger, type LedgerLine } from './audit-ledger.ts';
import { type Damage, reachOfDamages } from './audit-reach.ts';
import { auditReferences, recollect } from './audit-references.ts';
import { sha256File } from './digest.ts';
import type { StoredFile } from './entry.ts';
import { bookUnreadable } from './problem.ts';
import type { Reached } from './reach.ts';
import { referencesOf } from './references.ts';
import { listStore } from './store.ts';

export interface AuditDocument {
  readonly verdict: 'sound' | 'damaged';
  readonly entries: number;
  readonly problems: readonly AuditProblem[];
  /** Every plate and published number that any of the damages reaches. */
  readonly reached: readonly Reached[];
  /** What is no damage and still worth knowing. */
  readonly remarks: readonly string[];
  readonly files: number;
  /** Bytes of the store that were read; of a quick audit those that are there. */
  readonly bytes: number;
  /** True when only the ledger and the sizes of stored files were looked at. */
  readonly quick: boolean;
}

export interface AuditProblem {
  /** The entry that is damaged, or whose files, seal or place in the index are. */
  readonly entry: number;
  readonly what: string;
  /** Plates and published numbers that depend on what is damaged. */
  readonly reaches: readonly Reached[];
}

/** Audits the book in a directory.
 *  @param quick  the ledger, its latest seal and the sizes of stored files only
 *  @throws LedgerProblem 'book-unreadable'. Cost: the store is read once. */
export function audit(
  { directory }: { readonly directory: string },
  { quick = false }: { readonly quick?: boolean } = {},
): AuditDocument {
  try {
    return auditDirectory(directory, quick);
  } catch (cause) {
    if ((cause as NodeJS.ErrnoException).code === undefined || (cause as Error).name === 'LedgerProblem')
      throw cause;
    throw bookUnreadable(directory, cause);
  }
}

function auditDirectory(directory: string, quick: boolean): AuditDocument {
  const store = surveyStore(join(directory, 'store'), quick);
  const references: Damage[] = [];
  const recollection = recollect();
  const codes = new Set<string>();
  const index = quick ? null : auditIndex(directory);
  const ledger = auditLedger(directory, {
    quick,
    visit(line, damaged, tree) {
      for (const { what, digest } of auditReferences(recollection, line, damaged, tree, store.hasFile))
        references.push({ entry: line.number, what, ...(digest === undefined ? {} : { digest }) });
      noteMakers(line, store.files, codes);
      if (!damaged && line.entry !== null) index?.visit(line);
    },
  });
  const inIndex = index?.finish() ?? { problems: [], remarks: [] };
  // An index that was compared with damaged entries proves nothing.
  const ofIndex =
    ledger.problems.some(({ beside }) => beside !== true) && inIndex.remarks.length === 0
      ? { problems: [], remarks: ['index.sqlite was not compared: the ledger itself is damaged'] }
      : inIndex;
  const inStore = problemsOf(store);
  const damages: Damage[] = [...ledger.problems, ...references, ...inStore.problems, ...ofIndex.problems];
  damages.sort((a, b) => a.entry - b.entry);
  const { apart, together, isApart } = reachOfDamages(directory, damages);
  const remarks = [...ledger.remarks, ...inStore.remarks, ...(quick ? [] : ofIndex.remarks)];
  if (!isApart) remarks.push('there are too many problems to tell apart what each of them reaches');
  return {
    verdict: damages.length === 0 ? 'sound' : 'damaged',
    entries: ledger.entries,
    problems: damages.map(({ entry, what }, i) => ({
      entry,
      what,
      reaches: isApart ? (apart[i] ?? []) : [],
    })),
    reached: together,
    remarks,
    files: store.files.size,
    bytes: store.bytes(),
    quick,
  };
}

interface SurveyedFile {
  readonly bytes: number;
  /** The digest of its bytes; null where it is the one in its name, or was not taken. */
  readonly found: string | null;
  /** The entry that brought it into the store: the first that names it; of an input only the copy, if one was kept. */
  maker: { readonly entry: number; readonly as: string } | null;
}

interface Survey {
  readonly files: Map<string, SurveyedFile>;
  readonly others: readonly string[];
  bytes(): number;
  /** Whether a file stands with its size. Bytes that are not their name are reported with the store. */
  hasFile(file: StoredFile): boolean;
}

function surveyStore(directory: string, quick: boolean): Survey {
  const { digests, others } = existsSync(directory) ? listStore(directory) : { digests: [], others: [] };
  const files = new Map<string, SurveyedFile>();
  let bytes = 0;
  const survey = (digest: string): SurveyedFile | undefined => {
    const path = join(directory, digest.slice(0, 3), digest);
    const found = statSync(path, { throwIfNoEntry: false });
    if (found === undefined) return undefined;
    const sum = quick ? digest : sha256File(path);
    bytes += found.size;
    const file = { bytes: found.size, found: sum === digest ? null : sum, maker: null };
    files.set(digest, file);
    return file;
  };
  for (const digest of digests) survey(digest);
  return {
    files,
    others,
    bytes: () => bytes,
    hasFile({ digest, bytes: size }) {
      // What somebody entered after the list was made is not in it.
      const file = files.get(digest) ?? survey(digest);
      return file !== undefined && (file.found !== null || file.bytes === size);
    },
  };
}

/** @param codes  digests of code whose files were noted */
function noteMakers(
  { entry, number }: LedgerLine,
  files: ReadonlyMap<string, SurveyedFile>,
  codes: Set<string>,
): void {
  if (entry === null) return;
  const note = (digest: string, as: string) => {
    const file = files.get(digest);
    if (file !== undefined && file.maker === null) file.maker = { entry: number, as };
  };
  for (const { digest, role, name } of referencesOf(entry).files) note(digest, `${role} ${name}`.trim());
  // The code's own files may be in the store, and need not be.
  if ((entry.type !== 'stage' && entry.type !== 'failure') || codes.has(entry.code.digest)) return;
  codes.add(entry.code.digest);
  for (const [path, digest] of Object.entries(entry.code.files ?? {})) note(digest, `code ${path}`);
  if (entry.code.package !== undefined) note(entry.code.package.digest, 'code package.json');
  if (entry.code.lock !== undefined) note(entry.code.lock.digest, 'code lock file');
}

function problemsOf({ files, others }: Survey): { problems: Damage[]; remarks: string[] } {
  const problems: Damage[] = [];
  const remarks: string[] = [];
  for (const [digest, { found, maker }] of files) {
    const at = `store/${digest.slice(0, 3)}/${digest}`;
    if (maker === null)
      remarks.push(`${at}: no entry names it${found === null ? '' : ', and its bytes are not its name'}`);
    else if (found !== null)
      problems.push({ entry: maker.entry, what: `${maker.as}: ${at} has bytes of digest ${found}`, digest });
  }
  for (const other of others) remarks.push(`store/${other}: not a file of the store`);
  return { problems, remarks };
}
