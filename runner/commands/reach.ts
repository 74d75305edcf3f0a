/** `reach WHAT`: what depends on this, forward to every run, plate and published number. */

import { openBook } from '../../ledger/book.ts';
import { type ReachCounts, type ReachDocument, type Reached, reach } from '../../ledger/reach.ts';
import { findSubject, type Subject } from '../../ledger/subject.ts';
import type { CommonOptions, ExitStatus, Io } from '../command.ts';
import { alignRows, counted, thousands, wrapText } from '../text-table.ts';

/** Lines of a table that somebody reads; --json lists all. */
export const MOST_SHOWN = 200;

/** Prints what depends on a subject, nearest first. @throws LedgerProblem when there is no such thing. */
export function reachCommand(words: readonly string[], options: CommonOptions, io: Io): ExitStatus {
  const book = openBook(options.book, { announce: (text) => io.err(`${text}\n`) });
  try {
    const most = options.json ? Number.POSITIVE_INFINITY : MOST_SHOWN;
    const document = reach(book, findSubject(book, words, io.cwd), most);
    const { subject, reached } = document;
    io.out(
      options.json
        ? `${JSON.stringify({ subject, reached }, null, 2)}\n`
        : reachText(document, book.name, io.columns),
    );
    return 0;
  } finally {
    book.close();
  }
}

function reachText({ subject, reached, counts }: ReachDocument, book: string, columns: number): string {
  const width = Math.min(100, Math.max(80, columns));
  const head = wrapText(`${subjectTitle(subject)} of book ${book} reaches ${countsOf(counts)}`, width);
  return `${[...head, ...reachedLines(reached, counts)].join('\n')}\n`;
}

/** An empty line and a table of what is reached, nearest first, with how many more there are; none when nothing is. */
export function reachedLines(reached: readonly Reached[], { runs, plates, numbers }: ReachCounts): string[] {
  if (reached.length === 0) return [];
  const more = runs + plates + numbers - reached.length;
  return [
    '',
    ...reachedRows(reached),
    ...(more === 0 ? [] : [`  and ${thousands(more)} more; --json lists all`]),
  ];
}

/** A table of what is reached. */
function reachedRows(reached: readonly Reached[]): string[] {
  const rows = reached.map(({ entry, type, name, run, plate }) => [
    String(entry),
    type,
    type === 'run' ? `run ${run}` : (plate ?? name),
    type === 'plate' ? name : type === 'run' ? `recipe ${name}` : '',
    type === 'run' || run === null ? '' : `run ${run}`,
  ]);
  return alignRows([['entry', 'type', 'name', '', ''], ...rows], [{ right: true }]);
}

/** `2 runs, 1 plate and no published number`. */
export function countsOf({ runs, plates, numbers }: ReachCounts): string {
  const count = (found: number, one: string, many: string) =>
    found === 0 ? `no ${one}` : counted(found, one, many);
  const published = count(numbers, 'published number', 'published numbers');
  return `${count(runs, 'run', 'runs')}, ${count(plates, 'plate', 'plates')} and ${published}`;
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
