/** `reach WHAT`: what depends on this, forward to every run, plate and published number. */

import { openBook } from '../../ledger/book.ts';
import { type ReachDocument, type Reached, reach } from '../../ledger/reach.ts';
import { findSubject, type Subject } from '../../ledger/subject.ts';
import type { CommonOptions, ExitStatus, Io } from '../command.ts';
import { alignRows, counted, wrapText } from '../text-table.ts';

/** Prints what depends on a subject, nearest first. @throws LedgerProblem when there is no such thing. */
export function reachCommand(words: readonly string[], options: CommonOptions, io: Io): ExitStatus {
  const book = openBook(options.book, { announce: (text) => io.err(`${text}\n`) });
  try {
    const document = reach(book, findSubject(book, words, io.cwd));
    io.out(
      options.json ? `${JSON.stringify(document, null, 2)}\n` : reachText(document, book.name, io.columns),
    );
    return 0;
  } finally {
    book.close();
  }
}

function reachText({ subject, reached }: ReachDocument, book: string, columns: number): string {
  const width = Math.min(100, Math.max(80, columns));
  const head = wrapText(`${subjectTitle(subject)} of book ${book} reaches ${countsOf(reached)}`, width);
  return `${[...head, ...(reached.length === 0 ? [] : ['', ...reachedRows(reached)])].join('\n')}\n`;
}

/** Rows that a person looks at; the JSON document has all. */
const MOST_SHOWN = 200;

/** A table of what is reached, as far as it is nearest. */
export function reachedRows(reached: readonly Reached[]): string[] {
  const rows = reached
    .slice(0, MOST_SHOWN)
    .map(({ entry, type, name, run, plate }) => [
      String(entry),
      type,
      type === 'run' ? `run ${run}` : (plate ?? name),
      type === 'plate' ? name : type === 'run' ? `recipe ${name}` : '',
      type === 'run' || run === null ? '' : `run ${run}`,
    ]);
  const table = alignRows([['entry', 'type', 'name', '', ''], ...rows], [{ right: true }]);
  const more = reached.length - rows.length;
  return more === 0 ? table : [...table, '', `  and ${counted(more, 'more', 'more')}; --json prints all`];
}

/** `2 runs, 1 plate and no published number`. */
export function countsOf(reached: readonly Reached[]): string {
  const count = (type: Reached['type'], one: string, many: string) => {
    const found = reached.filter((each) => each.type === type).length;
    return found === 0 ? `no ${one}` : counted(found, one, many);
  };
  const numbers = count('number', 'published number', 'published numbers');
  return `${count('run', 'run', 'runs')}, ${count('plate', 'plate', 'plates')} and ${numbers}`;
}

function subjectTitle(subject: Subject): string {
  switch (subject.type) {
    case 'entry':
      return `Entry ${subject.entry}`;
    case 'run':
      return `Run ${subject.run}`;
    case 'plate':
      return `Plate ${subject.plate}`;
    case 'number':
      return `Entry ${subject.number.entry}, which holds ${subject.number.name} of run ${subject.run},`;
    case 'file':
      return `The file with digest ${subject.digest.slice(0, 16)}…`;
  }
}
