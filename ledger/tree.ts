/** The hashes of the ledger's tree (merkle.ts), in one file, `tree`: derived, free to be deleted, made again from the
 *  ledger. Nothing read from it is believed until it gives the root that a seal has signed, so it needs no sync.
 *
 *  Leaf m and the nodes that it completes (those of which it is the last leaf) stand together, lowest first: the whole
 *  node of level k that ends with leaf m is the hash number 2m - (bits set in m) + k. What stands never moves. */

import { closeSync, openSync, readFileSync, renameSync, rmSync, writeFileSync, writeSync } from 'node:fs';
import { join } from 'node:path';
import { ledgerPath, linesOf, readRange, withFile } from './ledger-file.ts';
import {
  consistencyPath,
  growPeaks,
  HASH_BYTES,
  inclusionPath,
  leafHash,
  type NodeReader,
  peaksOf,
  rootAt,
  rootOfPeaks,
} from './merkle.ts';
import { ledgerDamaged } from './problem.ts';
import type { SealFacts } from './seal.ts';

/** A tree that is growing, in memory. */
export interface GrowingTree {
  readonly size: number;
  readonly peaks: readonly Buffer[];
}

/** The path of the hashes. */
export function treePath(directory: string): string {
  return join(directory, 'tree');
}

/** How many hashes a tree of `size` leaves has; the number of the first that leaf `size` brings. */
export function hashCount(size: number): number {
  let bits = 0;
  for (let rest = size; rest > 0; rest = Math.floor(rest / 2)) bits += rest % 2;
  return 2 * size - bits;
}

/** The tree under a seal, ready to grow. Its root is the seal's.
 *  @throws LedgerProblem 'ledger-damaged' when the ledger's is another. Cost: log n reads; one pass over the ledger when
 *  the file is missing or wrong. */
export function treeUnder(directory: string, seal: SealFacts): GrowingTree {
  const stored = storedPeaks(directory, seal.entries);
  if (stored !== null && rootOfPeaks(stored).toString('base64') === seal.root)
    return { size: seal.entries, peaks: stored };
  return rebuildTree(directory, seal).tree;
}

/** A tree with one more leaf, whose hashes are written. A file that cannot be written is made again when it is needed. */
export function growTree(directory: string, { size, peaks }: GrowingTree, entry: Uint8Array): GrowingTree {
  const grown = [...peaks];
  const completed = growPeaks(grown, size, leafHash(entry));
  try {
    const descriptor = openTree(directory);
    try {
      writeSync(descriptor, Buffer.concat(completed), 0, undefined, hashCount(size) * HASH_BYTES);
    } finally {
      closeSync(descriptor);
    }
  } catch {}
  return { size: size + 1, peaks: grown };
}

/** The root of a growing tree, base64. */
export function rootOf({ peaks }: GrowingTree): string {
  return rootOfPeaks(peaks).toString('base64');
}

/** Asks the tree under a seal for paths; each answer is checked against the seal before it is given.
 *  @throws LedgerProblem 'ledger-damaged' when the ledger does not give the seal's root. */
export function askTree<T>(
  directory: string,
  seal: SealFacts,
  question: (tree: {
    inclusion(index: number): Buffer[];
    consistency(first: number): Buffer[];
    rootAt(size: number): Buffer;
  }) => T,
  isRight: (answer: T) => boolean,
): T {
  const ask = (read: NodeReader) =>
    question({
      inclusion: (index) => inclusionPath(read, index, seal.entries),
      consistency: (first) => consistencyPath(read, first, seal.entries),
      rootAt: (size) => rootAt(read, size),
    });
  try {
    const answer = withFile(treePath(directory), (descriptor) =>
      ask(readerOf((at) => readHash(descriptor, at))),
    );
    if (isRight(answer)) return answer;
  } catch (error) {
    if (!(error instanceof MissingHash) && (error as NodeJS.ErrnoException).code === undefined) throw error;
  }
  const { hashes } = rebuildTree(directory, seal);
  return ask(readerOf((at) => hashes.subarray(at, at + HASH_BYTES)));
}

/** Makes the hashes again from the ledger, as far as a seal goes, and writes them where that is possible.
 *  @throws LedgerProblem 'ledger-damaged' when the root is not the seal's. */
export function rebuildTree(directory: string, seal: SealFacts): { tree: GrowingTree; hashes: Buffer } {
  const { tree, hashes } = treeOfLedger(directory, seal.bytes, seal.entries);
  if (seal.root !== '' && (tree.size !== seal.entries || rootOf(tree) !== seal.root)) {
    throw ledgerDamaged(
      ledgerPath(directory),
      undefined,
      `the tree over its ${tree.size} lines has the root ${rootOf(tree)}, the seal of ${seal.entries} entries says ${seal.root}`,
    );
  }
  try {
    const temporary = join(directory, 'tree.new');
    writeFileSync(temporary, hashes);
    renameSync(temporary, treePath(directory));
  } catch {
    rmSync(join(directory, 'tree.new'), { force: true });
  }
  return { tree, hashes };
}

function treeOfLedger(
  directory: string,
  bytes: number,
  entries: number,
): { tree: GrowingTree; hashes: Buffer } {
  const hashes = Buffer.alloc(hashCount(entries) * HASH_BYTES);
  const peaks: Buffer[] = [];
  let size = 0;
  let at = 0;
  withFile(ledgerPath(directory), (descriptor) => {
    for (const line of linesOf(descriptor, 0, bytes)) {
      if (size === entries) break;
      for (const hash of growPeaks(peaks, size, leafHash(line.bytes))) at += hash.copy(hashes, at);
      size += 1;
    }
  });
  return { tree: { size, peaks }, hashes };
}

/** The peaks of the tree as the file has them; null when it is too short or cannot be read. */
function storedPeaks(directory: string, size: number): Buffer[] | null {
  if (size === 0) return [];
  try {
    return withFile(treePath(directory), (descriptor) => {
      const read = readerOf((at) => readHash(descriptor, at));
      return peaksOf(size).map(([level, index]) => read(level, index));
    });
  } catch {
    return null;
  }
}

class MissingHash extends Error {}

function readHash(descriptor: number, at: number): Buffer {
  const hash = readRange(descriptor, at, HASH_BYTES);
  if (hash.length < HASH_BYTES) throw new MissingHash();
  return hash;
}

/** @param at  reads the hash at a byte */
function readerOf(at: (byte: number) => Buffer): NodeReader {
  return (level, index) => {
    const lastLeaf = (index + 1) * 2 ** level - 1;
    return at((hashCount(lastLeaf) + level) * HASH_BYTES);
  };
}

function openTree(directory: string): number {
  try {
    return openSync(treePath(directory), 'r+');
  } catch {
    return openSync(treePath(directory), 'w');
  }
}

/** The whole file, for audits; null when there is none. */
export function readTree(directory: string): Buffer | null {
  try {
    return readFileSync(treePath(directory));
  } catch {
    return null;
  }
}

/** A reader of hashes that lie in memory as the file has them. */
export function readerIn(hashes: Buffer): NodeReader {
  return readerOf((at) => hashes.subarray(at, at + HASH_BYTES));
}
