/** Files for people, outside the book: whole or not at all, also when the disk fills up or the process dies. */

import { readFileSync, statSync, writeFileSync } from 'node:fs';
import { basename, dirname, join } from 'node:path';
import { writeDurably } from '../ledger/durable.ts';

/** Writes a file under a name of its own beside it and renames it. One that has these bytes already is left alone; what is
 *  no regular file, such as a pipe, is written to as it stands. @throws the file system's error; what stood there stays */
export function writeWhole(path: string, bytes: Uint8Array): void {
  const found = statSync(path, { throwIfNoEntry: false });
  if (found !== undefined && !found.isFile()) {
    writeFileSync(path, bytes);
    return;
  }
  if (found?.size === bytes.length && readFileSync(path).equals(bytes)) return;
  writeDurably(path, join(dirname(path), `.${basename(path)}.${process.pid}.part`), bytes);
}
