/** Cells: the values of a recipe, each with the place where it stands. */

import type { Spot } from './source-text.ts';

export type Scalar = string | number | boolean | null;

export type Cell = { readonly spot: Spot } & (
  | { readonly type: 'map'; readonly entries: readonly CellEntry[] }
  | { readonly type: 'list'; readonly items: readonly Cell[] }
  /** `written` is the text as it stands, without quotes. */
  | { readonly type: 'scalar'; readonly value: Scalar; readonly written: string }
);

export interface CellEntry {
  readonly key: string;
  readonly spot: Spot;
  readonly value: Cell;
}

/** What stands there, for a message: `"160" (text)`, `12 (number)`, `a list of 3`. */
export function describeCell(cell: Cell): string {
  if (cell.type === 'map') return `a map of ${cell.entries.length}`;
  if (cell.type === 'list') return `a list of ${cell.items.length}`;
  if (cell.value === null) return cell.written === '' ? 'nothing' : `${cell.written} (nothing)`;
  if (typeof cell.value === 'string') return `${quoted(cell.value)} (text)`;
  const shown = cell.written.length > 40 ? `${cell.written.slice(0, 40)}…` : cell.written;
  return `${shown} (${typeof cell.value === 'number' ? 'number' : 'true or false'})`;
}

/** Text in double quotes, cut and with everything escaped that is not printable. */
export function quoted(text: string): string {
  const shown = text.length > 60 ? `${text.slice(0, 60)}…` : text;
  return JSON.stringify(shown).replace(
    /[\p{Cc}\p{Cf}\u2028\u2029]/gu,
    (c) => `\\u{${c.codePointAt(0)?.toString(16)}}`,
  );
}

/** A cell for a value of ours, such as a default: everything in it stands at `spot`. */
export function cellOf(value: unknown, spot: Spot): Cell {
  if (Array.isArray(value)) return { type: 'list', spot, items: value.map((item) => cellOf(item, spot)) };
  if (typeof value !== 'object' || value === null) {
    return { type: 'scalar', spot, value: (value ?? null) as Scalar, written: String(value) };
  }
  const entries = Object.entries(value).map(([key, item]) => ({ key, spot, value: cellOf(item, spot) }));
  return { type: 'map', spot, entries };
}
