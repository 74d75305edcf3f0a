/** The ledger's tree: a Merkle tree over the canonical bytes of the entries, RFC 9162 section 2.1 (= RFC 6962 section
 *  2.1) with SHA-256. Pure arithmetic on hashes; where they are kept: tree.ts.
 *
 *      leaf  = SHA-256(0x00 || entry)        node = SHA-256(0x01 || left || right)        empty tree = SHA-256("")
 *
 *  Leaves count from 0: entry n is leaf n - 1. A node (level, i) covers the leaves i 2^level to (i + 1) 2^level - 1.
 *  Hashes are Buffers of 32 bytes. Sizes may be any safe integer. */

import { hash } from 'node:crypto';

export const HASH_BYTES = 32;

const LEAF = Buffer.of(0);
const NODE = Buffer.of(1);

/** Gives the hash of a whole node: level 0 is the leaves. */
export type NodeReader = (level: number, index: number) => Buffer;

/** RFC 9162 section 2.1.1: the hash of an empty list. */
export const EMPTY_ROOT: Buffer = digest(Buffer.alloc(0));

/** The hash of a leaf. @param entry  canonical bytes, without line feed */
export function leafHash(entry: Uint8Array): Buffer {
  return digest(Buffer.concat([LEAF, entry]));
}

/** The hash of an inner node. */
export function nodeHash(left: Buffer, right: Buffer): Buffer {
  return digest(Buffer.concat([NODE, left, right]));
}

/** The whole subtrees that a tree of `size` leaves is made of, largest first: [level, index]. Their hashes are all that
 *  appending needs. At most log2(size) + 1. */
export function peaksOf(size: number): [level: number, index: number][] {
  const peaks: [number, number][] = [];
  for (let from = 0; from < size; ) {
    const width = powerUpTo(size - from);
    peaks.push([Math.log2(width), from / width]);
    from += width;
  }
  return peaks;
}

/** The root over the hashes of the peaks, largest first. RFC 9162 section 2.1.1: the right part is the smaller. */
export function rootOfPeaks(peaks: readonly Buffer[]): Buffer {
  const last = peaks.at(-1);
  if (last === undefined) return EMPTY_ROOT;
  return peaks.slice(0, -1).reduceRight((right, left) => nodeHash(left, right), last);
}

/** Adds a leaf to a tree of `size` leaves.
 *  @param peaks  of that tree, largest first; replaced by those of the grown one
 *  @returns the leaf and the nodes that it completes, lowest first. At most log2(size) + 1 hashes. */
export function growPeaks(peaks: Buffer[], size: number, leaf: Buffer): Buffer[] {
  const completed = [leaf];
  let node = leaf;
  for (let rest = size; rest % 2 === 1; rest = (rest - 1) / 2) {
    node = nodeHash(peaks.pop() as Buffer, node);
    completed.push(node);
  }
  peaks.push(node);
  return completed;
}

/** The root of the first `size` leaves. Reads as many nodes as there are peaks. */
export function rootAt(read: NodeReader, size: number): Buffer {
  return rootOfPeaks(peaksOf(size).map(([level, index]) => read(level, index)));
}

/** The inclusion path of a leaf in the tree of the first `size` leaves, lowest first: RFC 9162 section 2.1.3.1.
 *  @throws RangeError unless 0 <= index < size. Cost: O(log^2 size) hashes at most. */
export function inclusionPath(read: NodeReader, index: number, size: number): Buffer[] {
  requireIndex(index, size);
  const path: Buffer[] = [];
  let [from, to] = [0, size];
  while (to - from > 1) {
    const middle = from + powerBelow(to - from);
    if (index < middle) {
      path.push(rangeHash(read, middle, to));
      to = middle;
    } else {
      path.push(rangeHash(read, from, middle));
      from = middle;
    }
  }
  return path.reverse();
}

/** The consistency path from the tree of `first` leaves to that of `second`: RFC 9162 section 2.1.4.1. Empty when they
 *  are one. @throws RangeError unless 1 <= first <= second. */
export function consistencyPath(read: NodeReader, first: number, second: number): Buffer[] {
  if (!(Number.isSafeInteger(first) && Number.isSafeInteger(second) && first >= 1 && first <= second)) {
    throw new RangeError(
      `a consistency path goes from 1 or more leaves to no fewer, not ${first} to ${second}`,
    );
  }
  const path: Buffer[] = [];
  let [from, to] = [0, second];
  // Down to the subtree whose right edge is that of the first tree.
  while (first !== to) {
    const middle = from + powerBelow(to - from);
    if (first <= middle) {
      path.push(rangeHash(read, middle, to));
      to = middle;
    } else {
      path.push(rangeHash(read, from, middle));
      from = middle;
    }
  }
  // A whole left part of the second tree is the first root itself, which the checker has.
  if (from > 0) path.push(rangeHash(read, from, to));
  return path.reverse();
}

/** Whether a path shows that a leaf stands at `index` in the tree of `size` leaves with this root: RFC 9162 section
 *  2.1.3.2. Any malformed argument is false. */
export function checkInclusion(
  leaf: Buffer,
  index: number,
  size: number,
  path: readonly Buffer[],
  root: Buffer,
): boolean {
  if (!(Number.isSafeInteger(index) && Number.isSafeInteger(size) && index >= 0 && index < size))
    return false;
  if (!areHashes([leaf, root, ...path])) return false;
  let [fn, sn, r] = [index, size - 1, leaf];
  for (const p of path) {
    if (sn === 0) return false;
    if (fn % 2 === 1 || fn === sn) {
      r = nodeHash(p, r);
      while (fn % 2 === 0 && fn !== 0) [fn, sn] = [half(fn), half(sn)];
    } else r = nodeHash(r, p);
    [fn, sn] = [half(fn), half(sn)];
  }
  return sn === 0 && r.equals(root);
}

/** Whether a path shows that the tree of `second` leaves only adds to that of `first`: RFC 9162 section 2.1.4.2. The
 *  empty tree is a beginning of every tree, with an empty path. */
export function checkConsistency(
  first: number,
  second: number,
  firstRoot: Buffer,
  secondRoot: Buffer,
  path: readonly Buffer[],
): boolean {
  if (!(Number.isSafeInteger(first) && Number.isSafeInteger(second) && first >= 0 && first <= second))
    return false;
  if (!areHashes([firstRoot, secondRoot, ...path])) return false;
  if (first === second) return path.length === 0 && firstRoot.equals(secondRoot);
  if (first === 0) return path.length === 0 && firstRoot.equals(EMPTY_ROOT);
  const [start, ...rest] = isPower(first) ? [firstRoot, ...path] : path;
  if (start === undefined || path.length === 0) return false;
  let [fn, sn] = [first - 1, second - 1];
  while (fn % 2 === 1) [fn, sn] = [half(fn), half(sn)];
  let [fr, sr] = [start, start];
  for (const c of rest) {
    if (sn === 0) return false;
    if (fn % 2 === 1 || fn === sn) {
      [fr, sr] = [nodeHash(c, fr), nodeHash(c, sr)];
      while (fn % 2 === 0 && fn !== 0) [fn, sn] = [half(fn), half(sn)];
    } else sr = nodeHash(sr, c);
    [fn, sn] = [half(fn), half(sn)];
  }
  return sn === 0 && fr.equals(firstRoot) && sr.equals(secondRoot);
}

/** The hash of the leaves from `from` to `to` - 1, where `from` begins a subtree of that width or more. */
function rangeHash(read: NodeReader, from: number, to: number): Buffer {
  const width = to - from;
  if (isPower(width)) return read(Math.log2(width), from / width);
  const middle = from + powerBelow(width);
  return nodeHash(rangeHash(read, from, middle), rangeHash(read, middle, to));
}

function digest(bytes: Uint8Array): Buffer {
  return hash('sha256', bytes, 'buffer');
}

function requireIndex(index: number, size: number): void {
  if (!(Number.isSafeInteger(index) && Number.isSafeInteger(size) && index >= 0 && index < size))
    throw new RangeError(`a tree of ${size} leaves has no leaf ${index}`);
}

function areHashes(hashes: readonly Buffer[]): boolean {
  return hashes.every((each) => each.length === HASH_BYTES);
}

function half(n: number): number {
  return Math.floor(n / 2);
}

/** The largest power of two that is at most n, n >= 1. */
function powerUpTo(n: number): number {
  let power = 1;
  while (power * 2 <= n) power *= 2;
  return power;
}

/** The largest power of two below n, n >= 2. */
function powerBelow(n: number): number {
  const power = powerUpTo(n);
  return power === n ? power / 2 : power;
}

function isPower(n: number): boolean {
  return powerUpTo(n) === n;
}
