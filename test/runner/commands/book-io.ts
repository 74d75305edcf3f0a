/** What the tests of the asking commands share: a filled book, and an Io that keeps what is printed. */

import { join } from 'node:path';
import type { CommonOptions, Io } from '../../../runner/command.ts';
import { fillBook } from '../../ledger/lantern-book.ts';
import { makeBook, temporary } from '../../ledger/make-book.ts';

export interface Filled {
  readonly directory: string;
  readonly book: string;
  readonly remove: () => void;
}

/** A book of two runs in a temporary directory. */
export function filledBook(): Filled {
  const { directory, remove } = temporary();
  const book = makeBook(join(directory, 'book'));
  fillBook(book);
  book.close();
  return { directory, book: book.directory, remove };
}

/** An Io of 100 columns, and what was printed to it. */
export function keepingIo(cwd: string): Io & { printed(): string; said(): string } {
  let out = '';
  let err = '';
  return {
    out(text) {
      out += text;
    },
    err(text) {
      err += text;
    },
    errorStream: process.stderr,
    cwd,
    env: { PLATEBOOK_BY: 'B. Reader', PLATEBOOK_KEY: join(cwd, 'reader.pem') },
    terminal: false,
    columns: 100,
    printed: () => out,
    said: () => err,
  };
}

/** Options of a command for a book. */
export function optionsFor(book: string, json = false): CommonOptions {
  return { book, json, quiet: false };
}

/** The lines of a text that are longer than 100 columns. */
export function longLines(text: string): string[] {
  return text.split('\n').filter((line) => line.length > 100);
}
