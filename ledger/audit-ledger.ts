/** The part of an audit that reads the ledger: every line, the chain of digests through them, and the seal. */

import { existsSync } from 'node:fs';
import { sha256 } from './digest.ts';
import type { Entry } from './entry.ts';
import { ledgerPath, linesOf, parseEntry, readRange, sizeOf, withFile } from './ledger-file.ts';
import { readSeal, type Seal } from './seal.ts';

export interface Problem {
  /** The entry that is damaged, or whose files, seal or place in the index are. */
  readonly entry: number;
  readonly what: string;
}

export interface LedgerLine {
  /** Null when the line is no entry. */
  readonly entry: Entry | null;
  /** Of the bytes as they are. */
  readonly digest: string;
  readonly offset: number;
  readonly length: number;
}

/** Every line of the ledger, and what is wrong with it. A ledger that grows meanwhile is read as far as it was sealed
 *  at the beginning. */
export function auditLedger(directory: string): {
  lines: LedgerLine[];
  problems: Problem[];
  remarks: string[];
} {
  const seal = readSeal(directory);
  if (!existsSync(ledgerPath(directory))) {
    const count = typeof seal === 'string' ? 0 : seal.entries;
    const what = `ledger.jsonl is missing; the seal says ${count} entries`;
    return { lines: [], problems: [{ entry: count, what }], remarks: [] };
  }
  return withFile(ledgerPath(directory), (descriptor) => {
    const size = sizeOf(descriptor);
    const end = typeof seal !== 'string' && endsLine(descriptor, seal.bytes) ? seal.bytes : size;
    const lines: LedgerLine[] = [];
    const problems = new Map<number, Problem>();
    const report = (entry: number, what: string) => {
      if (!problems.has(entry)) problems.set(entry, { entry, what });
    };
    for (const { bytes, offset, whole } of linesOf(descriptor, 0, end)) {
      const number = lines.length + 1;
      const { entry, what } = read(bytes);
      if (what !== null) report(number, what);
      else if (!whole) report(number, 'no line feed ends its line');
      lines.push({ entry, digest: sha256(bytes), offset, length: bytes.length });
    }
    auditNumbers(lines, seal, report);
    auditChain(lines, seal, report);
    auditSeal(lines, seal, end, report);
    if (problems.size === 0 && typeof seal !== 'string' && seal.bytes !== end) {
      report(lines.length, `seals/latest.json says ${seal.bytes} bytes, the ledger has ${end}`);
    }
    const beyond =
      size > end
        ? [`ledger.jsonl: ${size - end} bytes beyond the seal; a writer is at work, or was interrupted`]
        : [];
    return { lines, problems: [...problems.values()], remarks: beyond };
  });
}

/** Whether a byte begins a line: at the beginning, or behind a line feed. */
function endsLine(descriptor: number, at: number): boolean {
  return at === 0 || readRange(descriptor, at - 1, 1)[0] === 0x0a;
}

type Report = (entry: number, what: string) => void;

function read(bytes: Buffer): { entry: Entry | null; what: string | null } {
  try {
    return { entry: parseEntry(bytes), what: null };
  } catch (error) {
    return { entry: null, what: (error as Error).message.replace(/^entry(?=[:.])/, 'its line') };
  }
}

function auditNumbers(lines: readonly LedgerLine[], seal: Seal | string, report: Report): void {
  let shift = 0;
  const book = bookOf(lines, seal);
  for (const [i, { entry }] of lines.entries()) {
    if (entry === null) continue;
    const expected = i + 1 + shift;
    if (entry.number !== expected) {
      report(i + 1, `line ${i + 1} holds entry ${entry.number}, expected ${expected}`);
      // One missing line is one problem, not one for every line after it; one wrong number shifts nothing.
      if (lines[i + 1]?.entry?.number !== expected + 1) shift = entry.number - i - 1;
    }
    if (entry.book !== book) report(i + 1, `it names the book "${entry.book}", the others name "${book}"`);
  }
  if (typeof seal !== 'string' && book !== undefined && seal.book !== book) {
    report(lines.length, `seals/latest.json names the book "${seal.book}", the entries name "${book}"`);
  }
}

/** The book's name as two of the first entry, the last and the seal have it. */
function bookOf(lines: readonly LedgerLine[], seal: Seal | string): string | undefined {
  const first = lines[0]?.entry?.book;
  const last = lines.length > 1 ? lines.at(-1)?.entry?.book : undefined;
  const sealed = typeof seal === 'string' ? undefined : seal.book;
  return first === last || first === sealed ? first : (last ?? first ?? sealed);
}

/** Each digest must be the one that the next entry has before it, the last the seal's. Where they differ, the entry was
 *  changed, unless the next one itself was: then that is reported, with the entry after it or the seal as witness. */
function auditChain(lines: readonly LedgerLine[], seal: Seal | string, report: Report): void {
  let nextIsWhole = true;
  for (let i = lines.length - 1; i >= 0; i -= 1) {
    const { digest } = lines[i] as LedgerLine;
    const witness = witnessOf(lines, seal, i);
    const agrees = witness === null || witness === digest;
    if (!agrees && nextIsWhole) {
      const by = i + 1 < lines.length ? `entry ${i + 2}` : 'the seal';
      report(i + 1, `its line was changed: the digest is ${digest}, ${by} says ${witness}`);
    }
    nextIsWhole = agrees && lines[i]?.entry !== null;
  }
  const first = lines[0]?.entry;
  if (first != null && first.before !== sha256('')) report(1, 'the first entry has a digest before it');
}

/** What is said of a line's digest by whatever comes after it; null when that cannot be read. */
function witnessOf(lines: readonly LedgerLine[], seal: Seal | string, i: number): string | null {
  const next = lines[i + 1];
  if (next !== undefined) return next.entry?.before ?? null;
  return typeof seal !== 'string' && seal.entries === lines.length ? seal.last : null;
}

function auditSeal(lines: readonly LedgerLine[], seal: Seal | string, size: number, report: Report): void {
  const count = lines.length;
  if (typeof seal === 'string') {
    report(count, `seals/latest.json is ${seal === 'missing' ? 'missing' : 'no seal in canonical JSON'}`);
    return;
  }
  const sealed = seal as Seal;
  if (sealed.entries > count && sealed.bytes > size) {
    const gone =
      sealed.entries === count + 1
        ? `entry ${count + 1} is`
        : `entries ${count + 1} to ${sealed.entries} are`;
    report(
      count + 1,
      `${gone} missing: the seal says ${sealed.entries} entries in ${sealed.bytes} bytes, the ledger ends at byte ${size}`,
    );
  } else if (sealed.entries !== count) {
    report(count, `seals/latest.json says ${sealed.entries} entries, the ledger has ${count}`);
  }
}
