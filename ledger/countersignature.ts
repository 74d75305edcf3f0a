/** Countersignatures: a second person's signature under an entry or under a seal.
 *
 *  Under a seal, the seal's own text is signed, so that the signature can be set under the note itself (C2SP
 *  signed-note). Under an entry, this text is, which can be no seal because its second line is no number:
 *
 *      lantern
 *      entry 12
 *      3f9a…                digest of the entry, 64 hexadecimal digits
 *
 *  each line with its line feed. The key's name is the signer's, as keyNameOf writes it. What a countersignature is
 *  worth depends on whose key it is: that is to be known from elsewhere. */

import type { KeyObject } from 'node:crypto';
import { sign } from 'node:crypto';
import type { Known } from './acceptance.ts';
import type { Book } from './book.ts';
import { isDigest } from './digest.ts';
import type { CountersignatureDraft, CountersignatureEntry, Person } from './entry.ts';
import { parseSealText, type Seal } from './seal.ts';
import {
  formatVerifierKey,
  isSignature,
  keyNameOf,
  parseVerifierKey,
  properBase64,
  publicBytes,
  verifierKey,
} from './signed-note.ts';

/** A countersignature under an entry. @param by  the signer, whose name the key gets */
export function signEntry(book: Book, entry: number, by: Person, key: KeyObject): CountersignatureDraft {
  return signed(book.name, entry, book.digestOf(entry), by, key);
}

/** A countersignature under a seal. */
export function signSealToo(
  { book, entries }: Seal,
  text: string,
  by: Person,
  key: KeyObject,
): CountersignatureDraft {
  return signed(book, entries, text, by, key);
}

/** Whether a countersignature is one by its key, whatever that is worth. */
export function isSigned({ signs, what, key, signature }: CountersignatureDraft, book: string): boolean {
  try {
    const bytes = properBase64(signature);
    return bytes !== null && isSignature(textOf(book, signs, what), bytes, parseVerifierKey(key).publicKey);
  } catch {
    return false;
  }
}

/** The countersignatures under the given entries, or under seals whose last entry they are, in order. */
export function countersignaturesOf(book: Book, entries: readonly number[]): CountersignatureEntry[] {
  const numbers = book.ask((index) =>
    index.all<{ entry: number }>(
      'SELECT entry FROM countersignatures WHERE signs IN (SELECT value FROM json_each(?)) ORDER BY entry',
      JSON.stringify(entries),
    ),
  );
  return numbers.map(({ entry }) => book.entry(entry) as CountersignatureEntry);
}

/** What does not hold about a countersignature, as the book knows what it signs. */
export function objectionsToSignature(draft: CountersignatureDraft, known: Known): string[] {
  const { signs, what } = draft;
  if (isDigest(what)) {
    const digest = known.entry(signs)?.digest;
    if (digest !== undefined && digest !== what)
      return [`entry ${signs} has the digest ${digest}, not ${what}`];
  } else {
    const seal = parseSealText(what);
    if (seal === null) return ['what is signed is neither a digest nor the text of a seal'];
    if (seal.book !== known.book) return [`the seal is of the book "${seal.book}", not "${known.book}"`];
    if (seal.entries !== signs) return [`the seal is of ${seal.entries} entries, not ${signs}`];
    const root = known.rootAt(seal.entries);
    if (root !== seal.root)
      return [`the seal of ${signs} entries says the root ${seal.root}, the tree has ${root}`];
  }
  return isSigned(draft, known.book) ? [] : ['the signature is not one of this text by this key'];
}

function signed(
  book: string,
  signs: number,
  what: string,
  by: Person,
  key: KeyObject,
): CountersignatureDraft {
  return {
    type: 'countersignature',
    signs,
    what,
    key: formatVerifierKey(verifierKey(keyNameOf(by.name), publicBytes(key))),
    signature: sign(null, Buffer.from(textOf(book, signs, what)), key).toString('base64'),
  };
}

function textOf(book: string, signs: number, what: string): string {
  return isDigest(what) ? `${keyNameOf(book)}\nentry ${signs}\n${what}\n` : what;
}
