/** Seals: signed tree heads. A seal is a C2SP checkpoint in a signed note (signed-note.ts): the book's name, the number
 *  of entries, the root of the tree over them in base64 (merkle.ts), and three extension lines:
 *
 *      lantern
 *      12
 *      XcnaeacGWamtVZy3Ad7ZoqudgjqtL0lgz+Nw7/RgQyg=
 *      bytes 4711
 *      last 3f9a…
 *      time 2026-01-02T03:04:05.678Z
 *
 *      — lantern R8HBsiYu…
 *
 *  `bytes` is the ledger's length with its last line feed: what lies beyond was never promised to anybody. `last` is the
 *  digest of the last line. The key's name is the checkpoint's origin: the book's name, with white space, "+" and "%"
 *  as keyNameOf writes them. More extension lines may follow in later versions, none changes its meaning.
 *
 *      seals/latest    replaced with every append
 *      seals/kept      those that were the latest when a run had ended: kept-seals.ts
 *      seals/keys      the keys that sign: seal-keys.ts
 *
 *  Books of the first version have seals/latest.json instead, one line of canonical JSON with book, bytes, entries and
 *  last, unsigned. They can be read; the first writer takes them up (recovery.ts). */

import type { KeyObject } from 'node:crypto';
import { existsSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { parseCanonical } from './canonical.ts';
import { DIGEST_OF_NOTHING, isDigest } from './digest.ts';
import { writeDurably } from './durable.ts';
import { EMPTY_ROOT, HASH_BYTES } from './merkle.ts';
import { keyNameOf, nameOfKeyName, parseNote, properBase64, signNote } from './signed-note.ts';
import { isTime } from './time.ts';

/** What a seal says. */
export interface SealFacts {
  readonly book: string;
  readonly bytes: number;
  readonly entries: number;
  readonly last: string;
  /** Of the tree, base64. */
  readonly root: string;
  readonly time: string;
}

export interface Seal extends SealFacts {
  /** The whole note with its signatures; null for a seal of the first version, which has neither root nor time. */
  readonly note: string | null;
}

/** The seal of a book without entries. */
export function emptySeal(book: string, time: string): SealFacts {
  return { book, bytes: 0, entries: 0, last: DIGEST_OF_NOTHING, root: EMPTY_ROOT.toString('base64'), time };
}

/** What is signed of a seal; ends in a line feed. */
export function formatSeal({ book, bytes, entries, last, root, time }: SealFacts): string {
  return `${keyNameOf(book)}\n${entries}\n${root}\nbytes ${bytes}\nlast ${last}\ntime ${time}\n`;
}

/** A seal as it stands in a file. */
export function signSeal(facts: SealFacts, privateKey: KeyObject): Seal {
  return { ...facts, note: signNote(formatSeal(facts), keyNameOf(facts.book), privateKey) };
}

/** The seal in a note; null when it is none, in exactly one spelling. The signature is not verified. */
export function parseSeal(note: Uint8Array): Seal | null {
  try {
    const facts = parseSealText(parseNote(note).text);
    return facts === null ? null : { ...facts, note: Buffer.from(note).toString('utf8') };
  } catch {
    return null;
  }
}

/** What the signed text of a seal says; the inverse of formatSeal. */
export function parseSealText(text: string): SealFacts | null {
  const [origin = '', size = '', root = '', ...extensions] = text.slice(0, -1).split('\n');
  const [bytes, last, time] = ['bytes', 'last', 'time'].map((name, i) =>
    extensions[i]?.startsWith(`${name} `) ? extensions[i].slice(name.length + 1) : '',
  ) as [string, string, string];
  const book = nameOfKeyName(origin);
  const facts = { book: book ?? '', bytes: Number(bytes), entries: Number(size), last, root, time };
  const sound =
    text.endsWith('\n') &&
    book !== null &&
    book !== '' &&
    isCount(size) &&
    isCount(bytes) &&
    (facts.entries === 0) === (facts.bytes === 0) &&
    isDigest(last) &&
    properBase64(root)?.length === HASH_BYTES &&
    isTime(time) &&
    extensions.every((line) => line !== '');
  return sound ? facts : null;
}

/** The path of the latest seal. */
export function sealPath(directory: string): string {
  return join(directory, 'seals', 'latest');
}

/** Where books of the first version have it. */
export function firstVersionPath(directory: string): string {
  return join(directory, 'seals', 'latest.json');
}

/** Whether there is a seal of any version. */
export function hasSeal(directory: string): boolean {
  return existsSync(sealPath(directory)) || existsSync(firstVersionPath(directory));
}

/** The latest seal; 'missing' or 'unreadable' when there is none. Never waits: a seal is replaced in one step. */
export function readSeal(directory: string): Seal | 'missing' | 'unreadable' {
  // A book that has keys has left the first version: what stands there then is no seal of it any more.
  if (existsSync(firstVersionPath(directory)) && !existsSync(join(directory, 'seals', 'keys'))) {
    const first = readIfThere(firstVersionPath(directory));
    if (first !== null) return parseFirstVersion(first) ?? 'unreadable';
  }
  const note = readIfThere(sealPath(directory));
  return note === null ? 'missing' : (parseSeal(note) ?? 'unreadable');
}

/** Replaces the latest seal. Only within a turn. Two syncs. */
export function writeSeal(directory: string, { note }: Seal): void {
  writeDurably(sealPath(directory), join(directory, 'seals', 'new'), Buffer.from(note ?? ''));
}

function readIfThere(path: string): Buffer | null {
  try {
    return readFileSync(path);
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code === 'ENOENT') return null;
    throw error;
  }
}

/** The checkpoint's numbers have no sign and no leading zeros. */
function isCount(text: string): boolean {
  return /^(0|[1-9]\d{0,15})$/.test(text) && Number.isSafeInteger(Number(text));
}

function parseFirstVersion(text: Buffer): Seal | null {
  if (text.at(-1) !== 0x0a) return null;
  try {
    const { book, bytes, entries, last } = parseCanonical(text.subarray(0, -1), 'seal') as Record<
      string,
      unknown
    >;
    const sound =
      typeof book === 'string' &&
      isCount(String(bytes)) &&
      isCount(String(entries)) &&
      (entries === 0) === (bytes === 0) &&
      typeof last === 'string' &&
      isDigest(last);
    if (!sound) return null;
    return { book, bytes: bytes as number, entries: entries as number, last, root: '', time: '', note: null };
  } catch {
    return null;
  }
}
