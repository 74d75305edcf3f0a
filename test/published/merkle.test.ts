/** The tree of RFC 9162 section 2.1 against published values, and its proofs against everything that is none. */

import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import {
  checkConsistency,
  checkInclusion,
  consistencyPath,
  EMPTY_ROOT,
  growPeaks,
  inclusionPath,
  leafHash,
  type NodeReader,
  nodeHash,
  rootAt,
  rootOfPeaks,
} from '../../ledger/merkle.ts';

// The reference test tree of RFC 6962 (log reference implementations): leaves, roots of sizes 0 to 8, and all inclusion
// and consistency proofs. Roots recomputed from the recursive definition by an independent program.
const LEAVES = [
  '',
  '00',
  '10',
  '2021',
  '3031',
  '40414243',
  '5051525354555657',
  '606162636465666768696a6b6c6d6e6f',
];
const ROOTS = [
  'e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855',
  '6e340b9cffb37a989ca544e6bb780a2c78901d3fb33738768511a30617afa01d',
  'fac54203e7cc696cf0dfcb42c92a1d9dbaf70ad9e621f4bd8d98662f00e3c125',
  'aeb6bcfe274b70a14fb067a5e5578264db0fa9b51af5e0ba159158f329e06e77',
  'd37ee418976dd95753c1c73862b9398fa2a2cf9b4ff0fdfe8b30cd95209614b7',
  '4e3bbb1f7b478dcfe71fb631631519a3bca12c9aefca1612bfce4c13a86264d4',
  '76e67dadbcdf1e10e1b74ddc608abd2f98dfb16fbce75277b5232a127f2087ef',
  'ddb89be403809e325750d3d263cd78929c2942b7942a34b77e122c9594a74c8c',
  '5dc9da79a70659a9ad559cb701ded9a2ab9d823aad2f4960cfe370eff4604328',
];

// The hashes that occur in the proofs; the proofs name them by their first eight digits.
const HASHES = `
0298d122906dcfc10892cb53a73992fc5b9f493ea4c9badb27b791b4127a7fe7
07506a85fd9dd2f120eb694f86011e5bb4662e5c415a62917033d4a9624487e7
0ebc5d3437fbe2db158b9f126a1d118e308181031d0a949f8dededebc558ef6a
4271a26be0d8a84f0bd54c8c302e7cb3a3b5d1fa6780a40bcce2873477dab658
46f6ffadd3d06a09ff3c5860d2755c8b9819db7df44251788c7d8e3180de8eb1
5f083f0a1a33ca076a95279832580db3e0ef4584bdff1f54c8a360f50de3031e
6b47aaf29ee3c2af9af889bc1fb9254dabd31177f16232dd6aab035ca39bf6e4
6e340b9cffb37a989ca544e6bb780a2c78901d3fb33738768511a30617afa01d
837dbb152e9b079010717e84e865da4ebc0fa198a806d59d31bf15accef22d0e
96a296d224f285c67bee93c30f8a309157f0daa35dc5b87e410b78630a09cfc7
b08693ec2e721597130641e8211e7eedccb4c26413963eee6c1e2ed16ffb1a5f
bc1a0643b12e4d2d7c77918f44e0f4f79a838b6cf9ec5b5c283e1f4d88599e6b
ca854ea128ed050b41b35ffc1b87b8eb2bde461e9e3b5596ece6b9d5975a0ae0
d37ee418976dd95753c1c73862b9398fa2a2cf9b4ff0fdfe8b30cd95209614b7
fac54203e7cc696cf0dfcb42c92a1d9dbaf70ad9e621f4bd8d98662f00e3c125
`;
/** index/size */
const INCLUSION: Readonly<Record<string, string>> = {
  '0/1': '',
  '0/2': '96a296d2',
  '1/2': '6e340b9c',
  '0/3': '96a296d2 0298d122',
  '1/3': '6e340b9c 0298d122',
  '2/3': 'fac54203',
  '0/4': '96a296d2 5f083f0a',
  '1/4': '6e340b9c 5f083f0a',
  '2/4': '07506a85 fac54203',
  '3/4': '0298d122 fac54203',
  '0/5': '96a296d2 5f083f0a bc1a0643',
  '1/5': '6e340b9c 5f083f0a bc1a0643',
  '2/5': '07506a85 fac54203 bc1a0643',
  '3/5': '0298d122 fac54203 bc1a0643',
  '4/5': 'd37ee418',
  '0/6': '96a296d2 5f083f0a 0ebc5d34',
  '1/6': '6e340b9c 5f083f0a 0ebc5d34',
  '2/6': '07506a85 fac54203 0ebc5d34',
  '3/6': '0298d122 fac54203 0ebc5d34',
  '4/6': '4271a26b d37ee418',
  '5/6': 'bc1a0643 d37ee418',
  '0/7': '96a296d2 5f083f0a 837dbb15',
  '1/7': '6e340b9c 5f083f0a 837dbb15',
  '2/7': '07506a85 fac54203 837dbb15',
  '3/7': '0298d122 fac54203 837dbb15',
  '4/7': '4271a26b b08693ec d37ee418',
  '5/7': 'bc1a0643 b08693ec d37ee418',
  '6/7': '0ebc5d34 d37ee418',
  '0/8': '96a296d2 5f083f0a 6b47aaf2',
  '1/8': '6e340b9c 5f083f0a 6b47aaf2',
  '2/8': '07506a85 fac54203 6b47aaf2',
  '3/8': '0298d122 fac54203 6b47aaf2',
  '4/8': '4271a26b ca854ea1 d37ee418',
  '5/8': 'bc1a0643 ca854ea1 d37ee418',
  '6/8': '46f6ffad 0ebc5d34 d37ee418',
  '7/8': 'b08693ec 0ebc5d34 d37ee418',
};
/** first->second */
const CONSISTENCY: Readonly<Record<string, string>> = {
  '1->1': '',
  '1->2': '96a296d2',
  '2->2': '',
  '1->3': '96a296d2 0298d122',
  '2->3': '0298d122',
  '3->3': '',
  '1->4': '96a296d2 5f083f0a',
  '2->4': '5f083f0a',
  '3->4': '0298d122 07506a85 fac54203',
  '4->4': '',
  '1->5': '96a296d2 5f083f0a bc1a0643',
  '2->5': '5f083f0a bc1a0643',
  '3->5': '0298d122 07506a85 fac54203 bc1a0643',
  '4->5': 'bc1a0643',
  '5->5': '',
  '1->6': '96a296d2 5f083f0a 0ebc5d34',
  '2->6': '5f083f0a 0ebc5d34',
  '3->6': '0298d122 07506a85 fac54203 0ebc5d34',
  '4->6': '0ebc5d34',
  '5->6': 'bc1a0643 4271a26b d37ee418',
  '6->6': '',
  '1->7': '96a296d2 5f083f0a 837dbb15',
  '2->7': '5f083f0a 837dbb15',
  '3->7': '0298d122 07506a85 fac54203 837dbb15',
  '4->7': '837dbb15',
  '5->7': 'bc1a0643 4271a26b b08693ec d37ee418',
  '6->7': '0ebc5d34 b08693ec d37ee418',
  '7->7': '',
  '1->8': '96a296d2 5f083f0a 6b47aaf2',
  '2->8': '5f083f0a 6b47aaf2',
  '3->8': '0298d122 07506a85 fac54203 6b47aaf2',
  '4->8': '6b47aaf2',
  '5->8': 'bc1a0643 4271a26b ca854ea1 d37ee418',
  '6->8': '0ebc5d34 ca854ea1 d37ee418',
  '7->8': 'b08693ec 46f6ffad 0ebc5d34 d37ee418',
  '8->8': '',
};

const hex = (hash: Buffer) => hash.toString('hex');
const bytes = (text: string) => Buffer.from(text, 'hex');
const known = new Map(
  HASHES.trim()
    .split('\n')
    .map((hash) => [hash.slice(0, 8), hash]),
);
const pathOf = (names: string) =>
  names === '' ? [] : names.split(' ').map((name) => bytes(known.get(name) ?? ''));
const published = (proofs: Readonly<Record<string, string>>) =>
  Object.entries(proofs).map(([name, path]) => {
    const [a, b] = name.split(/\/|->/).map(Number) as [number, number];
    return { name, a, b, path: pathOf(path) };
  });
const root = (size: number) => bytes(ROOTS[size] ?? '');

/** The definition, RFC 9162 section 2.1.1, as it is written there. */
function definition(leaves: readonly Buffer[]): Buffer {
  if (leaves.length === 0) return EMPTY_ROOT;
  if (leaves.length === 1) return leafHash(leaves[0] as Buffer);
  let k = 1;
  while (k * 2 < leaves.length) k *= 2;
  return nodeHash(definition(leaves.slice(0, k)), definition(leaves.slice(k)));
}

/** Whole nodes by the definition. */
function readerOver(leaves: readonly Buffer[]): NodeReader {
  return (level, index) => definition(leaves.slice(index * 2 ** level, (index + 1) * 2 ** level));
}

const leaves = LEAVES.map((leaf) => bytes(leaf));
const read = readerOver(leaves);

describe('the reference tree', () => {
  test('has the published roots', () => {
    const peaks: Buffer[] = [];
    expect(hex(EMPTY_ROOT)).toBe(ROOTS[0]);
    for (const [size, leaf] of leaves.entries()) {
      growPeaks(peaks, size, leafHash(leaf));
      expect(hex(rootOfPeaks(peaks))).toBe(ROOTS[size + 1]);
      expect(hex(rootAt(read, size + 1))).toBe(ROOTS[size + 1]);
    }
  });

  test('tells an empty leaf from an empty tree', () => {
    // RFC 9162 section 2.1.1: the prefixes 0x00 and 0x01.
    expect(hex(leafHash(Buffer.alloc(0)))).toBe(
      '6e340b9cffb37a989ca544e6bb780a2c78901d3fb33738768511a30617afa01d',
    );
    expect(hex(leafHash(Buffer.alloc(0)))).not.toBe(hex(EMPTY_ROOT));
  });

  test('has the published proofs', () => {
    expect(published(INCLUSION)).toHaveLength(36);
    for (const { name, a, b, path } of published(INCLUSION))
      expect([name, inclusionPath(read, a, b).map(hex)]).toEqual([name, path.map(hex)]);
    expect(published(CONSISTENCY)).toHaveLength(36);
    for (const { name, a, b, path } of published(CONSISTENCY))
      expect([name, consistencyPath(read, a, b).map(hex)]).toEqual([name, path.map(hex)]);
  });

  test('is what the seven leaves of the RFC show', () => {
    // RFC 9162 section 2.1.5 (RFC 6962 section 2.1.3), with its letters.
    const seven = readerOver(Array.from({ length: 7 }, (_, i) => Buffer.of(i)));
    const [a, b, c, d, e, f, j] = Array.from({ length: 7 }, (_, i) => seven(0, i)) as [
      Buffer,
      Buffer,
      Buffer,
      Buffer,
      Buffer,
      Buffer,
      Buffer,
    ];
    const [g, h, i] = [nodeHash(a, b), nodeHash(c, d), nodeHash(e, f)];
    const [k, l] = [nodeHash(g, h), nodeHash(i, j)];
    expect(inclusionPath(seven, 0, 7)).toEqual([b, h, l]);
    expect(inclusionPath(seven, 3, 7)).toEqual([c, g, l]);
    expect(inclusionPath(seven, 4, 7)).toEqual([f, j, k]);
    expect(inclusionPath(seven, 6, 7)).toEqual([i, k]);
    expect(consistencyPath(seven, 3, 7)).toEqual([c, d, g, l]);
    expect(consistencyPath(seven, 4, 7)).toEqual([l]);
    expect(consistencyPath(seven, 6, 7)).toEqual([i, j, k]);
  });
});

/** Every way in which a path may be spoiled: a bit of each hash, a hash less, a hash more. */
function* spoiled(path: readonly Buffer[]): Generator<Buffer[]> {
  for (const [i, hash] of path.entries()) {
    const flipped = Buffer.from(hash);
    flipped[i % 32] = (flipped[i % 32] as number) ^ (1 << (i % 8));
    yield path.map((each, k) => (k === i ? flipped : each));
    yield path.map((each, k) => (k === i ? each.subarray(1) : each));
  }
  if (path.length > 0) yield path.slice(0, -1);
  yield [...path, root(8)];
}

describe('a proof', () => {
  test('of inclusion holds, and no spoiled one does', () => {
    for (const { a, b, path } of published(INCLUSION)) {
      const leaf = leafHash(leaves[a] as Buffer);
      expect(checkInclusion(leaf, a, b, path, root(b))).toBe(true);
      for (const wrong of spoiled(path)) expect(checkInclusion(leaf, a, b, wrong, root(b))).toBe(false);
      expect(checkInclusion(leaf, a, b, path, root(b === 8 ? 7 : b + 1))).toBe(false);
      expect(checkInclusion(leaf, a, 16 * b, path, root(b)), 'a size that needs a longer path').toBe(false);
      expect(checkInclusion(leafHash(Buffer.from('other')), a, b, path, root(b))).toBe(false);
      for (const index of [b, b + 1, -1, 0.5, Number.NaN])
        expect(checkInclusion(leaf, index, b, path, root(b))).toBe(false);
      if (b > 1) expect(checkInclusion(leaf, (a + 1) % b, b, path, root(b))).toBe(false);
    }
  });

  test('of consistency holds, and no spoiled one does', () => {
    for (const { a, b, path } of published(CONSISTENCY)) {
      expect(checkConsistency(a, b, root(a), root(b), path)).toBe(true);
      for (const wrong of spoiled(path)) expect(checkConsistency(a, b, root(a), root(b), wrong)).toBe(false);
      if (a === b) continue;
      expect(checkConsistency(a, b, root(b), root(a), path), 'roots exchanged').toBe(false);
      expect(checkConsistency(a, b, root(b), root(b), path), 'another first root').toBe(false);
      expect(checkConsistency(a, b, root(a), root(a), path), 'another second root').toBe(false);
      expect(checkConsistency(a, 16 * b, root(a), root(b), path), 'a size that needs a longer path').toBe(
        false,
      );
      expect(checkConsistency(b, a, root(b), root(a), path), 'second below first').toBe(false);
      expect(checkConsistency(a, b, root(a), root(b), []), 'an empty path').toBe(false);
    }
    expect(checkConsistency(0, 5, EMPTY_ROOT, root(5), [])).toBe(true);
    expect(checkConsistency(0, 5, root(1), root(5), [])).toBe(false);
    expect(checkConsistency(0, 5, EMPTY_ROOT, root(5), [root(1)])).toBe(false);
    expect(checkConsistency(Number.NaN, 5, root(1), root(5), [])).toBe(false);
  });

  test('is refused for leaves and sizes that are not there', () => {
    expect(() => inclusionPath(read, 8, 8)).toThrow('a tree of 8 leaves has no leaf 8');
    expect(() => inclusionPath(read, 0, 0)).toThrow(RangeError);
    expect(() => inclusionPath(read, Number.NaN, 8)).toThrow(RangeError);
    expect(() => consistencyPath(read, 0, 8)).toThrow(RangeError);
    expect(() => consistencyPath(read, 8, 7)).toThrow('not 8 to 7');
  });

  test('holds in trees of any size', () => {
    const many = Array.from({ length: 80 }, (_, i) => Buffer.from(`leaf ${i}`));
    const node = readerOver(many);
    const size = fc.integer({ min: 1, max: many.length });
    fc.assert(
      fc.property(size, fc.nat(), fc.nat(), (second, i, j) => {
        const [index, first] = [i % second, (j % second) + 1];
        const [from, to] = [definition(many.slice(0, first)), definition(many.slice(0, second))];
        const leaf = leafHash(many[index] as Buffer);
        expect(checkInclusion(leaf, index, second, inclusionPath(node, index, second), to)).toBe(true);
        expect(checkConsistency(first, second, from, to, consistencyPath(node, first, second))).toBe(true);
        // RFC 9162: a path has at most ceil(log2 n) hashes, one more for consistency.
        expect(inclusionPath(node, index, second).length).toBeLessThanOrEqual(Math.ceil(Math.log2(second)));
        expect(consistencyPath(node, first, second).length).toBeLessThanOrEqual(
          Math.ceil(Math.log2(second)) + 1,
        );
      }),
      { numRuns: 60 },
    );
  });

  test('costs no more than log n hashes to append', () => {
    const peaks: Buffer[] = [];
    for (let size = 0; size < 1024; size += 1) {
      const made = growPeaks(peaks, size, leafHash(Buffer.from(String(size))));
      expect(made.length).toBeLessThanOrEqual(Math.log2(size + 1) + 1);
      expect(peaks.length).toBeLessThanOrEqual(Math.log2(size + 1) + 1);
    }
  });
});
