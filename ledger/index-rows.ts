/** What the index holds of an entry: the rows of every derived table. One list, used when the index is filled and when
 *  it is audited. */

import { sha256 } from './digest.ts';
import type { Entry, Json } from './entry.ts';
import { type KnownLinks, lineageDistances } from './known-links.ts';
import { plateNumbersOf } from './plate-number.ts';
import { referencesOf } from './references.ts';

export type Value = string | number | null;

/** Where an entry's line lies. */
export interface Place {
  /** Byte at which it begins. */
  readonly position: number;
  /** Bytes, without the line feed. */
  readonly length: number;
  readonly digest: string;
}

/** A derived table, and the column that names the entry a row is of. */
export interface Table {
  readonly name: string;
  readonly columns: readonly string[];
  readonly entry: string;
}

/** In the order in which rowsOf gives them. Rows lie in the order of their entries. */
export const TABLES = [
  {
    name: 'entries',
    columns: [
      'number',
      'position',
      'length',
      'digest',
      'type',
      'time',
      'name',
      'kind',
      'key',
      'run',
      'settings',
    ],
    entry: 'number',
  },
  { name: 'files', columns: ['digest', 'bytes', 'role', 'name', 'entry'], entry: 'entry' },
  { name: 'links', columns: ['source', 'target'], entry: 'source' },
  { name: 'plates', columns: ['plate', 'entry', 'drawn', 'output', 'name'], entry: 'coalesce(entry, drawn)' },
  { name: 'numbers', columns: ['name', 'run', 'place', 'entry', 'output', 'publisher'], entry: 'publisher' },
  {
    name: 'lineages',
    columns: ['ancestor', 'dependant', 'distance', 'numbers'],
    entry: 'dependant',
  },
  { name: 'withdrawals', columns: ['withdraws', 'entry'], entry: 'entry' },
  { name: 'countersignatures', columns: ['signs', 'entry'], entry: 'entry' },
] as const satisfies readonly Table[];

/** The rows of an entry in each of TABLES, each with its columns in order.
 *  @param links  of every entry before; the entry's own are added */
export function rowsOf(entry: Entry, place: Place, links: KnownLinks): Value[][][] {
  const { number } = entry;
  const { files, entries } = referencesOf(entry);
  const targets = [...new Set(entries.map((named) => named.number))].sort((a, b) => a - b);
  links.add(targets);
  return [
    [entryRow(entry, place)],
    files.map(({ digest, bytes, role, name }) => [digest, bytes, role, name, number]),
    targets.map((target) => [number, target]),
    plateRows(entry, place.digest),
    entry.type !== 'run'
      ? []
      : entry.numbers.map(({ name, ...of }, i) => [name, entry.run, i, of.entry, of.output, number]),
    lineageRows(entry, targets, links),
    entry.type === 'withdrawal' ? [[entry.withdraws, number]] : [],
    entry.type === 'countersignature' ? [[entry.signs, number]] : [],
  ];
}

/** Of a run or a plate, everything that it depends on, with the length of the shortest way, and of a run the same for
 *  each published number, `3,,2`: empty where the number does not depend on it. So what something reaches is found
 *  without going from entry to entry. */
function lineageRows(entry: Entry, targets: readonly number[], links: KnownLinks): Value[][] {
  if (entry.type !== 'run' && entry.type !== 'plate') return [];
  const distances = lineageDistances(targets, 1, links);
  const holders = entry.type === 'run' ? entry.numbers.map((published) => published.entry) : [];
  const fromHolder = new Map(
    [...new Set(holders)].map((holder) => [holder, lineageDistances([holder], 1, links)]),
  );
  return [...distances].map(([ancestor, distance]) => {
    const each = holders.map((holder) => fromHolder.get(holder)?.get(ancestor) ?? '');
    return [ancestor, entry.number, distance, each.some((far) => far !== '') ? each.join() : null];
  });
}

/** A number for a stage's parameters, the same for the same parameters: the first 52 bits of their digest. Two sets may
 *  share it by chance, so what is found by it is held against the entry. Null for entries without parameters. */
export function settingsOf(entry: Entry): number | null {
  if (entry.type !== 'stage' && entry.type !== 'failure') return null;
  // Read from a line, the keys are in canonical order.
  const text = `${entry.seed} ${JSON.stringify(entry.parameters)}`;
  return Number.parseInt(sha256(text).slice(0, 13), 16);
}

/** Every value among a stage's parameters, by dotted path: `terms.0`, `field`, a quantity in one piece. */
export function valuesOf(entry: Entry): [name: string, value: string][] {
  if (entry.type !== 'stage' && entry.type !== 'failure') return [];
  const values = flatten('', entry.parameters);
  if (entry.seed !== null && !('seed' in entry.parameters)) values.push(['seed', String(entry.seed)]);
  return values;
}

function flatten(path: string, value: Json): [string, string][] {
  if (typeof value !== 'object' || value === null) return [[path, String(value)]];
  const fields = Object.entries(value);
  if (fields.length === 2 && 'value' in value && 'unit' in value)
    return [[path, `${String(value.value)} ${String(value.unit)}`.trim()]];
  return fields.flatMap(([key, field]) => flatten(path === '' ? key : `${path}.${key}`, field as Json));
}

function entryRow(entry: Entry, { position, length, digest }: Place): Value[] {
  const { name, kind, key, run } = columnsOf(entry);
  const { number, type, time } = entry;
  return [number, position, length, digest, type, time, name, kind, key, run, settingsOf(entry)];
}

/** The plate of a plate entry, or the numbers that the figures of a stage would have. */
function plateRows(entry: Entry, digest: string): Value[][] {
  if (entry.type === 'plate') return [[entry.plate, entry.number, entry.drawn, entry.output, entry.name]];
  if (entry.type !== 'stage') return [];
  const plates = plateNumbersOf(entry.number, digest, entry.outputs);
  return [...plates].map(([output, plate]) => [plate, null, entry.number, output, null]);
}

function columnsOf(entry: Entry): {
  name: string | null;
  kind: string | null;
  key: string | null;
  run: number | null;
} {
  const none = { name: null, kind: null, key: null, run: null };
  switch (entry.type) {
    case 'stage':
      return { ...none, name: entry.name, kind: entry.kind, key: entry.key };
    case 'failure':
      return { ...none, name: entry.name, kind: entry.kind };
    case 'run':
      return { ...none, name: entry.recipe.name, run: entry.run };
    case 'plate':
      return { ...none, name: entry.name };
    default:
      return none;
  }
}
