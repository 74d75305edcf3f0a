/** A small book with one run of two stages, a library and a picture, both from a file with an awkward name; and what
 *  tests do to bags. Everything in it is invented. */

import { execFileSync } from 'node:child_process';
import { cpSync, mkdirSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { sha256 } from '../../../ledger/digest.ts';
import { formatManifest } from '../../../runner/bag/manifest.ts';
import { openBag } from '../../../runner/bag/open-bag.ts';
import { RunnerProblem } from '../../../runner/problem.ts';
import { memorySink } from '../../../stages/bytes.ts';
import { writeSkyImage } from '../../../stages/formats/sky-image.ts';
import { FAMILIES } from '../../../stages/image-library/families.ts';
import { platebook } from '../test-io.ts';
import { temporaryFolder } from '../test-jobs.ts';

export const awkwardName = "own 100% wide; it's ‘ü’.fits";

const families = Object.keys(FAMILIES)
  .map((name) => `${name}: { count: ${name === 'ring' ? 4 : 0} }`)
  .join(', ');

const recipe = `recipe: tiny
purpose: A library and a picture, invented.
stages:
  library:
    kind: image-library
    inputs: { images: { file: "data/${awkwardName}" } }
    parameters: { pixels: 16, field: 160 uas, copies: 2, families: { ${families} } }
  picture:
    kind: figure
    inputs: { image: { file: "data/${awkwardName}" } }
publish:
  figures:
    image: { stage: picture, output: image }
`;

/** Runs the recipe in a new folder, which then holds `book`, `tiny.yaml` and `data`. */
export async function tinyBook(): Promise<string> {
  const folder = temporaryFolder();
  // The key that signs seals belongs to no user when tests make it.
  process.env.PLATEBOOK_KEY = join(folder, 'key.pem');
  mkdirSync(join(folder, 'data'));
  writeFileSync(join(folder, 'tiny.yaml'), recipe);
  writeFileSync(join(folder, 'data', awkwardName), bar());
  const { status, err, out } = await platebook(folder, ['run', 'tiny.yaml']);
  if (status !== 0) throw new Error(err + out);
  return folder;
}

function bar(): Uint8Array {
  const pixels = Float64Array.from({ length: 256 }, (_, i) =>
    Math.abs((i % 16) - 7.5) < 4 && Math.abs(Math.floor(i / 16) - 7.5) < 2 ? 0.01 : 0,
  );
  const sink = memorySink();
  writeSkyImage(sink, { nx: 16, ny: 16, pixelRadians: 5e-11, pixels });
  return sink.bytes();
}

/** A copy of a bag, to be tampered with. */
export function copyOf(bag: string): string {
  const copy = join(temporaryFolder(), 'bag');
  cpSync(bag, copy, { recursive: true });
  return copy;
}

/** Paths of all files below a directory, relative, sorted. */
export function filesBelow(directory: string): string[] {
  return readdirSync(directory, { recursive: true, withFileTypes: true })
    .filter((item) => item.isFile())
    .map((item) => join(item.parentPath, item.name).slice(directory.length + 1))
    .sort();
}

/** Makes the manifests and the Payload-Oxum of a bag anew, as somebody who tampers with its files would. */
export function reseal(bag: string): void {
  const digests = (paths: readonly string[]) =>
    new Map(paths.map((path) => [path, sha256(readFileSync(join(bag, path)))]));
  const payload = filesBelow(bag).filter((path) => path.startsWith('data/'));
  const bytes = payload.reduce((sum, path) => sum + readFileSync(join(bag, path)).length, 0);
  const info = readFileSync(join(bag, 'bag-info.txt'), 'utf8');
  writeFileSync(
    join(bag, 'bag-info.txt'),
    info.replace(/Payload-Oxum: .*/, `Payload-Oxum: ${bytes}.${payload.length}`),
  );
  writeFileSync(join(bag, 'manifest-sha256.txt'), formatManifest(digests(payload)));
  resealTags(bag);
}

/** Makes only the tag manifest anew. */
export function resealTags(bag: string): void {
  const tags = readdirSync(bag)
    .filter((name) => name !== 'data' && !name.startsWith('tagmanifest'))
    .sort();
  const digests = new Map(tags.map((name) => [name, sha256(readFileSync(join(bag, name)))]));
  writeFileSync(join(bag, 'tagmanifest-sha256.txt'), formatManifest(digests));
}

/** Changes a file of a bag by its text. */
export function edit(bag: string, path: string, change: (text: string) => string): void {
  mkdirSync(dirname(join(bag, path)), { recursive: true });
  writeFileSync(join(bag, path), change(readFileSync(join(bag, path), 'utf8')));
}

/** The message with which a bag is refused; an empty one when it is not. Anything else that is thrown is a fault. */
export function refusal(bag: string): string {
  try {
    openBag(bag);
    return '';
  } catch (error) {
    if (error instanceof RunnerProblem && (error.code === 'bad-bag' || error.code === 'no-bag'))
      return error.message;
    throw error;
  }
}

/** Checks a bag with coreutils alone, as its page says. @throws when sha256sum is not content */
export function checkWithSha256sum(bag: string): void {
  for (const manifest of ['manifest-sha256.txt', 'tagmanifest-sha256.txt']) {
    execFileSync('sha256sum', ['-c', '--strict', '--quiet', manifest], { cwd: bag, stdio: 'pipe' });
  }
}
