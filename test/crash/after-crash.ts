/** What must hold of a book after a crash, whatever the moment. */

import { createHash } from 'node:crypto';
import { existsSync, readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { audit } from '../../ledger/audit.ts';
import { stageDraft } from '../ledger/make-book.ts';
import { openAsWriter, PLACES, type Report } from './writer.ts';

/** What was known before the crash. */
export interface Known {
  /** What the book had reported as done. */
  readonly reported: readonly Report[];
  /** Whole lines of the ledger, with their line feeds, as the writer made or would have made them, in order. */
  readonly lines: readonly Buffer[];
}

/** The lines of a ledger. */
export function linesIn(ledger: Buffer): Buffer[] {
  const lines: Buffer[] = [];
  for (
    let start = 0, end = ledger.indexOf(0x0a);
    end >= 0;
    start = end + 1, end = ledger.indexOf(0x0a, start)
  )
    lines.push(ledger.subarray(start, end + 1));
  return lines;
}

/** Opens the book below a directory, audits it, looks for all that was reported, enters one more.
 *  @returns what does not hold, in sentences */
export function faultsAfterCrash(root: string, { reported, lines }: Known): string[] {
  const faults: string[] = [];
  const hold = (holds: boolean, what: string) => {
    if (!holds) faults.push(what);
  };
  const directory = join(root, PLACES.book);
  const started = reported.length > 0;
  if (started) hold(existsSync(join(directory, 'ledger.jsonl')), 'the book that was started is not there');
  const left = readIfThere(join(directory, 'ledger.jsonl'));
  try {
    const said: string[] = [];
    const book = openAsWriter(root, (text) => said.push(text));
    try {
      faults.push(...unsound(directory, 'after opening'));
      const standing = [...book.entries()].length;
      const now = linesIn(readFileSync(join(directory, 'ledger.jsonl')));
      hold(now.length === standing, `${standing} entries in ${now.length} lines`);
      hold(
        now.every((line, i) => lines[i]?.equals(line)),
        'an entry is not what its writer wrote',
      );
      for (const report of reported) faults.push(...missing(directory, now, report));
      faults.push(...tornFaults(directory, left, lines, said));
      const { entry } = book.append(
        stageDraft(book, { name: 'after', outputs: { text: ['json', 'kept after it\n'] } }),
      );
      hold(entry.number === standing + 1, `the next entry has number ${entry.number} after ${standing}`);
      // Two audits of every state would take too long.
      if (standing % 4 === 1) faults.push(...unsound(directory, 'after another entry'));
    } finally {
      book.close();
    }
  } catch (error) {
    faults.push(`${(error as Error).name}: ${(error as Error).message}`);
  }
  return faults.map((fault) => fault.replaceAll(root, ''));
}

function unsound(directory: string, when: string): string[] {
  const { verdict, problems } = audit({ directory });
  return verdict === 'sound'
    ? []
    : [`${when} it is damaged: ${problems.map(({ entry, what }) => `${entry}: ${what}`).join('; ')}`];
}

function missing(directory: string, lines: readonly Buffer[], report: Report): string[] {
  if (report.what === 'entered') {
    const line = lines[report.number - 1];
    const stands = line !== undefined && digestOf(line.subarray(0, -1)) === report.digest;
    return stands ? [] : [`entry ${report.number} was reported and is not there`];
  }
  if (report.what === 'started') return [];
  const bytes = readIfThere(join(directory, 'store', report.digest.slice(0, 3), report.digest));
  return bytes !== null && digestOf(bytes) === report.digest
    ? []
    : [`file ${report.digest} was reported as kept and is not there`];
}

/** Whatever stood behind the last whole entry must lie in a file of its own, and have been said. */
function tornFaults(
  directory: string,
  left: Buffer | null,
  lines: readonly Buffer[],
  said: readonly string[],
): string[] {
  const torn = tornIn(left ?? Buffer.alloc(0), lines);
  if (torn.length === 0) return [];
  const aside = readdirSync(directory).filter((name) => readIfThere(join(directory, name))?.equals(torn));
  if (aside.length === 0) return [`${torn.length} torn bytes were not set aside`];
  return said.some((text) => aside.some((name) => text.includes(name)))
    ? []
    : ['torn bytes were set aside and nothing was said'];
}

/** What follows the whole lines with which a ledger begins. */
export function tornIn(ledger: Buffer, lines: readonly Buffer[]): Buffer {
  let end = 0;
  for (const line of lines) {
    if (!ledger.subarray(end, end + line.length).equals(line)) break;
    end += line.length;
  }
  return ledger.subarray(end);
}

function digestOf(bytes: Uint8Array): string {
  return createHash('sha256').update(bytes).digest('hex');
}

function readIfThere(path: string): Buffer | null {
  try {
    return readFileSync(path);
  } catch {
    return null;
  }
}
