/** What the index holds of an entry: the rows of every derived table. One list, used when the index is filled and when
 *  it is audited. */

import { sha256 } from './digest.ts';
import type { Entry, Json } from './entry.ts';
import { linksOf } from './link-bundles.ts';
import { referencesOf } from './references.ts';

export type Value = string | number | null;

/** Longer values of parameters are known by their beginning. */
export const LONGEST_VALUE = 200;

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
  /** By what rows come in the order of their entries. */
  readonly order: string;
}

/** In the order in which rowsOf gives them. */
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
    order: 'number',
  },
  { name: 'files', columns: ['mark', 'rest', 'role', 'name', 'entry'], entry: 'entry', order: 'rowid' },
  { name: 'plates', columns: ['plate', 'entry', 'drawn', 'output', 'name'], entry: 'entry', order: 'entry' },
  {
    name: 'numbers',
    columns: ['name', 'place', 'entry', 'output', 'publisher'],
    entry: 'publisher',
    order: 'publisher, place',
  },
  { name: 'withdrawals', columns: ['withdraws', 'entry'], entry: 'entry', order: 'rowid' },
  { name: 'countersignatures', columns: ['signs', 'entry'], entry: 'entry', order: 'rowid' },
] as const satisfies readonly Table[];

/** Digits of a digest in one number: 52 bits are exact. */
const DIGITS = 13;

/** What the index has of a file's digest, two numbers: the first 13 digits, by which it is found, and the next 13. Of
 *  files that have both in common there are none but by intent, and what is found is held against the entry. */
export function markOf(digest: string): number {
  return Number.parseInt(digest.slice(0, DIGITS), 16);
}

export function restOf(digest: string): number {
  return Number.parseInt(digest.slice(DIGITS, 2 * DIGITS), 16);
}

/** The condition on `files` that a digest begins with some digits, and its values. */
export function beginsWith(digits: string): { sql: string; values: Value[] } {
  const [from, to] = [digits.padEnd(2 * DIGITS, '0'), digits.padEnd(2 * DIGITS, 'f')];
  return {
    sql: 'mark BETWEEN ? AND ? AND rest BETWEEN ? AND ?',
    values: [markOf(from), markOf(to), restOf(from), restOf(to)],
  };
}

/** The rows of an entry in each of TABLES, each with its columns in order; and what its bundle holds of it. */
export function rowsOf(entry: Entry, place: Place): { rows: Value[][][]; links: number[] } {
  const { files, entries } = referencesOf(entry);
  const targets = [...new Set(entries.map(({ number }) => number))].sort((a, b) => a - b);
  const rows: Value[][][] = [
    [entryRow(entry, place)],
    files.map(({ digest, role, name }) => [markOf(digest), restOf(digest), role, name, entry.number]),
    entry.type === 'plate' ? [[entry.plate, entry.number, entry.drawn, entry.output, entry.name]] : [],
    entry.type !== 'run'
      ? []
      : entry.numbers.map(({ name, ...of }, i) => [name, i, of.entry, of.output, entry.number]),
    entry.type === 'withdrawal' ? [[entry.withdraws, entry.number]] : [],
    entry.type === 'countersignature' ? [[entry.signs, entry.number]] : [],
  ];
  return { rows, links: linksOf(entry, targets) };
}

/** A number for a stage's parameters, the same for the same parameters: the first 52 bits of their digest. Two sets may
 *  share it by chance, so what is found by it is held against the entry. Null for entries without parameters. */
export function settingsOf(entry: Entry): number | null {
  if (entry.type !== 'stage' && entry.type !== 'failure') return null;
  // Read from a line, the keys are in canonical order.
  const text = `${entry.seed} ${JSON.stringify(entry.parameters)}`;
  return markOf(sha256(text));
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

function columnsOf(entry: Entry): {
  name: string | null;
  kind: string | null;
  key: number | null;
  run: number | null;
} {
  const none = { name: null, kind: null, key: null, run: null };
  switch (entry.type) {
    case 'stage':
      return { ...none, name: entry.name, kind: entry.kind, key: markOf(entry.key) };
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
