/** Manifests: one line per file, digest, two spaces, path (RFC 8493, section 2.1.3). That is also what `sha256sum -c`
 *  reads. Written in the order of the paths; read in any order and in no other spelling. */

import { collisionKey, decodePath, encodePath, faultOfPath } from './paths.ts';
import { badBag } from './problem.ts';

/** More files than this are taken for an attack. */
export const MOST_FILES = 100_000;

/** Digest by path. */
export type Manifest = ReadonlyMap<string, string>;

/** The text of a manifest. */
export function formatManifest(digests: Manifest): string {
  const paths = [...digests.keys()].sort();
  return paths.map((path) => `${digests.get(path)}  ${encodePath(path)}\n`).join('');
}

/** The digests in a manifest; the inverse of formatManifest.
 *  @param name    the manifest's own, for messages
 *  @param digits  hexadecimal digits of its kind of digest: 64 for SHA-256
 *  @throws RunnerProblem 'bad-bag' with name and line */
export function parseManifest(text: string, name: string, digits = 64): Map<string, string> {
  const digests = new Map<string, string>();
  const seen = new Map<string, string>();
  const lines = text.split('\n');
  if (lines.pop() !== '') throw badBag(name, 'a line feed at the end of the last line', 'none');
  if (lines.length > MOST_FILES) throw badBag(name, `at most ${MOST_FILES} files`, `${lines.length}`);
  for (const [i, line] of lines.entries()) {
    const place = `${name}:${i + 1}`;
    const digest = line.slice(0, digits);
    const rest = line.slice(digits);
    if (!new RegExp(`^[0-9a-f]{${digits}}$`).test(digest) || !rest.startsWith('  ')) {
      throw badBag(place, `${digits} hexadecimal digits in lower case, two spaces and a path`, quoted(line));
    }
    const path = requirePath(rest.slice(2), place);
    const other = seen.get(collisionKey(path));
    if (other === path) throw badBag(place, 'each file once', `${quoted(path)} again`);
    if (other !== undefined) {
      throw badBag(place, 'names that differ in more than case', `${quoted(path)} beside ${quoted(other)}`);
    }
    seen.set(collisionKey(path), path);
    digests.set(path, digest);
  }
  return digests;
}

/** The path that a line of a manifest or of fetch.txt means. @throws RunnerProblem 'bad-bag' */
export function requirePath(written: string, place: string): string {
  const path = decodePath(written);
  if (path === null) throw badBag(place, 'no per cent sign but %25, %0A and %0D', quoted(written));
  const fault = faultOfPath(path);
  if (fault !== null) throw badBag(place, 'a path below the bag', `${fault} (${quoted(path)})`);
  return path;
}

function quoted(text: string): string {
  return JSON.stringify(text.length > 100 ? `${text.slice(0, 100)}…` : text);
}
