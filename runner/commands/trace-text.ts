/** The text of a trace: what was asked for, its lineage at a glance, each entry in full, and the files from outside
 *  with which everything began. */

import type { Entry, RecordedInput } from '../../ledger/entry.ts';
import type { Subject } from '../../ledger/subject.ts';
import type { TraceDocument, TracedEntry } from '../../ledger/trace.ts';
import { roundedNumber } from '../../stages/formats/drawing/rounding.ts';
import { alignRows, counted, readableTime, thousands, wrapText } from '../text-table.ts';
import { entryLines } from './entry-text.ts';
import { entryColumns } from './entry-title.ts';

/** The whole text, ending in a line feed. @param columns  of the terminal; 80 to 100 are used */
export function traceText({ subject, lineage }: TraceDocument, book: string, columns: number): string {
  const width = Math.min(100, Math.max(80, columns));
  const parts = [subjectLines(subject, book, width)];
  if (lineage.length > 0) parts.push(overview(lineage));
  for (const entry of lineage) parts.push(entryLines(entry, lineage, width));
  if (lineage.length > 0) parts.push(outsideLines(lineage));
  return `${parts.map((lines) => lines.join('\n')).join('\n\n')}\n`;
}

// What was asked for

function subjectLines(subject: Subject, book: string, width: number): string[] {
  const lines = subjectSentences(subject).flatMap((sentence) => wrapText(sentence, width));
  return [...lines, `Book: ${book}`];
}

function subjectSentences(subject: Subject): string[] {
  switch (subject.type) {
    case 'entry':
      return [`Entry ${subject.entry}`];
    case 'run':
      return [`Run ${subject.run}, entry ${subject.entry}`];
    case 'plate':
      return [`Plate ${subject.plate}: output ${subject.output} of entry ${subject.drawn}`];
    case 'number':
      return numberSentences(subject);
    case 'file':
      return fileSentences(subject);
  }
}

function numberSentences({ number, run }: Extract<Subject, { type: 'number' }>): string[] {
  const { name, value, low, high, unit, against, output, key, entry } = number;
  const interval = low === null ? '' : ', 68 % interval';
  const shown = `${roundedNumber(value, low, high)} ${unit}`.trim();
  const sentences = [
    `${name} = ${shown}${interval}: published by run ${run}, ${key} in output ${output} of entry ${entry}`,
  ];
  if (against !== null)
    sentences.push(
      `The truth of this synthetic observation is ${against.value} ${against.unit}, entry ${against.entry}`,
    );
  return sentences;
}

function fileSentences(subject: Extract<Subject, { type: 'file' }>): string[] {
  const size = `${thousands(subject.bytes)} bytes, digest ${subject.digest}`;
  const maker = subject.roles.find(({ role }) => role !== 'input');
  if (maker !== undefined) {
    const what = `${maker.role} ${maker.name}`.trim();
    return [`${subject.asked}: the ${what} of entry ${maker.entry}`, size];
  }
  const readers = [...new Set(subject.roles.map(({ entry, name }) => `entry ${entry} (${name})`))].reverse();
  return [
    `${subject.asked}: a file from outside; no entry made it. It went into ${readers.join(', ')}.`,
    size,
  ];
}

// The lineage at a glance

function overview(lineage: readonly TracedEntry[]): string[] {
  const rows = lineage.map((entry) => [
    String(entry.number),
    ...entryColumns(entry),
    readableTime(entry.time),
    `${entry.digest.slice(0, 12)}…`,
  ]);
  const head = ['entry', 'type', 'name', '', 'UTC', 'digest'];
  return [
    `Lineage, nearest first: ${counted(lineage.length, 'entry', 'entries')}`,
    '',
    ...alignRows([head, ...rows], [{ right: true }]),
  ];
}

/** Files from outside, each once. */
function outsideLines(lineage: readonly TracedEntry[]): string[] {
  const files = new Map<string, string[]>();
  for (const entry of lineage) {
    for (const { digest, bytes, origin } of inputsOf(entry)) {
      if ('file' in origin)
        files.set(`${origin.file} ${digest}`, [origin.file, `${thousands(bytes)} bytes`, digest]);
    }
  }
  if (files.size === 0) return ['No file from outside went in.'];
  const rows = [...files.values()];
  const head =
    rows.length === 1 ? 'One file from outside went in:' : `${rows.length} files from outside went in:`;
  const lines = rows.flatMap(([path, bytes, digest]) => [`  ${path}  ${bytes}`, `    digest ${digest}`]);
  return [head, '', ...lines];
}

function inputsOf(entry: Entry): readonly RecordedInput[] {
  return entry.type === 'stage' || entry.type === 'failure' ? Object.values(entry.inputs).flat() : [];
}
