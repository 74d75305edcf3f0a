/** An entry in full, as text: down to the digest, size and path of every file that it names. */

import { isSigned } from '../../ledger/countersignature.ts';
import type {
  CountersignatureEntry,
  Entry,
  FailureEntry,
  ImportEntry,
  PlateEntry,
  RecordedFinding,
  RerunEntry,
  RunEntry,
  StageEntry,
} from '../../ledger/entry.ts';
import type { TracedEntry } from '../../ledger/trace.ts';
import { roundedNumber } from '../../stages/formats/drawing/rounding.ts';
import { againstLimits } from '../finding-text.ts';
import { alignRows, counted, labelled, readableTime, roundSize, thousands } from '../text-table.ts';
import { field, INDENT, item, NAMES, named, parameterLines, section, storedFile } from './entry-pieces.ts';
import { entryTitle, signedThing } from './entry-title.ts';

/** The lines of one entry. @param lineage  entries whose names can be told */
export function entryLines(entry: TracedEntry, lineage: readonly TracedEntry[], width: number): string[] {
  const title = `Entry ${entry.number}: ${entryTitle(entry)}`;
  const heading = [title, '-'.repeat(title.length)];
  const common = field('entered', `${readableTime(entry.time)} UTC by ${entry.by.name}`, width).concat(
    field('digest', entry.digest, width),
  );
  return [...heading, ...common, ...bodyLines(entry, lineage, width)];
}

function bodyLines(entry: Entry, lineage: readonly TracedEntry[], width: number): string[] {
  switch (entry.type) {
    case 'stage':
      return stageLines(entry, lineage, width);
    case 'failure':
      return failureLines(entry, lineage, width);
    case 'run':
      return runLines(entry, width);
    case 'plate':
      return plateLines(entry, width);
    case 'rerun':
      return rerunLines(entry, width);
    case 'import':
      return importLines(entry, width);
    case 'withdrawal':
      return [
        ...field('withdraws', `entry ${entry.withdraws}`, width),
        ...field('reason', entry.reason, width),
      ];
    case 'countersignature':
      return signatureLines(entry, width);
    default:
      return [];
  }
}

function stageLines(entry: StageEntry, lineage: readonly TracedEntry[], width: number): string[] {
  const outputs = Object.entries(entry.outputs).flatMap(([name, file]) =>
    storedFile(name, file.format, file, width),
  );
  return [
    ...executionLines(entry, width),
    ...inputLines(entry, lineage, width),
    ...parameterLines(entry.parameters, entry.seed, width),
    ...section('outputs', outputs),
    ...section('log', entry.log === null ? [] : storedFile('log', 'text', entry.log, width)),
    ...findingLines(entry.findings, width),
    ...section(
      'warnings',
      entry.warnings.flatMap((text) => item(text, width)),
    ),
    ...section('stopped the run', entry.stop === null ? [] : item(entry.stop, width)),
    ...section('mark on plates', entry.mark === null ? [] : item(entry.mark, width)),
  ];
}

function failureLines(entry: FailureEntry, lineage: readonly TracedEntry[], width: number): string[] {
  return [
    ...executionLines(entry, width),
    ...inputLines(entry, lineage, width),
    ...parameterLines(entry.parameters, entry.seed, width),
    ...section('log', entry.log === null ? [] : storedFile('log', 'text', entry.log, width)),
    ...section(`failed: ${entry.error.code}`, item(entry.error.message, width)),
  ];
}

function executionLines(
  { code, platform, seconds, peakMemory }: StageEntry | FailureEntry,
  width: number,
): string[] {
  const files = counted(Object.keys(code.files).length, 'file', 'files');
  const packages = counted(Object.keys(code.packages).length, 'package', 'packages');
  const memory = peakMemory > 0 ? `, at most ${roundSize(peakMemory)}` : '';
  return [
    ...field('code', code.digest, width),
    ...field('', `version ${code.version}, ${files}, ${packages}, runtime ${code.runtime}`, width),
    ...field('executed', `on ${platform}, ${seconds.toFixed(1)} s${memory}`, width),
  ];
}

function inputLines(
  { inputs }: StageEntry | FailureEntry,
  lineage: readonly TracedEntry[],
  width: number,
): string[] {
  const lines = Object.entries(inputs).flatMap(([name, list]) =>
    list.flatMap(({ origin, digest, bytes }, i) => {
      const label = list.length > 1 ? `${name} ${i + 1}` : name;
      const from =
        'file' in origin
          ? `file ${origin.file}`
          : `output ${origin.output} of ${entryNamed(origin.entry, lineage)}`;
      return [
        ...named(label, `${from}, ${thousands(bytes)} bytes`, width),
        ...named('', `digest ${digest}`, width),
      ];
    }),
  );
  return section('inputs', lines);
}

function entryNamed(number: number, lineage: readonly TracedEntry[]): string {
  const entry = lineage.find((candidate) => candidate.number === number);
  return entry?.type === 'stage' ? `entry ${number}, ${entry.name}` : `entry ${number}`;
}

/** Findings with their limits; what was measured is told of those that are not within them. */
function findingLines(findings: readonly RecordedFinding[], width: number): string[] {
  const good = ({ finding }: RecordedFinding) => finding === 'within limits';
  const sorted = [...findings.filter((each) => !good(each)), ...findings.filter(good)];
  const labels = Math.min(36, Math.max(NAMES, ...findings.map(({ check }) => check.length)));
  const lines = sorted.flatMap((each) => {
    const text = `${each.finding}: ${againstLimits(each)}`;
    return labelled(each.check, good(each) ? text : `${text}. ${each.detail}`, labels, INDENT, width);
  });
  return section('findings', lines);
}

function runLines(
  { recipe, overrides, stages, plates, numbers, finished }: RunEntry,
  width: number,
): string[] {
  const stageRows = stages.map(({ stage, kind, state, entry }) => [
    stage,
    kind,
    state,
    entry === null ? '' : `entry ${entry}`,
  ]);
  const plateRows = plates.map(({ name, plate, entry }) => [name, plate, `entry ${entry}`]);
  const numberRows = numbers.map(({ name, value, low, high, unit, entry, output }) => [
    name,
    `${roundedNumber(value, low, high)} ${unit}`.trim(),
    `entry ${entry}, ${output}`,
  ]);
  return [
    ...field('finished', finished ? 'yes' : 'no', width),
    ...section('recipe', storedFile(recipe.name, `as ${recipe.path}`, recipe, width)),
    ...section(
      'overrides',
      overrides.flatMap(({ stage, parameter, text }) => item(`${stage}.${parameter}=${text}`, width)),
    ),
    ...section('stages', alignRows(stageRows, [], INDENT)),
    ...section('plates', alignRows(plateRows, [], INDENT)),
    ...section('numbers', alignRows(numberRows, [], INDENT)),
  ];
}

function plateLines({ drawn, output, figure, stamped, mark }: PlateEntry, width: number): string[] {
  return [
    ...section('figure', [
      ...named(output, `of entry ${drawn}`, width),
      ...named('', `digest ${figure}`, width),
    ]),
    ...section('plate, with its number', [
      ...storedFile('svg', 'SVG', stamped.svg, width),
      ...storedFile('png', 'PNG', stamped.png, width),
    ]),
    ...section('mark', mark === null ? [] : item(mark, width)),
  ];
}

/** Where an imported entry comes from, and what shows that it stands there. */
function importLines(
  { origin, imported, record, proof, files, entries }: ImportEntry,
  width: number,
): string[] {
  const here = new Map(entries.map(({ number, entry }) => [number, entry]));
  const needs = [...here].map(([number, entry]) => `${number} (here ${entry})`).join(', ');
  const shown = files.filter(({ role }) => role !== 'code');
  const code = files.length - shown.length;
  return [
    ...field('of', `entry ${origin.number} of the book ${origin.book}, by ${imported.by.name}`, width),
    ...field('its digest', origin.digest, width),
    ...(needs === '' ? [] : field('depends on', needs, width)),
    ...section('kept', [
      ...storedFile('record', 'json', record, width),
      ...(proof === null ? item('no proof', width) : storedFile('proof', 'json', proof, width)),
      ...shown.flatMap((file) => storedFile(file.name || file.role, file.role, file, width)),
      ...(code === 0 ? [] : item(counted(code, 'file of code', 'files of code'), width)),
    ]),
  ];
}

function rerunLines({ of, verdict, outputs, differences }: RerunEntry, width: number): string[] {
  const rows = outputs.map(({ stage, output, verdict }) => [`${stage}.${output}`, verdict]);
  return [
    ...field('again', `entry ${of}`, width),
    ...field('verdict', verdict, width),
    ...section('outputs', alignRows(rows, [], INDENT)),
    ...section(
      'differences from the record',
      differences.flatMap((text) => item(text, width)),
    ),
  ];
}

function signatureLines(entry: CountersignatureEntry, width: number): string[] {
  return [
    ...field('signs', signedThing(entry), width),
    ...field('', isSigned(entry, entry.book) ? 'the signature holds' : 'THE SIGNATURE DOES NOT HOLD', width),
    ...field('key', entry.key, width),
  ];
}
