/** Digests: SHA-256 (FIPS 180-4) in lower-case hexadecimal. The runtime's own; measured here about four times as fast
 *  as WebAssembly, and a test holds the two against each other. */

import { createHash, hash } from 'node:crypto';
import { closeSync, openSync, readSync } from 'node:fs';
import type { StoredFile } from './entry.ts';

const BLOCK = 1 << 20;
const DIGITS = 64;

/** The digest of no bytes: what the first entry has before it. */
export const DIGEST_OF_NOTHING = 'e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855';

/** The digest of bytes, or of a text's UTF-8. */
export function sha256(data: Uint8Array | string): string {
  return hash('sha256', data, 'hex');
}

/** The digest of a file's bytes, read in blocks of 1 MB. @throws the file system's error. */
export function sha256File(path: string): string {
  const descriptor = openSync(path, 'r');
  try {
    return digestOfDescriptor(descriptor).digest;
  } finally {
    closeSync(descriptor);
  }
}

/** Digest and size of an open file, from its beginning to its end, wherever its position stands. */
export function digestOfDescriptor(descriptor: number): StoredFile {
  const sum = createHash('sha256');
  const block = Buffer.allocUnsafe(BLOCK);
  let bytes = 0;
  for (;;) {
    const count = readSync(descriptor, block, 0, BLOCK, bytes);
    if (count === 0) return { digest: sum.digest('hex'), bytes };
    sum.update(block.subarray(0, count));
    bytes += count;
  }
}

/** Whether a text is a whole digest. */
export function isDigest(text: string): boolean {
  // In this form twice as fast as a regular expression; a long ledger asks ten million times.
  for (let i = 0; i < text.length; i += 1) {
    const code = text.charCodeAt(i);
    if (!((code >= 0x30 && code <= 0x39) || (code >= 0x61 && code <= 0x66))) return false;
  }
  return text.length === DIGITS;
}
