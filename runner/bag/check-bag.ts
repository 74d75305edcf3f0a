/** Checks a bag against RFC 8493 before anything in it is used. In this order, so that a hostile bag costs little: what
 *  lies there, the tag files, the names and numbers of files, their sizes, their digests. A bag is taken whole or refused
 *  whole.
 *
 *  Stricter than the RFC, because ours are written so: SHA-256 manifests, a tag manifest that lists every tag file. */

import { readFileSync, realpathSync } from 'node:fs';
import { join } from 'node:path';
import { sha256File } from '../../ledger/digest.ts';
import { type Manifest, parseManifest } from './manifest.ts';
import { badBag } from './problem.ts';
import { listBag } from './read-files.ts';
import {
  BAG_DECLARATION,
  type FetchItem,
  formatOxum,
  parseBagInfo,
  parseFetch,
  parseOxum,
} from './tag-files.ts';

const LARGEST_TAG_FILE = 1 << 26;
const MANIFEST = 'manifest-sha256.txt';
const TAG_MANIFEST = 'tagmanifest-sha256.txt';

export interface CheckedBag {
  /** The bag's real path. */
  readonly directory: string;
  readonly info: readonly (readonly [label: string, value: string])[];
  /** Digest by path of every payload file; all of them lie there with these digests. */
  readonly payload: Manifest;
  /** Size by path. */
  readonly sizes: ReadonlyMap<string, number>;
}

/** @throws RunnerProblem 'no-bag', 'bad-bag'. Cost: every file is read once. */
export function checkBag(given: string): CheckedBag {
  const sizes = listBag(given);
  const directory = realpathSync(given);
  const read = (name: string) => readTag(directory, name, sizes);
  if (read('bagit.txt') !== BAG_DECLARATION) {
    throw badBag('bagit.txt', JSON.stringify(BAG_DECLARATION), 'something else');
  }
  const tags = parseManifest(read(TAG_MANIFEST), TAG_MANIFEST);
  requireTags(tags, sizes);
  const payload = parseManifest(read(MANIFEST), MANIFEST);
  const info = parseBagInfo(read('bag-info.txt'));
  const fetched = sizes.has('fetch.txt') ? parseFetch(read('fetch.txt')) : [];
  requirePayload(payload, sizes, fetched);
  requireOxum(info, payload, sizes);
  for (const [path, digest] of [...tags, ...payload]) requireDigest(directory, path, digest);
  return { directory, info, payload, sizes };
}

function readTag(directory: string, name: string, sizes: ReadonlyMap<string, number>): string {
  const size = sizes.get(name);
  if (size === undefined) throw badBag(name, 'the file in the bag', 'none');
  if (size > LARGEST_TAG_FILE) throw badBag(name, `at most ${LARGEST_TAG_FILE} bytes`, `${size}`);
  try {
    return new TextDecoder('utf-8', { fatal: true, ignoreBOM: true }).decode(
      readFileSync(join(directory, name)),
    );
  } catch {
    throw badBag(name, 'UTF-8', 'other bytes');
  }
}

/** Every tag file but the tag manifest is listed there, and nothing else (RFC 8493, section 2.2.1). */
function requireTags(tags: Manifest, sizes: ReadonlyMap<string, number>): void {
  for (const path of tags.keys()) {
    if (path.startsWith('data/') || /^tagmanifest-/.test(path)) {
      throw badBag(TAG_MANIFEST, 'tag files other than tag manifests', path);
    }
    if (!sizes.has(path)) throw badBag(path, `the file that ${TAG_MANIFEST} lists`, 'none');
  }
  for (const path of sizes.keys()) {
    if (path.startsWith('data/') || path === TAG_MANIFEST) continue;
    if (!tags.has(path)) throw badBag(path, `only files that ${TAG_MANIFEST} lists`, 'one that it does not');
  }
  if (!tags.has(MANIFEST)) throw badBag(TAG_MANIFEST, `${MANIFEST} in it`, 'none');
  for (const path of tags.keys()) {
    // RFC 8493, section 2.1.3: every payload manifest lists every payload file, so a second one would have to be read too.
    if (/^manifest-/.test(path) && path !== MANIFEST)
      throw badBag(path, `${MANIFEST} alone`, 'another manifest');
  }
}

/** The files below data/ are those that the manifest lists (RFC 8493, section 3). */
function requirePayload(
  payload: Manifest,
  sizes: ReadonlyMap<string, number>,
  fetched: readonly FetchItem[],
): void {
  const locations = new Map(fetched.map((item) => [item.path, item]));
  for (const path of locations.keys()) {
    if (!payload.has(path)) throw badBag('fetch.txt', `only files that ${MANIFEST} lists`, path);
  }
  for (const path of payload.keys()) {
    if (!path.startsWith('data/')) throw badBag(MANIFEST, 'only files below data/', path);
    if (sizes.has(path)) continue;
    const url = locations.get(path)?.url;
    if (url === undefined) throw badBag(path, `the file that ${MANIFEST} lists`, 'none');
    throw badBag(
      path,
      'the file itself',
      `only where to fetch it`,
      `Fetch ${url} to that place, then repeat.`,
    );
  }
  for (const path of sizes.keys()) {
    if (path.startsWith('data/') && !payload.has(path)) {
      throw badBag(path, `only files that ${MANIFEST} lists`, 'one that it does not');
    }
  }
}

function requireOxum(info: CheckedBag['info'], payload: Manifest, sizes: ReadonlyMap<string, number>): void {
  const stated = info.filter(([label]) => label.toLowerCase() === 'payload-oxum');
  if (stated.length !== 1) throw badBag('bag-info.txt', 'one Payload-Oxum', `${stated.length}`);
  const bytes = [...payload.keys()].reduce((sum, path) => sum + (sizes.get(path) ?? 0), 0);
  const found = { bytes, files: payload.size };
  const oxum = parseOxum(stated[0]?.[1] ?? '');
  if (oxum.bytes !== found.bytes || oxum.files !== found.files) {
    throw badBag('bag-info.txt', `a payload of ${formatOxum(oxum)} (bytes.files)`, formatOxum(found));
  }
}

function requireDigest(directory: string, path: string, digest: string): void {
  const found = sha256File(join(directory, path));
  if (found !== digest) throw badBag(path, `bytes with digest ${digest}`, `bytes with digest ${found}`);
}
