/** The latest seal: how many entries the ledger has and the digest of the last, so that a changed or missing last line
 *  shows. One line of canonical JSON in `seals/latest.json`, replaced with every append:
 *
 *      {"book":"lantern","bytes":4711,"entries":12,"last":"3f9a…"}
 *
 *  `bytes` is the ledger's length with its last line feed: what lies beyond was never promised to anybody. Fields may
 *  be added (a tree's root, a signature), none is renamed. */

import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { canonicalJson, parseCanonical } from './canonical.ts';
import { DIGEST_OF_NOTHING, isDigest } from './digest.ts';
import { writeDurably } from './durable.ts';

export interface Seal {
  readonly book: string;
  readonly bytes: number;
  readonly entries: number;
  readonly last: string;
}

/** The seal of a book without entries. */
export function emptySeal(book: string): Seal {
  return { book, bytes: 0, entries: 0, last: DIGEST_OF_NOTHING };
}

/** The text of a seal, with its line feed. */
export function formatSeal({ book, bytes, entries, last }: Seal): string {
  return `${canonicalJson({ book, bytes, entries, last }, 'seal')}\n`;
}

/** The seal in bytes; null when they are none, in exactly one spelling. */
export function parseSeal(text: Uint8Array): Seal | null {
  if (text.at(-1) !== 0x0a) return null;
  try {
    const seal = parseCanonical(text.subarray(0, -1), 'seal');
    return isSeal(seal) ? seal : null;
  } catch {
    return null;
  }
}

/** The path of the latest seal. */
export function sealPath(directory: string): string {
  return join(directory, 'seals', 'latest.json');
}

/** The latest seal; 'missing' or 'unreadable' when there is none. Never waits: a seal is replaced in one step. */
export function readSeal(directory: string): Seal | 'missing' | 'unreadable' {
  let text: Buffer;
  try {
    text = readFileSync(sealPath(directory));
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code === 'ENOENT') return 'missing';
    throw error;
  }
  return parseSeal(text) ?? 'unreadable';
}

/** Replaces the latest seal. Only within a turn. Two syncs. */
export function writeSeal(directory: string, seal: Seal): void {
  writeDurably(sealPath(directory), join(directory, 'seals', 'new'), Buffer.from(formatSeal(seal)));
}

function isSeal(value: unknown): value is Seal {
  if (typeof value !== 'object' || value === null || Array.isArray(value)) return false;
  const { book, bytes, entries, last } = value as { [key: string]: unknown };
  return (
    typeof book === 'string' &&
    Number.isSafeInteger(bytes) &&
    (bytes as number) >= 0 &&
    Number.isSafeInteger(entries) &&
    (entries as number) >= 0 &&
    (entries === 0) === (bytes === 0) &&
    typeof last === 'string' &&
    isDigest(last)
  );
}
