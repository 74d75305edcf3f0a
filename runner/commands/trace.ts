/** `trace WHAT`: where does this come from, back to the bytes. */

import { resolve } from 'node:path';
import { type Book, openBook } from '../../ledger/book.ts';
import { cannotWrite, noProof } from '../../ledger/problem.ts';
import { prove } from '../../ledger/proof.ts';
import { findSubject, type Subject } from '../../ledger/subject.ts';
import { trace } from '../../ledger/trace.ts';
import type { CommonOptions, ExitStatus, Io } from '../command.ts';
import { writeWhole } from '../write-whole.ts';
import { traceText } from './trace-text.ts';

export interface TraceOptions extends CommonOptions {
  /** Where to write a proof that the subject is under the latest seal. */
  readonly proof?: string;
}

/** Prints the lineage of a subject. @throws LedgerProblem when there is no such thing, or nothing to prove. */
export function traceCommand(words: readonly string[], options: TraceOptions, io: Io): ExitStatus {
  const book = openBook(options.book, { announce: (text) => io.err(`${text}\n`) });
  try {
    const subject = findSubject(book, words, io.cwd);
    const document = trace(book, subject);
    if (options.proof !== undefined) writeProof(book, subject, resolve(io.cwd, options.proof), io);
    io.out(
      options.json ? `${JSON.stringify(document, null, 2)}\n` : traceText(document, book.name, io.columns),
    );
    return 0;
  } finally {
    book.close();
  }
}

/** Writes the proof of the entry that a subject is known by: of a published number, the run that published it. */
function writeProof(book: Book, subject: Subject, file: string, io: Io): void {
  const entry = subject.type === 'number' ? book.findRun(subject.run)?.number : subject.entries[0];
  if (entry === undefined)
    throw noProof(
      `${subject.asked}: a file from outside, which no entry made`,
      'Prove an entry that read it.',
    );
  const proof = prove(book, entry);
  try {
    writeWhole(file, Buffer.from(`${JSON.stringify(proof, null, 2)}\n`));
  } catch (cause) {
    throw cannotWrite(file, cause);
  }
  io.err(`Proof of entry ${entry} under the seal of ${proof.size} entries: ${file}\n`);
}
