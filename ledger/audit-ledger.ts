/** The part of an audit that reads the ledger: every line, the chain of digests through them, the tree over them, the
 *  latest seal and, unless it must be quick, all seals that were kept. One pass, a few lines in memory at a time, and 64
 *  bytes for each entry. */

import { existsSync } from 'node:fs';
import { auditKept } from './audit-seals.ts';
import { DIGEST_OF_NOTHING } from './digest.ts';
import type { Entry } from './entry.ts';
import { hashedLines } from './hashed-lines.ts';
import { ledgerPath, lineBefore, linesOf, parseEntry, readRange, sizeOf, withFile } from './ledger-file.ts';
import { rememberingReader } from './line-reader.ts';
import { growPeaks, HASH_BYTES, rootAt } from './merkle.ts';
import { readSeal, type Seal } from './seal.ts';
import { readKeys, signatureFault } from './seal-keys.ts';
import type { VerifierKey } from './signed-note.ts';
import { hashCount, readerIn, readTree } from './tree.ts';

export interface Problem {
  /** The entry that is damaged, or whose files, seal or place in the index are. */
  readonly entry: number;
  readonly what: string;
  /** The last entry of those that may be damaged, where it cannot be told which. */
  readonly through?: number;
  /** True when a seal or the index is damaged, not what they speak of. */
  readonly beside?: true;
}

export interface LedgerLine {
  /** The line's number; an entry in order has the same. */
  readonly number: number;
  /** Null when the line is no entry. */
  readonly entry: Entry | null;
  /** Of the bytes as they are. */
  readonly digest: string;
  readonly offset: number;
  readonly length: number;
}

/** The hashes of a ledger's tree, as tree.ts lays them out. */
export interface AuditedTree {
  readonly size: number;
  /** Base64; null beyond the size. */
  rootAt(size: number): string | null;
}

/** Handed each line in order, once it is settled whether it is damaged. */
export type Visit = (line: LedgerLine, damaged: boolean, tree: AuditedTree) => void;

export interface LedgerAudit {
  readonly entries: number;
  readonly problems: Problem[];
  readonly remarks: string[];
}

/** What is wrong with the ledger and its seals. A ledger that grows meanwhile is read as far as it was sealed at the
 *  beginning. @param quick  leave out the seals that were kept */
export function auditLedger(
  directory: string,
  { visit = () => {}, quick = false }: { visit?: Visit; quick?: boolean } = {},
): LedgerAudit {
  const { seal, keys, fault } = trustedSeal(directory);
  if (!existsSync(ledgerPath(directory))) {
    const count = typeof seal === 'string' ? 0 : seal.entries;
    const what = `ledger.jsonl is missing; the seal says ${count} entries`;
    return { entries: 0, problems: [{ entry: count, what }], remarks: [] };
  }
  return withFile(ledgerPath(directory), (descriptor) => {
    const size = sizeOf(descriptor);
    const end = typeof seal !== 'string' && endsLine(descriptor, seal.bytes) ? seal.bytes : size;
    const book = bookOf(descriptor, end, seal);
    const problems = new Map<number, Problem>();
    const report: Report = (entry, what, more) => {
      if (!problems.has(entry)) problems.set(entry, { entry, what, ...more });
    };
    const { count, tree, runs } = readLines(ledgerPath(directory), {
      end,
      seal,
      book,
      report,
      problems,
      visit,
    });
    auditSeal(count, seal, fault, end, report);
    if (problems.size === 0 && typeof seal !== 'string') auditLatest(count, seal, book, end, tree, report);
    const remarks = quick ? [] : auditKept(directory, { keys, tree, count, runs, book, problems, report });
    if (size > end)
      remarks.push(
        `ledger.jsonl: ${size - end} bytes beyond the seal; a writer is at work, or was interrupted`,
      );
    if (!quick && problems.size === 0) remarks.push(...remarksOnTree(directory, count, tree.hashes));
    return { entries: count, problems: [...problems.values()], remarks };
  });
}

export type Report = (entry: number, what: string, more?: Omit<Problem, 'entry' | 'what'>) => void;

/** The latest seal, as far as a key of the book has signed it. */
function trustedSeal(directory: string): {
  seal: Seal | 'missing' | 'unreadable';
  keys: VerifierKey[];
  fault: string | null;
} {
  const seal = readSeal(directory);
  let keys: VerifierKey[] = [];
  try {
    keys = readKeys(directory);
  } catch (error) {
    return { seal: 'unreadable', keys, fault: `seals/keys: ${(error as Error).message.replace(/\.$/, '')}` };
  }
  if (typeof seal === 'string')
    return { seal, keys, fault: `seals/latest is ${seal === 'missing' ? 'missing' : 'no seal'}` };
  const fault = signatureFault(seal, keys);
  return fault === null
    ? { seal, keys, fault }
    : { seal: 'unreadable', keys, fault: `seals/latest: ${fault}` };
}

/** Whether a byte begins a line: at the beginning, or behind a line feed. */
function endsLine(descriptor: number, at: number): boolean {
  return at === 0 || readRange(descriptor, at - 1, 1)[0] === 0x0a;
}

/** The book's name as two of the first entry, the last and the seal have it. */
function bookOf(descriptor: number, end: number, seal: Seal | string): string | undefined {
  const nameIn = (bytes: Buffer | undefined) => (bytes === undefined ? undefined : read(bytes).entry?.book);
  const [line] = linesOf(descriptor, 0, end);
  const first = nameIn(line?.bytes);
  const final = end > 0 ? lineBefore(descriptor, end) : null;
  const last = final !== null && final.offset > 0 ? nameIn(final.bytes) : undefined;
  const sealed = typeof seal === 'string' ? undefined : seal.book;
  return first === last || first === sealed ? first : (last ?? first ?? sealed);
}

interface Reading {
  readonly end: number;
  readonly seal: Seal | string;
  readonly book: string | undefined;
  readonly report: Report;
  readonly problems: ReadonlyMap<number, Problem>;
  readonly visit: Visit;
}

/** Reads the lines, each judged with the two that follow it in view. */
function readLines(
  path: string,
  { end, seal, book, report, problems, visit }: Reading,
): { count: number; tree: AuditedTree & { hashes: Buffer }; runs: number[] } {
  const tree = growingTree();
  const runs: number[] = [];
  const window: LedgerLine[] = [];
  let count = 0;
  let shift = 0;
  const judge = () => {
    const [line, next, afterNext] = window as [LedgerLine, LedgerLine?, LedgerLine?];
    shift = auditNumber(line, next, shift, book, report);
    const witness = next === undefined ? witnessOfLast(count, seal) : (next.entry?.before ?? null);
    // Where a line is missing between the two, it is that which does not fit.
    const follows = next?.entry == null || line.entry === null || next.entry.number === line.entry.number + 1;
    const agrees = witness === null || witness === line.digest || !follows;
    if (!agrees && isWhole(next, afterNext, count, seal)) {
      const by = next === undefined ? 'the seal' : `entry ${next.number}`;
      report(line.number, `its line was changed: the digest is ${line.digest}, ${by} says ${witness}`);
    }
    if (line.number === 1 && line.entry !== null && line.entry.before !== DIGEST_OF_NOTHING)
      report(1, 'the first entry has a digest before it');
    if (line.entry?.type === 'run') runs.push(line.number);
    visit(line, problems.has(line.number), tree);
    window.shift();
  };
  const parse = rememberingReader(parseEntry);
  for (const { bytes, offset, whole, digest, leaf } of hashedLines(path, 0, end, true)) {
    count += 1;
    const { entry, what } = read(bytes, parse);
    if (what !== null) report(count, what);
    else if (!whole) report(count, 'no line feed ends its line');
    tree.add(leaf);
    window.push({ number: count, entry, digest, offset, length: bytes.length });
    if (window.length === 3) judge();
  }
  while (window.length > 0) judge();
  return { count, tree, runs };
}

/** Whether the line after the one in question is an entry, and itself what is said of it: else it is the damaged one,
 *  with the line after it or the seal as witness. */
function isWhole(
  next: LedgerLine | undefined,
  afterNext: LedgerLine | undefined,
  count: number,
  seal: Seal | string,
): boolean {
  if (next === undefined) return true;
  const witness = afterNext === undefined ? witnessOfLast(count, seal) : (afterNext.entry?.before ?? null);
  return next.entry !== null && (witness === null || witness === next.digest);
}

function witnessOfLast(count: number, seal: Seal | string): string | null {
  return typeof seal !== 'string' && seal.entries === count ? seal.last : null;
}

function read(
  bytes: Buffer,
  parse: (bytes: Buffer) => Entry = parseEntry,
): { entry: Entry | null; what: string | null } {
  try {
    return { entry: parse(bytes), what: null };
  } catch (error) {
    return { entry: null, what: (error as Error).message.replace(/^entry(?=[:.])/, 'its line') };
  }
}

/** @param shift  by how much the numbers are off since a line went missing; @returns the shift from here on */
function auditNumber(
  { number, entry }: LedgerLine,
  next: LedgerLine | undefined,
  shift: number,
  book: string | undefined,
  report: Report,
): number {
  if (entry === null) return shift;
  const expected = number + shift;
  let since = shift;
  if (entry.number !== expected) {
    report(number, `line ${number} holds entry ${entry.number}, expected ${expected}`);
    // One missing line is one problem, not one for every line after it; one wrong number shifts nothing.
    if (next?.entry?.number !== expected + 1) since = entry.number - number;
  }
  if (entry.book !== book) report(number, `it names the book "${entry.book}", the others name "${book}"`);
  return since;
}

function auditSeal(
  count: number,
  seal: Seal | 'missing' | 'unreadable',
  fault: string | null,
  end: number,
  report: Report,
): void {
  if (fault !== null || typeof seal === 'string') {
    report(count, fault ?? '', { beside: true });
    return;
  }
  const { entries, bytes } = seal;
  if (entries > count && bytes > end) {
    const gone = entries === count + 1 ? `entry ${count + 1} is` : `entries ${count + 1} to ${entries} are`;
    const what = `${gone} missing: the seal says ${entries} entries in ${bytes} bytes, the ledger ends at byte ${end}`;
    report(count + 1, what, entries === count + 1 ? {} : { through: entries });
  } else if (entries !== count) {
    report(count, `seals/latest says ${entries} entries, the ledger has ${count}`, { beside: true });
  }
}

/** What is left to say of the latest seal when everything else is in order. */
function auditLatest(
  count: number,
  seal: Seal,
  book: string | undefined,
  end: number,
  tree: AuditedTree,
  report: Report,
): void {
  if (book !== undefined && seal.book !== book)
    report(count, `seals/latest names the book "${seal.book}", the entries name "${book}"`, { beside: true });
  if (seal.bytes !== end)
    report(count, `seals/latest says ${seal.bytes} bytes, the ledger has ${end}`, { beside: true });
  const root = tree.rootAt(count);
  if (seal.note !== null && seal.root !== root)
    report(count, `seals/latest says the root ${seal.root}, the tree has ${root}`);
}

function remarksOnTree(directory: string, count: number, hashes: Buffer): string[] {
  const stored = readTree(directory);
  const bytes = hashCount(count) * HASH_BYTES;
  if (count === 0 || stored === null || stored.subarray(0, bytes).equals(hashes.subarray(0, bytes)))
    return [];
  return ['tree has other hashes than the ledger gives; it is made again when needed'];
}

function growingTree(): AuditedTree & { readonly hashes: Buffer; add(leaf: Buffer): void } {
  let hashes = Buffer.alloc(1 << 16);
  let bytes = 0;
  let size = 0;
  const peaks: Buffer[] = [];
  return {
    get size() {
      return size;
    },
    get hashes() {
      return hashes;
    },
    add(leaf) {
      for (const hash of growPeaks(peaks, size, leaf)) {
        if (bytes + HASH_BYTES > hashes.length) hashes = Buffer.concat([hashes, Buffer.alloc(hashes.length)]);
        bytes += hash.copy(hashes, bytes);
      }
      size += 1;
    },
    rootAt: (of) => (of <= size ? rootAt(readerIn(hashes), of).toString('base64') : null),
  };
}
