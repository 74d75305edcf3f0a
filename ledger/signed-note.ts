/** Signed notes and their keys, C2SP signed-note with Ed25519 (RFC 8032):
 *
 *      note = text, which ends in a line feed; an empty line; signature lines
 *      signature line = U+2014 " " key name " " base64(key id || signature) line feed
 *      key id = the first four bytes of SHA-256(key name || 0x0A || 0x01 || public key)
 *      verifier key = key name "+" 8 hexadecimal digits of the key id "+" base64(0x01 || public key)
 *
 *  Valid UTF-8, no control character but the line feed. The signature is over the text with its last line feed. A key
 *  name is not empty and has neither white space nor "+". Base64 is taken in its one proper spelling only, so that no
 *  bit of a note can change unseen. Signatures of other algorithms and of unknown keys are passed over. */

import { createPublicKey, hash, type KeyObject, sign, verify } from 'node:crypto';
import { badNote } from './problem.ts';

const ED25519 = 0x01;
const PUBLIC_BYTES = 32;
const SIGNATURE_BYTES = 64;
const ID_BYTES = 4;
/** The standard asks for 16 at least; more than this is no note of ours. */
const MOST_SIGNATURES = 100;
const UTF8 = new TextDecoder('utf-8', { fatal: true, ignoreBOM: true });
// RFC 8410 section 4: what stands before the 32 bytes of an Ed25519 public key in its DER form.
const DER_BEFORE_PUBLIC = Buffer.from('302a300506032b6570032100', 'hex');

export interface VerifierKey {
  readonly name: string;
  /** 8 hexadecimal digits. */
  readonly id: string;
  /** 32 bytes. */
  readonly publicKey: Buffer;
}

export interface SignatureLine {
  readonly name: string;
  readonly id: string;
  /** What follows the key id. */
  readonly signature: Buffer;
}

export interface Note {
  /** Ends in a line feed. */
  readonly text: string;
  readonly signatures: readonly SignatureLine[];
}

/** The verifier key of a public key under a name. @throws LedgerProblem 'bad-note' for a name that is none. */
export function verifierKey(name: string, publicKey: Buffer): VerifierKey {
  if (!isKeyName(name)) throw badNote(JSON.stringify(name), 'a key name without white space and "+"');
  if (publicKey.length !== PUBLIC_BYTES) throw badNote('a key', '32 bytes');
  return { name, id: keyId(name, publicKey), publicKey };
}

/** The text of a verifier key. */
export function formatVerifierKey({ name, id, publicKey }: VerifierKey): string {
  return `${name}+${id}+${Buffer.concat([Buffer.of(ED25519), publicKey]).toString('base64')}`;
}

/** The inverse of formatVerifierKey. @throws LedgerProblem 'bad-note' unless it is a key of Ed25519 in one spelling. */
export function parseVerifierKey(text: string): VerifierKey {
  const [, name = '', id, encoded = ''] = /^([^+]+)\+([0-9a-f]{8})\+([A-Za-z0-9+/=]+)$/.exec(text) ?? [];
  const bytes = properBase64(encoded);
  if (bytes?.length !== 1 + PUBLIC_BYTES || bytes[0] !== ED25519 || !isKeyName(name))
    throw badNote(JSON.stringify(text), 'an Ed25519 key as name+hash+base64');
  const key = verifierKey(name, bytes.subarray(1));
  if (key.id !== id) throw badNote(JSON.stringify(text), `the hash ${key.id} in the middle`);
  return key;
}

/** The bytes as text of a note, signed by one key. @param text  ends in a line feed */
export function signNote(text: string, name: string, privateKey: KeyObject): string {
  const key = verifierKey(name, publicBytes(privateKey));
  return addSignature(`${text}\n`, {
    name,
    id: key.id,
    signature: sign(null, Buffer.from(text), privateKey),
  });
}

/** A note with one more signature line at its end. */
export function addSignature(note: string, { name, id, signature }: SignatureLine): string {
  return `${note}— ${name} ${Buffer.concat([Buffer.from(id, 'hex'), signature]).toString('base64')}\n`;
}

/** The parts of a note. Nothing is verified. @throws LedgerProblem 'bad-note' when it is not in the form above. */
export function parseNote(bytes: Uint8Array): Note {
  const whole = decode(bytes);
  // The separator is the last empty line.
  const end = whole.lastIndexOf('\n\n');
  if (end < 0 || !whole.endsWith('\n')) throw badNote('a note', 'a text, an empty line and signatures');
  const lines = whole.slice(end + 2, -1).split('\n');
  if (end + 2 >= whole.length || lines.length > MOST_SIGNATURES)
    throw badNote('a note', `1 to ${MOST_SIGNATURES} signature lines after the last empty line`);
  return { text: whole.slice(0, end + 1), signatures: lines.map(parseSignature) };
}

/** The text of a note that a known key has signed, and by which keys.
 *  @throws LedgerProblem 'bad-note' when no known key has, or the signature of a known key is wrong. */
export function openNote(
  bytes: Uint8Array,
  known: readonly VerifierKey[],
): { text: string; by: VerifierKey[] } {
  const note = parseNote(bytes);
  const by: VerifierKey[] = [];
  for (const line of note.signatures) {
    const key = known.find(({ name, id }) => name === line.name && id === line.id);
    if (key === undefined) continue;
    if (!isSignature(note.text, line.signature, key.publicKey))
      throw badNote(`the signature of ${key.name}+${key.id}`, 'one of this text');
    by.push(key);
  }
  if (by.length === 0) throw badNote('a note', 'the signature of a known key');
  return { text: note.text, by };
}

/** Whether a signature is that of a text, or of bytes, by a public key of 32 bytes. */
export function isSignature(text: string | Uint8Array, signature: Buffer, publicKey: Buffer): boolean {
  if (signature.length !== SIGNATURE_BYTES || publicKey.length !== PUBLIC_BYTES) return false;
  try {
    const bytes = typeof text === 'string' ? Buffer.from(text) : text;
    return verify(null, bytes, keyObjectOf(publicKey), signature);
  } catch {
    // Bytes that are no point of the curve.
    return false;
  }
}

/** Keys that were used; a book has few, and making one takes as long as verifying with it. */
const keyObjects = new Map<string, KeyObject>();
const MOST_KEY_OBJECTS = 100;

function keyObjectOf(publicKey: Buffer): KeyObject {
  const at = publicKey.toString('hex');
  const known = keyObjects.get(at);
  if (known !== undefined) return known;
  const der = Buffer.concat([DER_BEFORE_PUBLIC, publicKey]);
  const made = createPublicKey({ key: der, format: 'der', type: 'spki' });
  if (keyObjects.size >= MOST_KEY_OBJECTS) keyObjects.clear();
  keyObjects.set(at, made);
  return made;
}

/** The 32 bytes of the public key that belongs to a private one, or of a public one. */
export function publicBytes(key: KeyObject): Buffer {
  const open = key.type === 'private' ? createPublicKey(key) : key;
  return open.export({ format: 'der', type: 'spki' }).subarray(-PUBLIC_BYTES);
}

/** A name as a key name: white space, "+" and "%" stand as %20, %2B, %25 and so on, of their UTF-8. */
export function keyNameOf(name: string): string {
  return name.replace(/[\s+%]/gu, (character) =>
    [...Buffer.from(character)]
      .map((byte) => `%${byte.toString(16).toUpperCase().padStart(2, '0')}`)
      .join(''),
  );
}

/** The inverse of keyNameOf; null for what it never writes. */
export function nameOfKeyName(keyName: string): string | null {
  try {
    const name = decodeURIComponent(keyName);
    return keyNameOf(name) === keyName ? name : null;
  } catch {
    return null;
  }
}

/** The bytes of base64 in its one proper spelling (RFC 4648 section 4); null for any other. */
export function properBase64(text: string): Buffer | null {
  const bytes = Buffer.from(text, 'base64');
  return bytes.toString('base64') === text ? bytes : null;
}

function decode(bytes: Uint8Array): string {
  let text: string;
  try {
    text = UTF8.decode(bytes);
  } catch {
    throw badNote('a note', 'valid UTF-8');
  }
  // biome-ignore lint/suspicious/noControlCharactersInRegex: the standard forbids exactly these.
  if (/[\u0000-\u0009\u000b-\u001f\u007f]/.test(text)) throw badNote('a note', 'no control characters');
  return text;
}

function parseSignature(line: string): SignatureLine {
  const [, name = '', encoded = ''] = /^— (\S+) ([A-Za-z0-9+/=]+)$/u.exec(line) ?? [];
  const bytes = properBase64(encoded);
  if (bytes === null || bytes.length <= ID_BYTES || !isKeyName(name))
    throw badNote(JSON.stringify(line), 'a signature line');
  return { name, id: bytes.subarray(0, ID_BYTES).toString('hex'), signature: bytes.subarray(ID_BYTES) };
}

function isKeyName(name: string): boolean {
  return name !== '' && name.isWellFormed() && !/[\s+]/u.test(name);
}

function keyId(name: string, publicKey: Buffer): string {
  const bytes = Buffer.concat([Buffer.from(`${name}\n`), Buffer.of(ED25519), publicKey]);
  return hash('sha256', bytes, 'hex').slice(0, 2 * ID_BYTES);
}
