/** Digests of files outside the store. A large file that has not changed is not read again: its digest is remembered
 *  by path, device, inode, size and times. */

import { type BigIntStats, closeSync, openSync, statSync } from 'node:fs';
import { resolve } from 'node:path';
import { digestOfDescriptor } from './digest.ts';
import type { StoredFile } from './entry.ts';
import type { IndexKeeper } from './index-keeper.ts';
import { fileChanged, fileUnreadable } from './problem.ts';

/** File systems count time in steps of up to 2 s. A file that changed so shortly before it was read could change
 *  again within the same step, unseen; such a digest is not remembered. */
const STEP_MILLISECONDS = 2_000;

/** Digest and size of a file.
 *  @param strict  read it even when its digest is remembered
 *  @param now     milliseconds since 1970
 *  @throws LedgerProblem 'file-unreadable', or 'file-changed' when something writes it meanwhile. */
export function digestOfFile(path: string, keeper: IndexKeeper, strict: boolean, now: number): StoredFile {
  const absolute = resolve(path);
  const stats = statOf(path);
  if (!strict) {
    const known = remembered(keeper, absolute, stampOf(stats));
    if (known !== null) return known;
  }
  const file = readWhole(path);
  if (stampOf(statOf(path)) !== stampOf(stats) || BigInt(file.bytes) !== stats.size) throw fileChanged(path);
  const newest = Math.max(Number(stats.mtimeMs), Number(stats.ctimeMs));
  if (now - newest > STEP_MILLISECONDS) remember(keeper, absolute, stampOf(stats), file);
  return file;
}

function readWhole(path: string): StoredFile {
  let descriptor: number | undefined;
  try {
    descriptor = openSync(path, 'r');
    return digestOfDescriptor(descriptor);
  } catch (cause) {
    throw fileUnreadable(path, cause);
  } finally {
    if (descriptor !== undefined) closeSync(descriptor);
  }
}

function statOf(path: string): BigIntStats {
  let stats: BigIntStats;
  try {
    stats = statSync(path, { bigint: true });
  } catch (cause) {
    throw fileUnreadable(path, cause);
  }
  if (!stats.isFile())
    throw fileUnreadable(path, stats.isDirectory() ? 'it is a directory' : 'it is no regular file');
  return stats;
}

function stampOf({ dev, ino, size, mtimeNs, ctimeNs }: BigIntStats): string {
  return [dev, ino, size, mtimeNs, ctimeNs].join(' ');
}

function remembered(keeper: IndexKeeper, path: string, stamp: string): StoredFile | null {
  const row = keeper.ask((index) =>
    index.get<{ stamp: string } & StoredFile>(
      'SELECT stamp, digest, bytes FROM remembered WHERE path = ?',
      path,
    ),
  );
  return row?.stamp === stamp ? { digest: row.digest, bytes: row.bytes } : null;
}

function remember(keeper: IndexKeeper, path: string, stamp: string, { digest, bytes }: StoredFile): void {
  try {
    keeper.ask((index) => index.remember(path, stamp, digest, bytes));
  } catch {
    // Only time is lost: the file is read again next time.
  }
}
