/** The symbols of plate numbers against Crockford's base 32. */

import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import {
  base32,
  checkSymbols,
  findPlateNumber,
  findPlateNumbers,
  formatPlateNumber,
  normalizeBase32,
  parsePlateNumber,
  plateNumber,
  plateNumbersOf,
} from '../../ledger/plate-number.ts';

// Source: D. Crockford, "Base 32"; 1234 is its widely published example. Others computed outside from the alphabet.
const EXAMPLES: readonly (readonly [bigint, string])[] = [
  [0n, '0'],
  [1n, '1'],
  [31n, 'Z'],
  [32n, '10'],
  [36n, '14'],
  [37n, '15'],
  [1234n, '16J'],
  [1337n, '19S'],
  [65535n, '1ZZZ'],
  [1023n, 'ZZ'],
  [1099511640121n, '100000C1S'],
  [9223372036854775807n, '7ZZZZZZZZZZZZ'],
];
const ALPHABET = '0123456789ABCDEFGHJKMNPQRSTVWXYZ';

describe('base 32', () => {
  test.each(EXAMPLES)('writes %d as %s', (value, code) => {
    expect(base32(value)).toBe(code);
  });

  test('has the published alphabet', () => {
    expect([...ALPHABET].map((_, i) => base32(i)).join('')).toBe(ALPHABET);
  });

  // Source: the same note: O is 0, I and L are 1, case and hyphens do not count; U is left out.
  test.each([
    ['oO', '00'],
    ['iIlL', '1111'],
    ['16j', '16J'],
    ['1-6-j', '16J'],
  ])('reads %s as %s', (typed, proper) => {
    expect(normalizeBase32(typed)).toBe(proper);
  });

  test.each(['U', 'u', '16J*', ' ', 'é'])('does not read %j', (typed) => {
    expect(normalizeBase32(typed)).toBeNull();
  });
});

describe('plate numbers', () => {
  // 30 bits of 1s, then 0s: six times the last symbol. By hand from the alphabet: 0x08421084 is 00001 six times and 00.
  test.each([
    ['fffffffc', 'ZZZZZZ'],
    ['ffffffff', 'ZZZZZZ'],
    ['00000003', '000000'],
    ['00000004', '000001'],
    ['08421084', '111111'],
    ['80000000', 'G00000'],
  ])('take the first 30 bits of %s', (beginning, symbols) => {
    expect(checkSymbols(beginning.padEnd(64, 'a'))).toBe(symbols);
  });

  test('are read back', () => {
    const letters = fc.constantFrom('', ...'abcdefghijklmnopqrstuvwxyz');
    const digests = fc.array(fc.constantFrom(...'0123456789abcdef'), { minLength: 64, maxLength: 64 });
    fc.assert(
      fc.property(fc.integer({ min: 1, max: 1e9 }), letters, digests, (entry, letter, digits) => {
        const text = plateNumber(entry, letter, digits.join(''));
        const plate = parsePlateNumber(text);
        expect(plate).toEqual({ entry, letter, check: text.slice(-6) });
        expect(plate && formatPlateNumber(plate)).toBe(text);
        expect(parsePlateNumber(text.toLowerCase())).toEqual(plate);
        expect(findPlateNumber(`see plate ${text}, above`)).toEqual(plate);
        expect(findPlateNumber(Buffer.from(`\0\xff${text}\0`, 'latin1'))).toEqual(plate);
      }),
    );
  });

  test('are read as a person may type them', () => {
    expect(parsePlateNumber(' 57B-k3q9m2 ')).toEqual({ entry: 57, letter: 'b', check: 'K3Q9M2' });
    expect(parsePlateNumber('57-KoQiLl')).toEqual({ entry: 57, letter: '', check: 'K0Q111' });
  });

  test.each([
    '',
    '57',
    '57-',
    '57b-K3Q9M',
    '57b-K3Q9M22',
    '057-K3Q9M2',
    '0-K3Q9M2',
    '57bb-K3Q9M2',
    '57-K3Q9MU',
    '57 K3Q9M2',
    '-K3Q9M2',
  ])('are not read from %j', (text) => expect(parsePlateNumber(text)).toBeNull());

  test('are found in free text, each once, and only in their proper spelling', () => {
    const text = 'ring-57b-K3Q9M2.png, 8-ZZZZZZ and 8-ZZZZZZ; not 8-zzzzzz, x8-ZZZZZZ, 8-ZZZZZZZ or 8-UUUUUU';
    expect(findPlateNumbers(text).map(formatPlateNumber)).toEqual(['57b-K3Q9M2', '8-ZZZZZZ']);
    expect(findPlateNumber('nothing')).toBeNull();
  });

  test('have letters by the order of the outputs when an entry drew several figures', () => {
    const file = { digest: 'ab'.repeat(32), bytes: 1 };
    const svg = { ...file, format: 'svg' };
    const digest = 'f'.repeat(64);
    expect([
      ...plateNumbersOf(57, digest, { scree: svg, image: svg, table: { ...file, format: 'json' } }),
    ]).toEqual([
      ['image', '57a-ZZZZZZ'],
      ['scree', '57b-ZZZZZZ'],
    ]);
    expect([...plateNumbersOf(57, digest, { image: svg })]).toEqual([['image', '57-ZZZZZZ']]);
    const many = Object.fromEntries(Array.from({ length: 27 }, (_, i) => [`figure-${i}`, svg]));
    expect(() => plateNumbersOf(57, digest, many)).toThrow('Entry 57 drew more than 26 figures.');
  });
});
