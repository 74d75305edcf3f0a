/** Signed notes and checkpoints against the examples of C2SP, and what must be refused. */

import { createPrivateKey } from 'node:crypto';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import {
  addSignature,
  formatVerifierKey,
  keyNameOf,
  nameOfKeyName,
  openNote,
  parseNote,
  parseVerifierKey,
  publicBytes,
  signNote,
  verifierKey,
} from '../../ledger/signed-note.ts';

// C2SP signed-note, the example of its section on verifier keys; key id and signature verified by another program.
const VKEY = 'example.com/foo+530d903a+AekyeRrm56hApGFkyQR4ZCbV54Id2LKaANYcrnKv3U2k';
const NOTE =
  'This is an example message.\n\n\u2014 example.com/foo Uw2QOkn8srV1yJGh2VYRlL1Tnagv1YEq6TfXppzi2ONncAlTgK7Ztg1ERYNZXsYjOBH3mFXmRKuwHjG1Yu72IneyaQM=\n';
// C2SP tlog-checkpoint: derived by the Python package `cryptography` from the seed of RFC 8032 section 7.1, TEST 1, and
// the root of the reference tree of eight leaves.
const SEED = '9d61b19deffd5a60ba844af492ec2cc44449c5697b326919703bac031cae7f60';
const LEDGER_VKEY = 'example.org/ledger+47c1c1b2+AddamAGCsQq31Uv+08lkBzoO4XLz2qYjJa8CGmj3B1Ea';
const CHECKPOINT = 'example.org/ledger\n8\nXcnaeacGWamtVZy3Ad7ZoqudgjqtL0lgz+Nw7/RgQyg=\n';
const SIGNED = `${CHECKPOINT}\n\u2014 example.org/ledger R8HBsiYuE6UlWIF+2S7uUM7NXrm4fFhFNeZjzlw2yO7sty38B2E3hd2qS/Q8bnPRGoKi3pSq0WQFw5CNdFyLzKBlewQ=\n`;

const key = createPrivateKey({
  key: Buffer.from(`302e020100300506032b657004220420${SEED}`, 'hex'),
  format: 'der',
  type: 'pkcs8',
});
const open = (note: string, ...keys: string[]) => openNote(Buffer.from(note), keys.map(parseVerifierKey));

describe('the example of the standard', () => {
  test('is opened by its key', () => {
    expect(open(NOTE, VKEY).text).toBe('This is an example message.\n');
    expect(open(NOTE, LEDGER_VKEY, VKEY).by.map(({ id }) => id)).toEqual(['530d903a']);
  });

  test('has a key that is read and written', () => {
    const { name, id, publicKey } = parseVerifierKey(VKEY);
    expect([name, id]).toEqual(['example.com/foo', '530d903a']);
    expect(verifierKey(name, publicKey).id).toBe(id);
    expect(formatVerifierKey(parseVerifierKey(VKEY))).toBe(VKEY);
  });

  test('is refused by every other key, and after any flipped bit', () => {
    expect(() => open(NOTE)).toThrow('expected the signature of a known key');
    expect(() => open(NOTE, LEDGER_VKEY)).toThrow('expected the signature of a known key');
    const bytes = Buffer.from(NOTE);
    for (let bit = 0; bit < 8 * bytes.length; bit += 1) {
      const flipped = Buffer.from(bytes);
      flipped[bit >> 3] = (flipped[bit >> 3] as number) ^ (1 << (bit & 7));
      expect(() => openNote(flipped, [parseVerifierKey(VKEY)]), `bit ${bit}`).toThrow();
    }
  });
});

describe('the derived checkpoint', () => {
  test('is signed byte for byte', () => {
    expect(formatVerifierKey(verifierKey('example.org/ledger', publicBytes(key)))).toBe(LEDGER_VKEY);
    expect(signNote(CHECKPOINT, 'example.org/ledger', key)).toBe(SIGNED);
    expect(open(SIGNED, LEDGER_VKEY).text).toBe(CHECKPOINT);
  });

  test('takes signatures of strangers, and of other algorithms, beside it', () => {
    const [line] = parseNote(Buffer.from(NOTE)).signatures;
    let many = SIGNED;
    for (let i = 0; i < 16; i += 1)
      many = addSignature(many, {
        ...(line as never as { name: string; id: string; signature: Buffer }),
        name: `stranger-${i}`,
        signature: Buffer.alloc(i + 1),
      });
    expect(open(many, LEDGER_VKEY).text).toBe(CHECKPOINT);
    expect(parseNote(Buffer.from(many)).signatures).toHaveLength(17);
  });

  test('is refused when a known key has a wrong signature, whatever else is right', () => {
    const wrong = addSignature(SIGNED, {
      name: 'example.com/foo',
      id: '530d903a',
      signature: Buffer.alloc(64),
    });
    expect(open(wrong, LEDGER_VKEY).text).toBe(CHECKPOINT);
    expect(() => open(wrong, LEDGER_VKEY, VKEY)).toThrow(
      'the signature of example.com/foo+530d903a: expected one of this text.',
    );
  });
});

test.each([
  ['no empty line', 'text\n\u2014 a AAAAAAA=\n'],
  ['no signature', 'text\n\n'],
  ['no last line feed', NOTE.slice(0, -1)],
  ['a hyphen for the dash', NOTE.replace('\u2014', '-')],
  ['two spaces', NOTE.replace('foo U', 'foo  U')],
  ['no key name', NOTE.replace(' example.com/foo', ' ')],
  ['a plus in the key name', NOTE.replace('com/foo', 'com+foo')],
  ['base64 without its end', NOTE.replace('=', '')],
  ['base64 with bits to spare', NOTE.replace('aQM=', 'aQN=')],
  ['a tabulator', NOTE.replace('an example', 'an\texample')],
  ['a carriage return', NOTE.replace('.\n', '.\r\n')],
  ['a text line after the signature', `${NOTE}more\n`],
  ['an id and nothing signed', 'text\n\n\u2014 a AAAAAA==\n'],
])('a note with %s is none', (_, note) => {
  expect(() => parseNote(Buffer.from(note))).toThrow();
});

test('a note of bytes that are not UTF-8 is none', () => {
  expect(() => parseNote(Buffer.concat([Buffer.of(0xff), Buffer.from(NOTE)]))).toThrow(
    'expected valid UTF-8',
  );
});

test('the last empty line is what separates', () => {
  const text = 'first\n\nsecond\n';
  expect(parseNote(Buffer.from(signNote(text, 'a', key))).text).toBe(text);
});

test.each([
  ['', 'name'],
  ['example.com/foo+530d903b+AekyeRrm56hApGFkyQR4ZCbV54Id2LKaANYcrnKv3U2k', 'another hash'],
  ['example.com/fop+530d903a+AekyeRrm56hApGFkyQR4ZCbV54Id2LKaANYcrnKv3U2k', 'another name'],
  ['example.com/foo+530D903A+AekyeRrm56hApGFkyQR4ZCbV54Id2LKaANYcrnKv3U2k', 'capital digits'],
  ['example.com/foo+530d903a+AukyeRrm56hApGFkyQR4ZCbV54Id2LKaANYcrnKv3U2k', 'another algorithm'],
  ['example.com/foo+530d903a+AekyeRrm56hApGFkyQR4ZCbV54Id2LKaANYcrnKv3Q==', 'a short key'],
  ['example.com foo+530d903a+AekyeRrm56hApGFkyQR4ZCbV54Id2LKaANYcrnKv3U2k', 'a space'],
])('%j is no verifier key: %s', (text) => {
  expect(() => parseVerifierKey(text)).toThrow();
});

test('names become key names and come back', () => {
  expect(keyNameOf('lantern, upper + lower 50%')).toBe('lantern,%20upper%20%2B%20lower%2050%25');
  expect(keyNameOf('a\u3000b')).toBe('a%E3%80%80b');
  expect(nameOfKeyName('a%2520b')).toBe('a%20b');
  for (const other of ['a b', 'a%2fb', 'a%20', '%zz', '%41', 'a+b']) {
    const name = nameOfKeyName(other);
    expect(name === null || keyNameOf(name) === other, other).toBe(true);
  }
  expect(nameOfKeyName('%41')).toBeNull();
  expect(nameOfKeyName('%zz')).toBeNull();
  fc.assert(
    fc.property(fc.string({ unit: 'grapheme', minLength: 1 }), (name) => {
      expect(keyNameOf(name)).not.toMatch(/[\s+]/u);
      expect(nameOfKeyName(keyNameOf(name))).toBe(name);
    }),
  );
});

test('any text comes back from a signed note', () => {
  const line = fc.string({ unit: 'grapheme' }).map((text) => text.replace(/\p{Cc}/gu, ''));
  fc.assert(
    fc.property(fc.array(line, { minLength: 1, maxLength: 5 }), (lines) => {
      const text = `${lines.join('\n')}\n`;
      const note = Buffer.from(signNote(text, 'example.org/ledger', key));
      expect(openNote(note, [parseVerifierKey(LEDGER_VKEY)]).text).toBe(text);
    }),
    { numRuns: 30 },
  );
});
