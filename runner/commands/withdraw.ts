/** `withdraw WHAT --reason TEXT`: enters that an entry does not stand any more, and says what that reaches. */

import { openBook } from '../../ledger/book.ts';
import { badCall } from '../../ledger/problem.ts';
import { reach } from '../../ledger/reach.ts';
import { findSubject, type Subject } from '../../ledger/subject.ts';
import type { CommonOptions, ExitStatus, Io } from '../command.ts';
import { keyFile, writer } from '../configuration.ts';
import { wrapText } from '../text-table.ts';
import { entryTitle } from './entry-title.ts';
import { countsOf, MOST_SHOWN, reachedLines } from './reach.ts';

export interface WithdrawOptions extends CommonOptions {
  readonly reason: string;
  readonly by?: string;
}

/** Enters a withdrawal. @throws LedgerProblem when there is no such entry, no reason, or nothing can be written. */
export async function withdrawCommand(
  words: readonly string[],
  options: WithdrawOptions,
  io: Io,
): Promise<ExitStatus> {
  const reason = options.reason.trim();
  if (reason === '') throw badCall('withdraw: expected a reason in --reason, got none.');
  const announce = (text: string) => io.err(`${text}\n`);
  const book = openBook(options.book, { by: await writer(io, options.by), key: keyFile(io), announce });
  try {
    const withdraws = entryNamed(findSubject(book, words, io.cwd));
    const { entry } = book.append({ type: 'withdrawal', withdraws, reason });
    const subject = {
      asked: String(withdraws),
      type: 'entry',
      entry: withdraws,
      entries: [withdraws],
    } as const;
    const most = options.json ? Number.POSITIVE_INFINITY : MOST_SHOWN;
    const { reached, counts } = reach(book, subject, most);
    const document = { entry: entry.number, withdraws, reached };
    if (options.json) io.out(`${JSON.stringify(document, null, 2)}\n`);
    else if (!options.quiet) {
      const title = `Entry ${withdraws}, ${entryTitle(book.entry(withdraws))}, is withdrawn, in entry ${entry.number}.`;
      const said = wrapText(
        `${title} It reaches ${countsOf(counts)}.`,
        Math.min(100, Math.max(80, io.columns)),
      );
      io.out(`${[...said, ...reachedLines(reached, counts)].join('\n')}\n`);
    }
    return 0;
  } finally {
    book.close();
  }
}

/** The entry that a subject is known by. */
export function entryNamed(subject: Subject): number {
  const [entry] = subject.entries;
  if (entry !== undefined) return entry;
  const readers =
    subject.type === 'file' ? [...new Set(subject.roles.map((role) => role.entry))].slice(0, 5) : [];
  throw badCall(
    `${subject.asked}: expected an entry, got a file from outside, which no entry made. ` +
      `Name an entry that read it, such as ${readers.join(', ')}.`,
  );
}
