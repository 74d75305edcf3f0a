/** `audit`: is every entry and every stored byte what the ledger says. */

import { resolve } from 'node:path';
import { type AuditDocument, audit } from '../../ledger/audit.ts';
import { openBook } from '../../ledger/book.ts';
import { LedgerProblem } from '../../ledger/problem.ts';
import type { Reached } from '../../ledger/reach.ts';
import type { CommonOptions, ExitStatus, Io } from '../command.ts';
import { counted, labelled, roundSize, wrapText } from '../text-table.ts';

export interface AuditOptions extends CommonOptions {
  /** The ledger and the sizes of stored files only. */
  readonly quick?: boolean;
}

/** Prints the verdict; status 1 when it is `damaged`. Reads everything that the book holds. */
export function auditCommand(options: AuditOptions, io: Io): ExitStatus {
  const directory = resolve(options.book);
  const name = settle(directory, io);
  const document = audit({ directory }, { quick: options.quick === true });
  io.out(options.json ? `${JSON.stringify(document, null, 2)}\n` : auditText(document, name, io.columns));
  return document.verdict === 'sound' ? 0 : 1;
}

/** Opens and closes the book, so that what a crash left is put right before it is judged. Damage is the audit's to
 *  tell. @returns the book's name */
function settle(directory: string, io: Io): string {
  try {
    const book = openBook(directory, {
      announce: (text, what) => what === 'put right' && io.err(`${text}\n`),
    });
    book.close();
    return book.name;
  } catch (error) {
    if (error instanceof LedgerProblem && error.code === 'ledger-damaged') return directory;
    throw error;
  }
}

function auditText(document: AuditDocument, book: string, columns: number): string {
  const { verdict, entries, problems, remarks, files, bytes, quick } = document;
  const width = Math.min(100, Math.max(80, columns));
  const inStore = `${counted(files, 'file', 'files')} in the store, ${roundSize(bytes)}`;
  const read = quick ? `sizes of ${inStore}` : inStore;
  const lines = [`Book ${book}: ${verdict}`, '', `  read: ${counted(entries, 'entry', 'entries')}, ${read}`];
  if (verdict === 'sound')
    lines.push(
      quick
        ? '  Every entry is what the ledger says, and every stored file has its size. Its bytes were not read.'
        : '  Every entry and every stored byte is what the ledger says.',
    );
  if (problems.length > 0) lines.push('', `${counted(problems.length, 'problem', 'problems')}:`, '');
  const labels = Math.max(0, ...problems.map(({ entry }) => `entry ${entry}`.length));
  for (const { entry, what, reaches } of problems) {
    lines.push(...labelled(`entry ${entry}`, what, labels, 2, width));
    if (reaches.length > 0) lines.push(...labelled('', `reaches ${reachedText(reaches)}`, labels, 2, width));
  }
  if (
    problems.length > 0 &&
    document.reached.length > 0 &&
    problems.every(({ reaches }) => reaches.length === 0)
  )
    lines.push('', ...wrapText(`The damages reach ${reachedText(document.reached)}`, width));
  if (remarks.length > 0) lines.push('', 'Remarks, no damage:', '');
  for (const remark of remarks) lines.push(...wrapText(remark, width - 2).map((line) => `  ${line}`));
  return `${lines.join('\n')}\n`;
}

/** Plates, then published numbers with their runs, in one sentence. */
function reachedText(reached: readonly Reached[]): string {
  const plates = reached.flatMap(({ type, plate, name }) => (type === 'plate' ? [`${plate} (${name})`] : []));
  const numbers = reached.flatMap(({ type, name, run }) =>
    type === 'number' ? [`${name} of run ${run}`] : [],
  );
  const parts = [
    ...(plates.length === 0 ? [] : [`${plates.length === 1 ? 'plate' : 'plates'} ${plates.join(', ')}`]),
    ...(numbers.length === 0 ? [] : [`${numbers.length === 1 ? 'number' : 'numbers'} ${numbers.join(', ')}`]),
  ];
  return parts.join(' and ');
}
