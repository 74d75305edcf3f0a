/** Writing that survives a crash: a file has its final name only when all its bytes are on the disk. */

import {
  closeSync,
  constants,
  copyFileSync,
  fchmodSync,
  fsyncSync,
  mkdirSync,
  openSync,
  renameSync,
  rmSync,
  writeSync,
} from 'node:fs';
import { dirname } from 'node:path';

/** Writes a file under a temporary name, syncs it, renames it and syncs its directory; what stood there is replaced.
 *  @param temporary  a path in the same file system, free to be overwritten */
export function writeDurably(path: string, temporary: string, bytes: Uint8Array, mode = 0o644): void {
  const descriptor = openSync(temporary, 'w', 0o644);
  try {
    writeAll(descriptor, bytes);
    fchmodSync(descriptor, mode);
    fsyncSync(descriptor);
  } catch (error) {
    rmSync(temporary, { force: true });
    throw error;
  } finally {
    closeSync(descriptor);
  }
  renameDurably(temporary, path);
}

/** Renames a file whose bytes are on the disk, and syncs the directory. */
export function renameDurably(from: string, to: string): void {
  renameSync(from, to);
  syncDirectory(dirname(to));
}

/** Writes all of the bytes at the end of an open file. */
export function writeAll(descriptor: number, bytes: Uint8Array): void {
  let done = 0;
  while (done < bytes.length) done += writeSync(descriptor, bytes, done, bytes.length - done);
}

/** Copies a file, by reference where the file system can. */
export function copyFile(from: string, to: string): void {
  copyFileSync(from, to, constants.COPYFILE_FICLONE);
}

/** Makes a directory and those above it that are missing, so that their names last, whoever made them. */
export function makeDirectoryDurably(directory: string, mode = 0o777): void {
  mkdirSync(directory, { recursive: true, mode });
  syncDirectory(dirname(directory));
  for (let at = dirname(directory); at !== dirname(at); at = dirname(at)) {
    try {
      syncDirectory(dirname(at));
    } catch {
      // A directory that is closed to us: what lies in it, we did not make.
      return;
    }
  }
}

/** Makes a file's bytes last, whoever wrote them. */
export function syncFile(path: string): void {
  const descriptor = openSync(path, 'r+');
  try {
    fsyncSync(descriptor);
  } finally {
    closeSync(descriptor);
  }
}

/** Makes the names in a directory last. */
export function syncDirectory(directory: string): void {
  // Windows opens no directory for this, and its file system keeps a journal of names.
  if (process.platform === 'win32') return;
  const descriptor = openSync(directory, 'r');
  try {
    fsyncSync(descriptor);
  } finally {
    closeSync(descriptor);
  }
}
