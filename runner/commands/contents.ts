/** `contents`: the book's table of contents. */

import { openBook } from '../../ledger/book.ts';
import { type ContentsFilter, contents } from '../../ledger/contents.ts';
import type { Entry } from '../../ledger/entry.ts';
import type { CommonOptions, ExitStatus, Io } from '../command.ts';
import { alignRows, counted, readableTime } from '../text-table.ts';
import { entryColumns } from './entry-title.ts';

export type ContentsOptions = CommonOptions & ContentsFilter;

/** Prints the latest entries that pass the filters, oldest first. @throws LedgerProblem for a filter that is none. */
export function contentsCommand(options: ContentsOptions, io: Io): ExitStatus {
  const book = openBook(options.book, { announce: (text) => io.err(`${text}\n`) });
  try {
    const { document, matching } = contents(book, options);
    io.out(
      options.json
        ? `${JSON.stringify(document, null, 2)}\n`
        : contentsText(document.entries, matching, book.name),
    );
    return 0;
  } finally {
    book.close();
  }
}

function contentsText(
  entries: readonly (Entry & { digest: string })[],
  matching: number,
  book: string,
): string {
  if (entries.length === 0) return `Book ${book}: no entries that match.\n`;
  const head = ['entry', 'UTC', 'type', 'name', '', 'digest'];
  const rows = entries.map((entry) => [
    String(entry.number),
    readableTime(entry.time),
    ...entryColumns(entry),
    `${entry.digest.slice(0, 12)}…`,
  ]);
  const said =
    matching === entries.length
      ? counted(matching, 'entry', 'entries')
      : `the latest ${entries.length} of ${counted(matching, 'entry', 'entries')}; --last N shows more`;
  return `Book ${book}: ${said}\n\n${alignRows([head, ...rows], [{ right: true }]).join('\n')}\n`;
}
