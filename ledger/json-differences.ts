/** Where two JSON values differ. */

import { canonicalJson } from './canonical.ts';
import type { Json } from './entry.ts';

/** Where two values differ, as far down as both are objects, or lists of one length. */
export function jsonDifferences(
  path: string,
  a: Json | undefined,
  b: Json | undefined,
): { parameter: string; values: readonly [Json | null, Json | null] }[] {
  if (same(a, b)) return [];
  const keys = commonKeys(a, b);
  if (keys === null) return [{ parameter: path, values: [a ?? null, b ?? null] }];
  return keys.flatMap((key) =>
    jsonDifferences(path === '' ? key : `${path}.${key}`, fieldOf(a, key), fieldOf(b, key)),
  );
}

function commonKeys(a: Json | undefined, b: Json | undefined): string[] | null {
  if (!isObject(a) || !isObject(b) || isQuantity(a) || isQuantity(b)) return null;
  if (Array.isArray(a) !== Array.isArray(b)) return null;
  const [inA, inB] = [Object.keys(a), Object.keys(b)];
  if (Array.isArray(a) && inA.length !== inB.length) return null;
  return namesOf(inA, inB);
}

function fieldOf(value: Json | undefined, key: string): Json | undefined {
  return isObject(value) && Object.hasOwn(value, key) ? value[key] : undefined;
}

function isObject(value: Json | undefined): value is { readonly [key: string]: Json } {
  return typeof value === 'object' && value !== null;
}

/** A quantity is one value: 160 uas against 150 mas is one difference. */
function isQuantity(value: { readonly [key: string]: Json }): boolean {
  return Object.keys(value).length === 2 && 'value' in value && 'unit' in value;
}

function same(a: Json | undefined, b: Json | undefined): boolean {
  if (a === undefined || b === undefined) return a === b;
  return canonicalJson(a) === canonicalJson(b);
}

/** Names of both, in the order of the first, then what only the second has. */
export function namesOf(a: readonly string[], b: readonly string[]): string[] {
  return [...new Set([...a, ...b])];
}
