/** The text of a trace: what was asked for, its lineage at a glance, each entry in full, and the files from outside
 *  with which everything began. */

import { isSigned } from '../../ledger/countersignature.ts';
import type { Entry, RecordedInput, WithdrawalEntry } from '../../ledger/entry.ts';
import type { Subject } from '../../ledger/subject.ts';
import type { TraceDocument, TracedEntry } from '../../ledger/trace.ts';
import { roundedNumber, roundNumber } from '../../stages/formats/drawing/rounding.ts';
import { roundedLike } from '../numbers-files.ts';
import { alignRows, counted, labelled, readableTime, thousands, wrapText } from '../text-table.ts';
import { entryLines } from './entry-text.ts';
import { entryColumns, signedThing } from './entry-title.ts';

/** The whole text, ending in a line feed. @param columns  of the terminal; 80 to 100 are used */
export function traceText(document: TraceDocument, book: string, columns: number): string {
  const { subject, lineage, withdrawals, countersignatures } = document;
  const width = Math.min(100, Math.max(80, columns));
  const parts = [subjectLines(subject, book, width)];
  if (withdrawals.length > 0) parts.push(withdrawalLines(document, width));
  if (countersignatures.length > 0) parts.push(countersignatureLines(document, width));
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
      `The truth of this synthetic observation is ${roundedLike(against.value, roundNumber(value, low, high).value)} ${against.unit}, entry ${against.entry}`,
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

// What was said of it since

function withdrawalLines({ subject, withdrawals }: TraceDocument, width: number): string[] {
  const own = withdrawals.some(({ withdraws }) => subject.entries.includes(withdraws));
  const head = own ? 'WITHDRAWN. It does not stand any more:' : 'DEPENDS ON SOMETHING WITHDRAWN:';
  return [head, '', ...withdrawals.flatMap((withdrawal) => withdrawalText(withdrawal, width))];
}

/** One withdrawal, in lines set in by two. */
export function withdrawalText(
  { number, withdraws, reason, by, time }: WithdrawalEntry,
  width: number,
): string[] {
  const said = `withdrawn by ${by.name}, ${readableTime(time)} UTC, in entry ${number}: ${reason}`;
  return labelled(`entry ${withdraws}`, said, 12, 2, width);
}

function countersignatureLines({ countersignatures }: TraceDocument, width: number): string[] {
  const lines = countersignatures.flatMap((entry) => {
    const holds = isSigned(entry, entry.book) ? '' : '; THE SIGNATURE DOES NOT HOLD';
    const said = `${entry.by.name}, ${readableTime(entry.time)} UTC, in entry ${entry.number}${holds}`;
    return [
      ...labelled(signedThing(entry), said, 12, 2, width),
      ...labelled('', `key ${entry.key}`, 12, 2, width),
    ];
  });
  return ['Countersigned by:', '', ...lines];
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
