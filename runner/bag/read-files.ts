/** Everything that lies in a bag's directory, without following a link and without opening anything: regular files and
 *  directories, and nothing else. */

import { lstatSync, opendirSync } from 'node:fs';
import { join } from 'node:path';
import { MOST_FILES } from './manifest.ts';
import { faultOfPath } from './paths.ts';
import { badBag, noBag } from './problem.ts';

/** Size by path, relative to the bag, with forward slashes.
 *  @throws RunnerProblem 'no-bag' when it is no directory with bagit.txt; 'bad-bag' for links, devices, pipes, sockets,
 *  names that no bag may have, and for more files than a bag may have */
export function listBag(directory: string): Map<string, number> {
  const top = lstatSync(directory, { throwIfNoEntry: false });
  if (top === undefined) throw noBag(directory, 'nothing');
  if (!top.isDirectory()) throw noBag(directory, top.isSymbolicLink() ? 'a link' : 'a file');
  if (lstatSync(join(directory, 'bagit.txt'), { throwIfNoEntry: false }) === undefined) {
    throw noBag(directory, 'a directory without it');
  }
  const files = new Map<string, number>();
  const waiting = [''];
  let names = 0;
  for (let folder = waiting.pop(); folder !== undefined; folder = waiting.pop()) {
    const reading = opendirSync(join(directory, folder));
    try {
      for (let item = reading.readSync(); item !== null; item = reading.readSync()) {
        names += 1;
        if (names > 2 * MOST_FILES) throw badBag(directory, `at most ${MOST_FILES} files`, 'more');
        const path = folder === '' ? item.name : `${folder}/${item.name}`;
        if (item.isDirectory()) waiting.push(requirePlain(path));
        else files.set(requirePlain(path), sizeOfRegular(directory, path));
      }
    } finally {
      reading.closeSync();
    }
  }
  return files;
}

function requirePlain(path: string): string {
  const fault = faultOfPath(path);
  if (fault !== null) throw badBag(path, 'names that mean the same everywhere', fault);
  return path;
}

function sizeOfRegular(directory: string, path: string): number {
  const found = lstatSync(join(directory, path));
  if (found.isFile()) return found.size;
  throw badBag(
    path,
    'a regular file',
    found.isSymbolicLink() ? 'a link' : 'something else (a device, a pipe or a socket)',
  );
}
