/** `trace WHAT`: where does this come from, back to the bytes. */

import { openBook } from '../../ledger/book.ts';
import { findSubject } from '../../ledger/subject.ts';
import { trace } from '../../ledger/trace.ts';
import type { CommonOptions, ExitStatus, Io } from '../command.ts';
import { traceText } from './trace-text.ts';

/** Prints the lineage of a subject. @throws LedgerProblem when there is no such thing. */
export function traceCommand(words: readonly string[], options: CommonOptions, io: Io): ExitStatus {
  const book = openBook(options.book, { announce: (text) => io.err(`${text}\n`) });
  try {
    const document = trace(book, findSubject(book, words, io.cwd));
    io.out(
      options.json ? `${JSON.stringify(document, null, 2)}\n` : traceText(document, book.name, io.columns),
    );
    return 0;
  } finally {
    book.close();
  }
}
