/** Pieces of the text of an entry: sections, fields, files of the store, parameters. */

import type { Json, StoredFile } from '../../ledger/entry.ts';
import { labelled, NO_BREAK, thousands, wrapText } from '../text-table.ts';

/** Blanks before a name inside an entry, and the least width of the column of names. */
export const INDENT = 4;
export const NAMES = 14;

export function section(title: string, lines: readonly string[]): string[] {
  return lines.length === 0 ? [] : [`  ${title}`, ...lines];
}

/** A field of the entry itself. */
export function field(label: string, text: string, width: number): string[] {
  return labelled(label, text, NAMES + INDENT - 2, 2, width);
}

/** A named thing inside a section. */
export function named(label: string, text: string, width: number): string[] {
  return labelled(label, text, NAMES, INDENT, width);
}

export function item(text: string, width: number): string[] {
  return wrapText(text, width - INDENT).map((line) => ' '.repeat(INDENT) + line);
}

/** A file of the store; its path holds the whole digest. */
export function storedFile(
  label: string,
  format: string,
  { digest, bytes }: StoredFile,
  width: number,
): string[] {
  return [
    ...named(label, `${format}, ${thousands(bytes)} bytes`, width),
    ...named('', `store/${digest.slice(0, 3)}/${digest}`, width),
  ];
}

export function parameterLines(
  parameters: { readonly [name: string]: Json },
  seed: number | null,
  width: number,
): string[] {
  const flat = flatten('', parameters);
  if (seed !== null && !('seed' in parameters)) flat.push(['seed', String(seed)]);
  const labels = Math.min(36, Math.max(NAMES, ...flat.map(([name]) => name.length)));
  return section(
    'parameters',
    flat.flatMap(([name, text]) => labelled(name, text, labels, INDENT, width)),
  );
}

/** Parameters by name, the fields of a group by dotted path; what lies deeper stands in one piece. A list of groups has
 *  one line for each. */
function flatten(path: string, value: Json): [string, string][] {
  if (isLeaf(value)) return [[path, plain(value)]];
  if (Array.isArray(value)) {
    return value.every(isLeaf)
      ? [[path, plain(value)]]
      : value.map((each, i) => [`${path}.${i}`, plain(each)]);
  }
  const fields = Object.entries(value as { readonly [key: string]: Json });
  if (path.includes('.')) return [[path, plain(value)]];
  if (fields.length === 0) return path === '' ? [] : [[path, 'none']];
  return fields.flatMap(([key, field]) => flatten(path === '' ? key : `${path}.${key}`, field));
}

function isLeaf(value: Json): boolean {
  return typeof value !== 'object' || value === null || isQuantity(value);
}

/** A value in one piece of text, without quotation marks where none are needed. */
export function plain(value: Json): string {
  if (typeof value === 'string') return value === '' ? '""' : value;
  if (typeof value !== 'object' || value === null) return String(value);
  if (Array.isArray(value)) return value.length === 0 ? 'none' : value.map(plain).join(', ');
  if (isQuantity(value)) return `${plain(value.value as Json)}${NO_BREAK}${value.unit}`.trim();
  return Object.entries(value)
    .sort(([a], [b]) => Number(b === 'name') - Number(a === 'name'))
    .map(([key, field]) => `${key}${NO_BREAK}${Array.isArray(field) ? `(${plain(field)})` : plain(field)}`)
    .join('; ');
}

function isQuantity(value: Json): value is { readonly [key: string]: Json } {
  return (
    typeof value === 'object' &&
    value !== null &&
    Object.keys(value).length === 2 &&
    'value' in value &&
    'unit' in value
  );
}
