/** What `run` prints when it has ended: the published numbers, where the plates lie, and what to try next. */

import { relative } from 'node:path';
import type { Io } from './command.ts';
import { WITHDRAWN } from './commands/diff-text.ts';
import type { RunOptions, RunSummary } from './commands/run.ts';
import { roundedLike, roundedNumber } from './numbers-files.ts';
import { wrapped } from './wrapped.ts';

/** Wider text is hard to read. */
const MOST_COLUMNS = 100;

/** The whole text, ending in a line feed. */
export function runText(summary: RunSummary, options: RunOptions, io: Io): string {
  const { run } = summary;
  const columns = Math.min(MOST_COLUMNS, io.columns);
  const ended = run.finished ? 'finished' : 'did not finish';
  return [
    `\nRun ${run.run} of ${summary.recipe.name} ${ended}: entry ${run.number} of book ${shownPath(options.book, io)}\n`,
    numbersTable(summary, columns),
    ...summary.numbers.absent.map((text) => `${wrapped(`not published: ${text}`, columns, 2, 2)}\n`),
    plateList(summary, io),
    suggestions(summary, options, io),
  ]
    .filter((part) => part !== '')
    .join('\n');
}

/** Number, value with its 68 % interval, unit, truth, entry. What depends on something withdrawn is marked. */
function numbersTable({ numbers: { numbers }, withdrawn }: RunSummary, columns: number): string {
  if (numbers.length === 0) return '';
  const withTruth = numbers.some((number) => number.against !== null);
  const head = ['', 'value', '68 % interval', 'unit', ...(withTruth ? ['truth'] : []), 'entry'];
  const marks = withdrawn.map((by) => (by.length > 0 ? WITHDRAWN : ''));
  const rows = numbers.map((number, i) => {
    const { value, low, high } = roundedNumber(number.value, number.low, number.high);
    const interval = low === null || high === null ? '' : `${low} to ${high}`;
    const truth = number.against === null ? '' : roundedLike(number.against.value, value);
    return [
      number.name,
      `${marks[i]}${value}`,
      interval,
      number.unit,
      ...(withTruth ? [truth] : []),
      String(number.entry),
    ];
  });
  const table = alignedRows([head, ...rows], [false, true, false, false, withTruth, true]);
  const by = [...new Set(withdrawn.flat())].sort((a, b) => a - b);
  const note = `${WITHDRAWN} depends on something withdrawn: does not stand any more (entry ${by.join(', ')})`;
  return by.length === 0 ? `${table}\n` : `${table}\n\n${wrapped(note, columns, 2, 2)}\n`;
}

function alignedRows(rows: readonly (readonly string[])[], right: readonly boolean[]): string {
  const widths = (rows[0] ?? []).map((_, i) => Math.max(...rows.map((row) => (row[i] ?? '').length)));
  const cell = (text: string, i: number) =>
    right[i] ? text.padStart(widths[i] ?? 0) : text.padEnd(widths[i] ?? 0);
  return rows.map((row) => `  ${row.map(cell).join('   ')}`.trimEnd()).join('\n');
}

function plateList(summary: RunSummary, io: Io): string {
  if (summary.plates.length === 0) return '';
  const width = Math.max(...summary.plates.map((plate) => plate.name.length));
  const lines = summary.plates.map(
    (plate) => `  ${plate.name.padEnd(width)}   ${plate.plate}   ${shownPath(plate.path, io)}`,
  );
  const files = summary.files.map((file) => shownPath(file, io)).join(', ');
  return `Plates (each as PNG and SVG${files === '' ? '' : `; the numbers in ${files}`}):\n\n${lines.join('\n')}\n`;
}

/** Commands that work when pasted. After a first run there is nothing to compare with yet: the second command makes
 *  another run with one parameter changed. */
function suggestions(summary: RunSummary, options: RunOptions, io: Io): string {
  const plate = summary.plates.find((each) => /ring|image/.test(each.name)) ?? summary.plates[0];
  const { run, recipe } = summary;
  if (plate === undefined || !run.finished) return '';
  const book = shownPath(options.book, io) === 'book' ? '' : ` --book ${shownPath(options.book, io)}`;
  const command = (words: string) => `npx platebook ${words}${book}`;
  const fit = recipe.stages.find((stage) => stage.kind.kind === 'fit');
  const another = command(`run ${shownPath(recipe.path, io)} --let ${fit?.name}.components=10 --quiet`);
  const [one, other] = run.run > 1 ? [run.run - 1, run.run] : [run.run, run.run + 1];
  const first = run.run === 1 && fit !== undefined ? `${another} && ` : '';
  return [
    'To go on:\n',
    `  ${command(`trace ${shownPath(plate.path, io)}`)}`,
    run.run === 1 && fit === undefined ? '' : `  ${first}${command(`diff ${one} ${other}`)}`,
    `  ${command(`rerun ${plate.plate}`)}\n`,
  ]
    .filter((line) => line !== '')
    .join('\n');
}

export function shownPath(path: string, io: Io): string {
  const short = relative(io.cwd, path);
  return short === '' || short.startsWith('..') ? path : short;
}
