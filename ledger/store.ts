/** The store: files named by their SHA-256, in directories of the first three digits, read-only.
 *
 *      store/3f9/3f9a…     64 hexadecimal digits
 *      store/new/          files on their way in; what a crash left there is removed after a day
 *
 *  A file gets its name only when its bytes are on the disk, and is not written again while it stands. */

import {
  chmodSync,
  closeSync,
  existsSync,
  fsyncSync,
  mkdirSync,
  openSync,
  readdirSync,
  readFileSync,
  renameSync,
  rmSync,
  statSync,
} from 'node:fs';
import { join } from 'node:path';
import { digestOfDescriptor, isDigest, sha256 } from './digest.ts';
import { copyFile, renameDurably, syncDirectory, writeDurably } from './durable.ts';
import type { StoredFile } from './entry.ts';
import {
  bookUnreadable,
  cannotWrite,
  fileUnreadable,
  LedgerProblem,
  notADigest,
  storeDamaged,
  storeMissing,
} from './problem.ts';

const READ_ONLY = 0o444;
const DAY = 86_400_000;

export interface Store {
  /** Keeps bytes. @throws LedgerProblem 'cannot-write'. */
  keepBytes(bytes: Uint8Array | string): StoredFile;
  /** Keeps a file's bytes: copies it, or with `move` takes it away from where it lies.
   *  @throws LedgerProblem 'file-unreadable', 'cannot-write'. Cost: one read for the digest, one copy. */
  keepFile(path: string, options?: { readonly move?: boolean }): StoredFile;
  /** Whether the store has a file, with the right size. Its bytes are not read: that is the audit's. */
  has(file: StoredFile): boolean;
  /** Where a digest's file is, or would be. */
  path(digest: string): string;
  /** A file's bytes, held against the digest. @throws LedgerProblem 'store-missing', 'store-damaged'. */
  read(digest: string): Buffer;
}

/** The store of a book. @param directory  the path of `store` itself */
export function openStore(directory: string): Store {
  const path = (digest: string) => pathInStore(directory, digest);
  const has = ({ digest, bytes }: StoredFile) => {
    const found = statSync(path(digest), { throwIfNoEntry: false });
    return found?.isFile() === true && found.size === bytes;
  };
  /** Digests and shelves whose names are known to be on the disk. */
  const settled = new Set<string>();
  /** Makes the names of a file and its shelf last. Who gave them may have died before they were synced. */
  const settle = (digest: string, isNew: boolean) => {
    if (settled.has(digest)) return;
    const shelf = digest.slice(0, 3);
    if (!isNew) syncDirectory(join(directory, shelf));
    if (!settled.has(shelf)) syncDirectory(directory);
    settled.add(shelf).add(digest);
  };
  return {
    path,
    has,
    keepBytes(content) {
      const bytes = typeof content === 'string' ? Buffer.from(content) : content;
      const file = { digest: sha256(bytes), bytes: bytes.length };
      return guardWriting(directory, () => {
        const isNew = !has(file);
        if (isNew) {
          makeShelf(directory, file.digest);
          writeDurably(path(file.digest), newName(directory), bytes, READ_ONLY);
        }
        settle(file.digest, isNew);
        return file;
      });
    },
    keepFile(source, { move = false } = {}) {
      return guardWriting(directory, () => {
        const temporary = newName(directory);
        bringIn(source, temporary, move);
        const { file, isNew } = shelve(directory, temporary, has);
        settle(file.digest, isNew);
        return file;
      });
    },
    read: (digest) => readStored(path(digest), digest),
  };
}

/** Every file below the store that has a digest for a name, and everything else that lies there, sorted. */
export function listStore(directory: string): { digests: string[]; others: string[] } {
  const digests: string[] = [];
  const others: string[] = [];
  for (const shelf of readdirSync(directory, { withFileTypes: true })) {
    if (!shelf.isDirectory()) others.push(shelf.name);
    else {
      for (const { name } of readdirSync(join(directory, shelf.name), { withFileTypes: true })) {
        if (isDigest(name) && name.startsWith(shelf.name) && shelf.name.length === 3) digests.push(name);
        else others.push(`${shelf.name}/${name}`);
      }
    }
  }
  return { digests: digests.sort(), others: others.sort() };
}

/** Removes what crashes left on its way in, as far as it can. @param now  milliseconds since 1970 */
export function sweepStore(directory: string, now: number): void {
  const incoming = join(directory, 'new');
  if (!existsSync(incoming)) return;
  for (const name of readdirSync(incoming)) {
    const found = statSync(join(incoming, name), { throwIfNoEntry: false });
    if (found === undefined || now - found.mtimeMs <= DAY) continue;
    try {
      rmSync(join(incoming, name), { force: true });
    } catch {}
  }
}

function pathInStore(directory: string, digest: string): string {
  if (!isDigest(digest)) throw notADigest(digest);
  return join(directory, digest.slice(0, 3), digest);
}

function newName(directory: string): string {
  mkdirSync(join(directory, 'new'), { recursive: true });
  return join(directory, 'new', `${process.pid}-${process.hrtime.bigint()}`);
}

function makeShelf(directory: string, digest: string): void {
  const shelf = join(directory, digest.slice(0, 3));
  try {
    // Not recursive: on a read-only disk that says that a file is missing.
    if (!existsSync(shelf)) mkdirSync(shelf);
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code !== 'EEXIST') throw error;
  }
}

function bringIn(source: string, temporary: string, move: boolean): void {
  try {
    if (move) {
      try {
        renameSync(source, temporary);
        return;
      } catch (error) {
        // Another file system: copy, then remove.
        if ((error as NodeJS.ErrnoException).code !== 'EXDEV') throw error;
      }
    }
    copyFile(source, temporary);
    if (move) rmSync(source);
  } catch (cause) {
    rmSync(temporary, { force: true });
    const wrong = (cause as NodeJS.ErrnoException).code;
    if (wrong === 'ENOSPC' || wrong === 'EDQUOT' || wrong === 'EROFS') throw cause;
    throw fileUnreadable(source, cause);
  }
}

/** Gives a file in store/new its name. What is digested are the bytes already inside, so that nobody can change the
 *  file between the digest and the name. */
function shelve(
  directory: string,
  temporary: string,
  has: (file: StoredFile) => boolean,
): { file: StoredFile; isNew: boolean } {
  chmodSync(temporary, READ_ONLY);
  const descriptor = openSync(temporary, 'r');
  let file: StoredFile;
  try {
    file = digestOfDescriptor(descriptor);
    if (!has(file)) fsyncSync(descriptor);
  } finally {
    closeSync(descriptor);
  }
  const isNew = !has(file);
  if (isNew) {
    makeShelf(directory, file.digest);
    renameDurably(temporary, pathInStore(directory, file.digest));
  } else rmSync(temporary, { force: true });
  return { file, isNew };
}

function readStored(path: string, digest: string): Buffer {
  let bytes: Buffer;
  try {
    bytes = readFileSync(path);
  } catch (cause) {
    if ((cause as NodeJS.ErrnoException).code === 'ENOENT') throw storeMissing(path);
    throw bookUnreadable(path, cause);
  }
  const found = sha256(bytes);
  if (found !== digest) throw storeDamaged(path, found);
  return bytes;
}

function guardWriting<T>(directory: string, write: () => T): T {
  try {
    return write();
  } catch (cause) {
    throw cause instanceof LedgerProblem ? cause : cannotWrite(directory, cause);
  }
}
