/** The text of a comparison: one line for each part in which nothing differs, a list for the others, the numbers as a
 *  table. */

import type { DiffDocument, DiffInput, DiffNumber } from '../../ledger/diff.ts';
import type { Origin } from '../../ledger/entry.ts';
import { roundedNumber } from '../../stages/formats/drawing/rounding.ts';
import { alignRows, counted, labelled, wrapText } from '../text-table.ts';
import { plain } from './entry-pieces.ts';

const LABELS = 11;
const INDENT = LABELS + 4;
/** Stands before a value that depends on something withdrawn. */
export const WITHDRAWN = '†';

/** The whole text, ending in a line feed. @param columns  of the terminal; 80 to 100 are used */
export function diffText(document: DiffDocument, columns: number): string {
  const width = Math.min(100, Math.max(80, columns));
  const [a, b] = document.runs;
  const lines = [
    `From run ${a} to run ${b}`,
    '',
    ...withdrawnPart(document, width),
    ...part('recipe', recipeSentence(document), [], width),
    ...stagePart(document, width),
    ...parameterPart(document, width),
    ...inputPart(document, width),
    ...codePart(document, width),
    ...environmentPart(document, width),
    ...outputPart(document, width),
    ...numberPart(document, width),
  ];
  return `${lines.join('\n')}\n`;
}

/** A part's name and sentence, and details below it, set in. */
function part(label: string, sentence: string, details: readonly string[], width: number): string[] {
  return [...labelled(label, sentence, LABELS, 2, width), ...details];
}

function nothing(label: string, width: number): string[] {
  return part(label, 'nothing differs', [], width);
}

/** Nothing where nothing is withdrawn. */
function withdrawnPart({ withdrawals, runs }: DiffDocument, width: number): string[] {
  const each = new Map(withdrawals.map((withdrawal) => [withdrawal.entry, withdrawal]));
  return [...each.values()].flatMap(({ entry, withdraws, reason }, i) => {
    const of = new Set(withdrawals.filter((other) => other.entry === entry).map(({ run }) => run));
    const who = of.size === 1 && runs[0] !== runs[1] ? `run ${[...of][0]} depends` : 'both runs depend';
    const sentence = `${who} on entry ${withdraws}, WITHDRAWN in entry ${entry}: ${reason}`;
    return part(i === 0 ? 'withdrawn' : '', sentence, [], width);
  });
}

function recipeSentence({ recipe: { same, names } }: DiffDocument): string {
  if (names[0] !== names[1]) return `${names[0]} → ${names[1]}`;
  return same ? `${names[0]}, the same bytes` : `${names[0]}, other bytes`;
}

function stagePart({ stages }: DiffDocument, width: number): string[] {
  if (stages.length === 0) return nothing('stages', width);
  const rows = stages.map(({ stage, kinds }) => [stage, kinds[0] ?? '(none)', '→', kinds[1] ?? '(none)']);
  return part(
    'stages',
    `${stages.length} in one run only, or of another kind`,
    alignRows(rows, [], INDENT),
    width,
  );
}

function parameterPart({ parameters }: DiffDocument, width: number): string[] {
  if (parameters.length === 0) return nothing('parameters', width);
  const rows = parameters.map(({ stage, parameter, values: [x, y] }) => [
    `${stage}.${parameter}`,
    x === null ? '(none)' : plain(x),
    '→',
    y === null ? '(none)' : plain(y),
  ]);
  return part('parameters', differ(parameters.length), fitRows(rows, width), width);
}

function inputPart({ inputs }: DiffDocument, width: number): string[] {
  if (inputs.length === 0) return nothing('inputs', width);
  const outside = inputs.filter(({ derived }) => !derived);
  const inside = inputs.filter(({ derived }) => derived);
  const details = outside.flatMap((input) => outsideLines(input));
  if (inside.length > 0) {
    const names = inside.map(({ stage, input }) => `${stage}.${input}`).join(', ');
    const because = `because an earlier stage's output does: ${names}`;
    details.push(...wrapText(because, width - INDENT).map((line) => ' '.repeat(INDENT) + line));
  }
  const files =
    outside.length === 0
      ? 'no file from outside differs'
      : `${counted(outside.length, 'differs', 'differ')} from outside`;
  return part(
    'inputs',
    inside.length === 0 ? files : `${files}, ${inside.length} from earlier stages`,
    details,
    width,
  );
}

function outsideLines({ stage, input, digests, origins }: DiffInput): string[] {
  const side = (i: 0 | 1) => [
    origins[i]?.map(originText).join(', ') ?? '(none)',
    digests[i]?.map((digest) => digest.slice(0, 12)).join(', ') ?? '',
  ];
  const [from, to] = [side(0), side(1)];
  return alignRows(
    [
      [`${stage}.${input}`, ...from],
      ['', ...to],
    ],
    [],
    INDENT,
  );
}

function originText(origin: Origin): string {
  return 'file' in origin ? origin.file : `entry ${origin.entry}, ${origin.output}`;
}

function codePart({ code }: DiffDocument, width: number): string[] {
  if (code.length === 0) return nothing('code', width);
  // Stages often share what changed; each set of changes is said once.
  const groups = new Map<string, string[]>();
  for (const { stage, versions, files, packages } of code) {
    const changes = [
      ...(versions[0] === versions[1] ? [] : [`version ${versions[0]} → ${versions[1]}`]),
      ...packages.map(({ name, versions: [x, y] }) => `${name} ${x ?? '(none)'} → ${y ?? '(none)'}`),
      ...files,
    ];
    const text = changes.length === 0 ? 'the runtime' : changes.join(', ');
    groups.set(text, [...(groups.get(text) ?? []), stage]);
  }
  const details = [...groups].flatMap(([text, stages]) =>
    wrapText(`${stages.join(', ')}: ${text}`, width - INDENT - 2).map(
      (line, i) => ' '.repeat(INDENT + (i === 0 ? 0 : 2)) + line,
    ),
  );
  return part('code', `differs in ${counted(code.length, 'stage', 'stages')}`, details, width);
}

function environmentPart({ environment }: DiffDocument, width: number): string[] {
  if (environment.length === 0) return nothing('environment', width);
  const rows = environment.map(({ name, values, stages }) => [
    name,
    values[0],
    '→',
    values[1],
    `(${counted(stages.length, 'stage', 'stages')})`,
  ]);
  return part('environment', differ(environment.length), alignRows(rows, [], INDENT), width);
}

function outputPart({ outputs }: DiffDocument, width: number): string[] {
  if (outputs.length === 0) return part('outputs', 'none', [], width);
  const others = outputs.filter(({ same }) => !same).map(({ stage, output }) => `${stage}.${output}`);
  const same = outputs.length - others.length;
  if (others.length === 0) return part('outputs', `all ${outputs.length} have the same bytes`, [], width);
  const details = wrapText(others.join(', '), width - INDENT).map((line) => ' '.repeat(INDENT) + line);
  return part('outputs', `${same} of ${outputs.length} have the same bytes; these differ:`, details, width);
}

function numberPart({ numbers, runs }: DiffDocument, width: number): string[] {
  if (numbers.length === 0) return part('numbers', 'none are published', [], width);
  const moved = numbers.filter(({ shift }) => shift !== 0).length;
  const sentence = moved === 0 ? `all ${numbers.length} are the same` : `${moved} of ${numbers.length} moved`;
  const head = ['', `run ${runs[0]}`, `run ${runs[1]}`, 'unit', 'shift', 'sigmas'];
  const rows = numbers.map((number) => [
    number.name,
    side(number, 0),
    side(number, 1),
    unitsText(number),
    shiftText(number),
    sigmasText(number),
  ]);
  const right = { right: true } as const;
  const table = alignRows([head, ...rows], [{}, right, right, {}, right, right], 2);
  const note = numbers.some(({ sigmas }) => sigmas !== null)
    ? ['', '  sigmas: the shift over the quadrature sum of both half-widths of the 68 % intervals']
    : [];
  if (numbers.some(({ withdrawn }) => withdrawn.flat().length > 0))
    note.push('', `  ${WITHDRAWN} depends on something withdrawn: does not stand any more`);
  return [...part('numbers', sentence, [], width), '', ...table, ...note];
}

function side({ values, intervals, withdrawn }: DiffNumber, i: 0 | 1): string {
  const value = values[i];
  if (value === null) return '(none)';
  const shown = roundedNumber(value, intervals[i]?.[0] ?? null, intervals[i]?.[1] ?? null);
  return withdrawn[i].length > 0 ? `${WITHDRAWN}${shown}` : shown;
}

function unitsText({ units: [x, y] }: DiffNumber): string {
  if (x === null || y === null || x === y) return x ?? y ?? '';
  return `${x} → ${y}`;
}

function shiftText({ shift }: DiffNumber): string {
  if (shift === null) return '';
  if (shift === 0) return '0';
  return `${shift > 0 ? '+' : '−'}${Number(Math.abs(shift).toPrecision(2))}`;
}

function sigmasText({ sigmas }: DiffNumber): string {
  if (sigmas === null) return '';
  const size = Math.abs(sigmas);
  if (size < 0.005) return '0';
  return `${sigmas > 0 ? '+' : '−'}${size >= 10 ? size.toFixed(0) : size.toFixed(2)}`;
}

function differ(count: number): string {
  return counted(count, 'differs', 'differ');
}

/** Rows side by side where they fit; a long value on a line of its own. */
function fitRows(rows: readonly string[][], width: number): string[] {
  const short = rows.filter((row) => row.join('  ').length + INDENT <= width);
  const long = rows.filter((row) => !short.includes(row));
  const set = ' '.repeat(INDENT);
  const lines = long.flatMap(([name = '', from = '', , to = '']) => [
    `${set}${name}`,
    ...labelled('from', from, 4, INDENT + 2, width),
    ...labelled('to', to, 4, INDENT + 2, width),
  ]);
  return [...alignRows(short, [], INDENT), ...lines];
}
