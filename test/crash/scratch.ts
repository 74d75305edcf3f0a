/** Temporary directories in memory where the system has such a place: neither a process that is killed nor a simulated
 *  disk needs a real one. */

import { accessSync, constants, existsSync, mkdtempSync, rmSync, statfsSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';

/** Where Linux keeps files in memory, and the mark of such a file system in statfs(2). */
const IN_MEMORY = '/dev/shm';
const TMPFS_MAGIC = 0x01021994;

/** A new empty directory, and how to remove it. */
export function makeScratchDirectory(): { directory: string; remove: () => void } {
  const directory = mkdtempSync(join(isInMemory() ? IN_MEMORY : tmpdir(), 'platebook-crash-'));
  return { directory, remove: () => rmSync(directory, { recursive: true, force: true }) };
}

/** Runs something with a new empty directory, and removes that. */
export function withScratch<T>(work: (directory: string) => T): T {
  const { directory, remove } = makeScratchDirectory();
  try {
    return work(directory);
  } finally {
    remove();
  }
}

function isInMemory(): boolean {
  if (!existsSync(IN_MEMORY) || statfsSync(IN_MEMORY).type !== TMPFS_MAGIC) return false;
  try {
    accessSync(IN_MEMORY, constants.W_OK);
    return true;
  } catch {
    return false;
  }
}
