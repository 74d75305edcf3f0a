/** `diff A B`: what is different between two runs, and what it did to the results. */

import { openBook } from '../../ledger/book.ts';
import { diffRuns } from '../../ledger/diff.ts';
import { badCall } from '../../ledger/problem.ts';
import { findRunNamed } from '../../ledger/subject.ts';
import type { CommonOptions, ExitStatus, Io } from '../command.ts';
import { diffText } from './diff-text.ts';

/** Prints the differences. @param words  two runs, each `12`, `run 12`, `run` and `12`, `last` or `last-1`
 *  @throws LedgerProblem when there are not two, or no such run. */
export function diffCommand(words: readonly string[], options: CommonOptions, io: Io): ExitStatus {
  // "run 1 run 2" comes as four words.
  const named = words
    .join(' ')
    .trim()
    .split(/\s+/)
    .filter((word) => word !== '' && word.toLowerCase() !== 'run');
  const [a, b] = named;
  if (named.length !== 2 || a === undefined || b === undefined) {
    throw badCall(`diff: expected two runs, such as 1 2 or last-1 last, got ${named.length}.`);
  }
  const book = openBook(options.book, { announce: (text) => io.err(`${text}\n`) });
  try {
    const document = diffRuns(book, findRunNamed(book, a), findRunNamed(book, b));
    io.out(options.json ? `${JSON.stringify(document, null, 2)}\n` : diffText(document, io.columns));
    return 0;
  } finally {
    book.close();
  }
}
