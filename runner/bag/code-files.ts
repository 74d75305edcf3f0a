/** The source of the kinds in a bag. Entries made with different states of the program can name different bytes for one
 *  path; each state that does not fit beside the others has a folder of its own. */

import type { StageEntry } from '../../ledger/entry.ts';
import { keptCode } from '../recorded-code/keep.ts';
import { mediaTypeOf } from './media-types.ts';
import { faultOfPath } from './paths.ts';
import type { PayloadFile } from './payload.ts';
import { cannotBag } from './problem.ts';

/** @param sizeOf  size of a file in the store; null when it is not there
 *  @returns the files, and the names of stages whose code was not kept or is gone */
export function planCode(
  stages: readonly StageEntry[],
  sizeOf: (digest: string) => number | null,
): { files: PayloadFile[]; without: string[] } {
  const folders: Map<string, string>[] = [];
  const without: string[] = [];
  // The newest first, so that the state of the latest entry has the plain folder.
  for (const stage of stages.toSorted((a, b) => b.number - a.number)) {
    const code = codePaths(stage);
    if (code === null || [...code.values()].some((digest) => sizeOf(digest) === null)) {
      without.push(stage.name);
      continue;
    }
    const folder = folders.find((each) => fits(each, code));
    if (folder === undefined) folders.push(new Map(code));
    else for (const [path, digest] of code) folder.set(path, digest);
  }
  const files = folders.flatMap((folder, i) =>
    [...folder].map(([path, digest]) =>
      codeFile(i === 0 ? 'data/code' : `data/code-${i + 1}`, path, digest, sizeOf(digest) ?? 0),
    ),
  );
  return { files, without: without.reverse() };
}

/** Null for an entry from before code was kept. */
function codePaths({ number, code }: StageEntry): Map<string, string> | null {
  if (code.package === undefined) return null;
  for (const path of Object.keys(code.files)) {
    const fault = faultOfPath(path);
    const place = `entry ${number}, code file ${JSON.stringify(path)}`;
    if (fault !== null) throw cannotBag(place, 'a path below the program', fault, 'Audit the book.');
  }
  return new Map(keptCode(code));
}

function fits(folder: ReadonlyMap<string, string>, code: ReadonlyMap<string, string>): boolean {
  return [...code].every(([path, digest]) => (folder.get(path) ?? digest) === digest);
}

function codeFile(folder: string, path: string, digest: string, bytes: number): PayloadFile {
  const about = `Source file ${path} of the program`;
  return {
    path: `${folder}/${path}`,
    role: 'code',
    entry: null,
    name: path,
    digest,
    bytes,
    mediaType: mediaTypeOf(path),
    about,
    from: { digest },
  };
}
