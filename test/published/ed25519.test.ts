/** Signatures of Ed25519 against RFC 8032 section 7.1, as the ledger makes and verifies them. */

import { createPrivateKey, sign } from 'node:crypto';
import { describe, expect, test } from 'vitest';
import { isSignature, publicBytes } from '../../ledger/signed-note.ts';

// RFC 8032 section 7.1, TEST 1 to 3: seed, public key, message, signature. The Python package `cryptography` derives
// public key and signature identically from each seed.
const TESTS = [
  {
    seed: '9d61b19deffd5a60ba844af492ec2cc44449c5697b326919703bac031cae7f60',
    publicKey: 'd75a980182b10ab7d54bfed3c964073a0ee172f3daa62325af021a68f707511a',
    message: '',
    signature:
      'e5564300c360ac729086e2cc806e828a84877f1eb8e5d974d873e065224901555fb8821590a33bacc61e39701cf9b46bd25bf5f0595bbe24655141438e7a100b',
  },
  {
    seed: '4ccd089b28ff96da9db6c346ec114e0f5b8a319f35aba624da8cf6ed4fb8a6fb',
    publicKey: '3d4017c3e843895a92b70aa74d1b7ebc9c982ccf2ec4968cc0cd55f12af4660c',
    message: '72',
    signature:
      '92a009a9f0d4cab8720e820b5f642540a2b27b5416503f8fb3762223ebdb69da085ac1e43e15996e458f3613d0f11d8c387b2eaeb4302aeeb00d291612bb0c00',
  },
  {
    seed: 'c5aa8df43f9f837bedb7442f31dcb7b166d38535076f094b85ce3a2e0b4458f7',
    publicKey: 'fc51cd8e6218a1a38da47ed00230f0580816ed13ba3303ac5deb911548908025',
    message: 'af82',
    signature:
      '6291d657deec24024827e69c3abe01a30ce548a284743a445e3680d7db5ac3ac18ff9b538d16f290ae67f760984dc6594a7c15e9716ed28dc027beceea1ec40a',
  },
];

const bytes = (text: string) => Buffer.from(text, 'hex');
// RFC 8410 section 7.
const keyOf = (seed: string) =>
  createPrivateKey({ key: bytes(`302e020100300506032b657004220420${seed}`), format: 'der', type: 'pkcs8' });
describe.each(TESTS)('RFC 8032, public key %#', ({ seed, publicKey, message, signature }) => {
  test('is derived from the seed', () => {
    expect(publicBytes(keyOf(seed)).toString('hex')).toBe(publicKey);
  });

  test('signs the message', () => {
    expect(sign(null, bytes(message), keyOf(seed)).toString('hex')).toBe(signature);
  });

  test('verifies, and nothing that differs in a bit', () => {
    expect(isSignature(bytes(message), bytes(signature), bytes(publicKey))).toBe(true);
    for (let bit = 0; bit < 8 * 64; bit += 1) {
      const flipped = bytes(signature);
      flipped[bit >> 3] = (flipped[bit >> 3] as number) ^ (1 << (bit & 7));
      expect(isSignature(bytes(message), flipped, bytes(publicKey)), `bit ${bit}`).toBe(false);
    }
    for (let byte = 0; byte < 32; byte += 1) {
      const flipped = bytes(publicKey);
      flipped[byte] = (flipped[byte] as number) ^ 1;
      expect(isSignature(bytes(message), bytes(signature), flipped), `byte ${byte} of the key`).toBe(false);
    }
    expect(
      isSignature(Buffer.concat([bytes(message), Buffer.of(1)]), bytes(signature), bytes(publicKey)),
    ).toBe(false);
    expect(isSignature(bytes(message), bytes(signature).subarray(1), bytes(publicKey))).toBe(false);
    expect(isSignature(bytes(message), bytes(signature), bytes(publicKey).subarray(1))).toBe(false);
  });
});

test('the order of the group may not be added to the second half of a signature', () => {
  // RFC 8032 section 5.1.7: S must lie below L = 2^252 + 27742317777372353535851937790883648493.
  const { message, signature, publicKey } = TESTS[0] as (typeof TESTS)[0];
  const order = 2n ** 252n + 27742317777372353535851937790883648493n;
  const half = bytes(signature).subarray(32).reverse();
  const larger = (BigInt(`0x${half.toString('hex')}`) + order).toString(16).padStart(64, '0');
  const forged = Buffer.concat([bytes(signature).subarray(0, 32), bytes(larger).reverse()]);
  expect(isSignature(bytes(message), forged, bytes(publicKey))).toBe(false);
});
