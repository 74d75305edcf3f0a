/** Digests against the example values of SHA-256, and against another implementation. */

import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import fc from 'fast-check';
import { sha256 as wasmSha256 } from 'hash-wasm';
import { expect, test } from 'vitest';
import { DIGEST_OF_NOTHING, isDigest, sha256, sha256File } from '../../ledger/digest.ts';

// Source: FIPS 180-4; NIST's example values for SHA-256.
const EXAMPLES = [
  ['', 'e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855'],
  ['abc', 'ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad'],
  [
    'abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq',
    '248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1',
  ],
  [
    'abcdefghbcdefghicdefghijdefghijkefghijklfghijklmghijklmnhijklmnoijklmnopjklmnopqklmnopqrlmnopqrsmnopqrstnopqrstu',
    'cf5b16a778af8380036ce59e7b0492370b249b11e8f07a51afac45037afee9d1',
  ],
] as const;
const MILLION = 'cdc76e5c9914fb9281a1c7e284d73e67f1809a48a497200e046d39ccc7112cd0';

test.each(EXAMPLES)('gives the published digest of %j', (text, digest) => {
  expect(sha256(text)).toBe(digest);
  expect(sha256(Buffer.from(text))).toBe(digest);
});

test('gives the published digest of a million times "a"', () => {
  expect(sha256('a'.repeat(1_000_000))).toBe(MILLION);
});

test('digests a file in blocks as it does bytes at once', () => {
  const directory = mkdtempSync(join(tmpdir(), 'platebook-digest-'));
  try {
    const path = join(directory, 'file');
    writeFileSync(path, 'a'.repeat(1_000_000));
    expect(sha256File(path)).toBe(MILLION);
    // Around the size of a block.
    for (const size of [0, (1 << 20) - 1, 1 << 20, (1 << 20) + 1, 3 << 20]) {
      const bytes = Buffer.alloc(size, 'block by block');
      writeFileSync(path, bytes);
      expect(sha256File(path)).toBe(sha256(bytes));
    }
  } finally {
    rmSync(directory, { recursive: true });
  }
});

test('agrees with the WebAssembly implementation, which pages use', async () => {
  await fc.assert(
    fc.asyncProperty(fc.uint8Array({ maxLength: 4096 }), async (bytes) => {
      expect(sha256(bytes)).toBe(await wasmSha256(bytes));
    }),
  );
});

test('knows a digest when it sees one', () => {
  expect(DIGEST_OF_NOTHING).toBe(EXAMPLES[0][1]);
  expect(isDigest(DIGEST_OF_NOTHING)).toBe(true);
  for (const other of [
    '',
    'ABC',
    DIGEST_OF_NOTHING.toUpperCase(),
    `${DIGEST_OF_NOTHING}0`,
    `${DIGEST_OF_NOTHING}\n`,
  ]) {
    expect(isDigest(other)).toBe(false);
  }
});
