/** The keys whose seals a book takes: `seals/keys`, one verifier key a line (signed-note.ts), oldest first, under the
 *  book's name. A person who writes in a book for the first time brings a key: it is added, and that is announced. So a
 *  book may go to another machine, to another person, or outlive a lost key, without a seal losing its worth.
 *
 *  What this does not do: it does not say which keys deserve trust. Who can write the book's files can add a key and
 *  seal anew. So a key, or a seal, is to be had from elsewhere too: printed in a paper, or countersigned (see
 *  countersignature.ts); a proof names the key that it rests on. */

import type { KeyObject } from 'node:crypto';
import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import type { Announce } from './book.ts';
import { writeDurably } from './durable.ts';
import type { Seal } from './seal.ts';
import {
  formatVerifierKey,
  keyNameOf,
  openNote,
  parseVerifierKey,
  publicBytes,
  type VerifierKey,
  verifierKey,
} from './signed-note.ts';

/** The path of the keys. */
export function keysPath(directory: string): string {
  return join(directory, 'seals', 'keys');
}

/** The keys of a book; none when there is no file. @throws LedgerProblem 'bad-note' for a line that is no key. */
export function readKeys(directory: string): VerifierKey[] {
  let text: string;
  try {
    text = readFileSync(keysPath(directory), 'utf8');
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code === 'ENOENT') return [];
    throw error;
  }
  return parseKeys(text);
}

/** The keys in a text, one a line. @throws LedgerProblem 'bad-note'. */
export function parseKeys(text: string): VerifierKey[] {
  const lines = text.split('\n');
  // The last line ends too.
  if (lines.pop() !== '') return [parseVerifierKey(text)];
  return lines.map(parseVerifierKey);
}

/** Sees to it that a private key's public half is among the book's. Only within a turn. */
export function addKey(directory: string, book: string, privateKey: KeyObject, announce: Announce): void {
  const own = verifierKey(keyNameOf(book), publicBytes(privateKey));
  const keys = readKeys(directory);
  if (
    keys.some(
      ({ id, name, publicKey }) => id === own.id && name === own.name && publicKey.equals(own.publicKey),
    )
  )
    return;
  const text = [...keys, own].map((key) => `${formatVerifierKey(key)}\n`).join('');
  writeDurably(keysPath(directory), join(directory, 'seals', 'keys.new'), Buffer.from(text));
  if (keys.length > 0) {
    announce(
      `The book was sealed with ${keys.length === 1 ? 'another key' : `${keys.length} other keys`} so far; ` +
        `${formatVerifierKey(own)} joins the keys in seals/keys.`,
      'key',
    );
  }
}

/** What is wrong with a seal's signature, as the end of a sentence; null when a key of the book has signed it. */
export function signatureFault({ note, book }: Seal, keys: readonly VerifierKey[]): string | null {
  if (note === null) return null;
  try {
    const known = keys.filter(({ name }) => name === keyNameOf(book));
    openNote(Buffer.from(note), known);
    return null;
  } catch (error) {
    return (error as Error).message.replace(/\.$/, '');
  }
}

/** The key of the book that signed a seal. @throws LedgerProblem 'bad-note' when none has. */
export function signerOf({ note }: Seal, keys: readonly VerifierKey[]): VerifierKey {
  return openNote(Buffer.from(note ?? ''), keys).by[0] as VerifierKey;
}
