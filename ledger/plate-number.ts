/** Plate numbers: `57b-K3Q9M2`. The number of the entry that drew the figure, a letter when it drew several, a dash,
 *  and the first 30 bits of that entry's digest as six symbols of Crockford's base 32.
 *
 *      plate-number = number [letter] "-" 6symbol
 *      number       = 1-9 *digit                  letter = a-z
 *      symbol       = 0-9 A-Z without I, L, O, U
 *
 *  Source of the alphabet: D. Crockford, "Base 32". A person may type lower case, and o, i, l for 0, 1, 1. */

import type { StageDraft } from './entry.ts';
import { badCall } from './problem.ts';

const SYMBOLS = '0123456789ABCDEFGHJKMNPQRSTVWXYZ';
const LETTERS = 'abcdefghijklmnopqrstuvwxyz';
/** Six symbols of five bits: two entries of the same number agree by chance once in 2^30. */
const COUNT = 6;

export interface PlateNumber {
  readonly entry: number;
  /** Empty when the entry drew one figure. */
  readonly letter: string;
  /** Six symbols. */
  readonly check: string;
}

/** The plate number of an entry's figure. @param letter  '' when the entry drew only one */
export function plateNumber(entry: number, letter: string, digest: string): string {
  return `${entry}${letter}-${checkSymbols(digest)}`;
}

/** The six symbols of a digest: its first 30 bits. */
export function checkSymbols(digest: string): string {
  return base32(Number.parseInt(digest.slice(0, 8), 16) >>> 2, COUNT);
}

/** The plate numbers of all figures (outputs of format `svg`) of an entry, by output: letters go by the output's name,
 *  in the order of UTF-16 code units. @throws LedgerProblem when an entry drew more figures than there are letters. */
export function plateNumbersOf(
  entry: number,
  digest: string,
  outputs: StageDraft['outputs'],
): ReadonlyMap<string, string> {
  const names = Object.keys(outputs)
    .filter((name) => outputs[name]?.format === 'svg')
    .sort();
  if (names.length > LETTERS.length)
    throw badCall(`Entry ${entry} drew more than ${LETTERS.length} figures.`);
  return new Map(
    names.map((name, i) => [name, plateNumber(entry, names.length > 1 ? LETTERS.charAt(i) : '', digest)]),
  );
}

/** The parts of a plate number as a person types it; null when it is none. */
export function parsePlateNumber(text: string): PlateNumber | null {
  const parts = /^([1-9]\d{0,14})([a-z]?)-([0-9a-z]{6})$/.exec(text.trim().toLowerCase());
  if (parts === null) return null;
  const check = normalizeBase32(parts[3] ?? '');
  return check === null ? null : { entry: Number(parts[1]), letter: parts[2] ?? '', check };
}

/** The text of a plate number; the inverse of parsePlateNumber. */
export function formatPlateNumber(plate: PlateNumber): string {
  return `${plate.entry}${plate.letter}-${plate.check}`;
}

/** All plate numbers that stand in a text, or in bytes, in their proper spelling; each once, in order. Other things
 *  can look like one: ask the book. Cost: one pass. */
export function findPlateNumbers(text: string | Uint8Array): PlateNumber[] {
  const searched = typeof text === 'string' ? text : Buffer.from(text).toString('latin1');
  const found = new Map<string, PlateNumber>();
  for (const [spelled] of searched.matchAll(
    /(?<![0-9A-Za-z])[1-9]\d{0,14}[a-z]?-[0-9A-HJKMNP-TV-Z]{6}(?![0-9A-Za-z])/g,
  )) {
    const plate = parsePlateNumber(spelled);
    if (plate !== null) found.set(spelled, plate);
  }
  return [...found.values()];
}

/** The first of findPlateNumbers; null when there is none. */
export function findPlateNumber(text: string | Uint8Array): PlateNumber | null {
  return findPlateNumbers(text)[0] ?? null;
}

/** A whole number from 0 in Crockford's base 32, filled with zeros to `count` symbols. */
export function base32(value: number | bigint, count = 1): string {
  let rest = BigInt(value);
  let text = '';
  while (rest > 0n) {
    text = SYMBOLS.charAt(Number(rest % 32n)) + text;
    rest /= 32n;
  }
  return text.padStart(count, '0');
}

/** The proper spelling of base 32 as a person types it: O is 0, I and L are 1, case and hyphens do not count.
 *  Null when there is anything else. */
export function normalizeBase32(text: string): string | null {
  const proper = text.toUpperCase().replaceAll('-', '').replaceAll('O', '0').replace(/[IL]/g, '1');
  return /^[0-9A-HJKMNP-TV-Z]*$/.test(proper) ? proper : null;
}
