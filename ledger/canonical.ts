/** Canonical JSON, RFC 8785: one value, one spelling. No white space, keys in the order of their UTF-16 code units
 *  (section 3.2.3), numbers and strings as ECMAScript writes them (3.2.2). What JSON cannot hold is refused instead of
 *  dropped: NaN, the infinities, lone surrogates, undefined, anything but plain objects and arrays. */

import type { Json } from './entry.ts';
import { notCanonical, notJson } from './problem.ts';

/** Deeper nesting than this is taken for a loop. Entries stay below 20. */
const DEEPEST = 500;
/** How the runtime writes half of a pair of code units. */
const LONE_SURROGATE = /\\ud[89a-f]/i;
/** A byte order mark is not swallowed: it would be another spelling. */
const UTF8 = new TextDecoder('utf-8', { fatal: true, ignoreBOM: true });

/** The canonical text of a value.
 *  @param place  how an error names the value
 *  @throws LedgerProblem 'not-canonical', with the path to what JSON cannot hold. */
export function canonicalJson(value: Json, place = 'value'): string {
  return formatValue(value, [place]);
}

/** The value of a canonical text; the inverse of canonicalJson.
 *  @param bytes  UTF-8, without line feed
 *  @throws LedgerProblem 'not-canonical' when it is no JSON, or JSON in any other spelling. */
export function parseCanonical(bytes: Uint8Array, place = 'value'): Json {
  let text: string;
  let value: Json;
  try {
    text = UTF8.decode(bytes);
    value = JSON.parse(text);
  } catch (cause) {
    throw notJson(place, cause);
  }
  // The runtime writes what it read in the same way, but for the order of keys and for lone surrogates.
  if (
    JSON.stringify(value) === text &&
    hasSortedKeys(value) &&
    text.isWellFormed() &&
    !LONE_SURROGATE.test(text)
  )
    return value;
  const canonical = canonicalJson(value, place);
  if (canonical !== text) throw notCanonical(place, 'canonical JSON', differenceOf(text, canonical));
  return value;
}

/** Whether the keys of every object within are in the order of their code units. */
function hasSortedKeys(value: Json): boolean {
  if (typeof value !== 'object' || value === null) return true;
  if (Array.isArray(value)) return value.every(hasSortedKeys);
  let before: string | null = null;
  for (const key in value) {
    if (before !== null && !(before < key)) return false;
    before = key;
    const field = (value as { readonly [key: string]: Json })[key];
    if (typeof field === 'object' && !hasSortedKeys(field as Json)) return false;
  }
  return true;
}

/** @param path  where the value stands; names are pushed and popped, so that only an error pays for its text */
function formatValue(value: unknown, path: (string | number)[]): string {
  if (value === null || typeof value === 'boolean') return String(value);
  if (typeof value === 'number') {
    if (!Number.isFinite(value)) throw notCanonical(path.join('.'), 'a finite number', String(value));
    return JSON.stringify(value);
  }
  if (typeof value === 'string') return formatText(value, path);
  if (typeof value !== 'object') throw notCanonical(path.join('.'), 'a JSON value', typeof value);
  if (path.length > DEEPEST)
    throw notCanonical(String(path[0]), `at most ${DEEPEST} levels`, 'more, or a loop');
  return Array.isArray(value) ? formatList(value, path) : formatObject(value, path);
}

function formatText(text: string, path: readonly (string | number)[]): string {
  if (!text.isWellFormed()) throw notCanonical(path.join('.'), 'Unicode text', 'a lone surrogate');
  return JSON.stringify(text);
}

function formatList(list: readonly unknown[], path: (string | number)[]): string {
  const texts: string[] = [];
  // By index, because iteration by map would skip holes.
  for (let i = 0; i < list.length; i += 1) {
    path.push(i);
    texts.push(formatValue(list[i], path));
    path.pop();
  }
  return `[${texts.join(',')}]`;
}

function formatObject(object: object, path: (string | number)[]): string {
  const prototype = Object.getPrototypeOf(object);
  if (prototype !== Object.prototype && prototype !== null) {
    throw notCanonical(path.join('.'), 'a plain object', object.constructor?.name ?? 'another object');
  }
  const texts: string[] = [];
  // Sorting without a function compares UTF-16 code units (ECMA-262, Array.prototype.sort).
  for (const key of Object.keys(object).sort()) {
    path.push(key);
    texts.push(`${formatText(key, path)}:${formatValue((object as Record<string, unknown>)[key], path)}`);
    path.pop();
  }
  return `{${texts.join(',')}}`;
}

function differenceOf(text: string, canonical: string): string {
  let at = 0;
  while (at < text.length && text[at] === canonical[at]) at += 1;
  return `another spelling, from character ${at + 1} on`;
}
