/** `contents`: the book's table of contents. */

import { openBook } from '../../ledger/book.ts';
import { type ContentsDocument, type ContentsFilter, contents, MOST_COUNTED } from '../../ledger/contents.ts';
import type { CommonOptions, ExitStatus, Io } from '../command.ts';
import { alignRows, counted, readableTime, thousands } from '../text-table.ts';
import { entryColumns } from './entry-title.ts';

const WITHDRAWN = '‡';
const DEPENDS = '†';

export type ContentsOptions = CommonOptions & ContentsFilter;

/** Prints the latest entries that pass the filters, oldest first. @throws LedgerProblem for a filter that is none. */
export function contentsCommand(options: ContentsOptions, io: Io): ExitStatus {
  const book = openBook(options.book, { announce: (text) => io.err(`${text}\n`) });
  try {
    const { document, matching } = contents(book, options);
    io.out(
      options.json ? `${JSON.stringify(document, null, 2)}\n` : contentsText(document, matching, book.name),
    );
    return 0;
  } finally {
    book.close();
  }
}

function contentsText({ entries, withdrawn }: ContentsDocument, matching: number, book: string): string {
  if (entries.length === 0) return `Book ${book}: no entries that match.\n`;
  const marks = new Map(withdrawn.map(({ entry, itself }) => [entry, itself ? WITHDRAWN : DEPENDS]));
  const head = ['entry', 'UTC', 'type', 'name', '', 'digest'];
  const rows = entries.map((entry) => [
    String(entry.number),
    readableTime(entry.time),
    ...entryColumns(entry),
    `${entry.digest.slice(0, 12)}…`,
    marks.get(entry.number) ?? '',
  ]);
  const all =
    matching > MOST_COUNTED
      ? `more than ${thousands(MOST_COUNTED)} entries`
      : counted(matching, 'entry', 'entries');
  const said =
    matching === entries.length ? all : `the latest ${entries.length} of ${all}; --last N shows more`;
  const table = alignRows([head, ...rows], [{ right: true }]).join('\n');
  const legend =
    withdrawn.length === 0 ? '' : `\n  ${WITHDRAWN} withdrawn   ${DEPENDS} depends on something withdrawn\n`;
  return `Book ${book}: ${said}\n\n${table}\n${legend}`;
}
