/** Makes a bag (RFC 8493). Its bytes follow from the entries alone: no clock, no order of a directory. It is written
 *  beside its place and gets its name when it is whole. */

import {
  chmodSync,
  constants,
  copyFileSync,
  existsSync,
  mkdirSync,
  mkdtempSync,
  readdirSync,
  renameSync,
  rmSync,
  statSync,
  writeFileSync,
} from 'node:fs';
import { basename, dirname, join, resolve } from 'node:path';
import type { Book } from '../../ledger/book.ts';
import { sha256, sha256File } from '../../ledger/digest.ts';
import type { RecordedInput } from '../../ledger/entry.ts';
import { InternalError } from '../../stages/problem.ts';
import { programVersion } from '../program.ts';
import { crateOf } from './crate.ts';
import type { Gathered } from './gather.ts';
import { formatManifest } from './manifest.ts';
import { mediaTypeOf } from './media-types.ts';
import { pageText } from './page.ts';
import { entryTexts, type Payload, type PayloadFile, planPayload } from './payload.ts';
import { cannotBag, placeTaken } from './problem.ts';
import { proofsOf } from './proofs.ts';
import { provFaults } from './prov-constraints.ts';
import { provenanceOf } from './provenance.ts';
import { BAG_DECLARATION, formatBagInfo, formatFetch, formatOxum } from './tag-files.ts';

export interface BagRequest {
  readonly book: Book;
  readonly gathered: Gathered;
  /** The directory of the bag; must be free or empty. */
  readonly to: string;
  readonly inputs: 'kept' | 'reference';
  /** Where files from outside can be fetched, by their path in the recipe. */
  readonly locations: ReadonlyMap<string, string>;
  /** Where relative paths of recipes begin. */
  readonly cwd: string;
}

export interface MadeBag {
  readonly path: string;
  /** Of the payload. */
  readonly files: number;
  readonly bytes: number;
}

/** @throws RunnerProblem 'bag-not-written'; LedgerProblem 'store-missing', 'store-damaged'. Nothing is left behind then. */
export function makeBag(request: BagRequest): MadeBag {
  const at = resolve(request.to);
  requireFree(at, request.to);
  const files = payloadFiles(request);
  mkdirSync(dirname(at), { recursive: true });
  const draft = mkdtempSync(join(dirname(at), `.${basename(at)}-`));
  try {
    for (const file of files.payload.files) layFile(file, draft, request.book);
    layTags(draft, files, request.gathered);
    if (existsSync(at)) rmSync(at, { recursive: true });
    renameSync(draft, at);
  } catch (error) {
    rmSync(draft, { recursive: true, force: true });
    throw error;
  }
  return { path: at, ...sizeOf(files.payload.files) };
}

function requireFree(at: string, shown: string): void {
  const found = statSync(at, { throwIfNoEntry: false });
  if (found === undefined) return;
  if (!found.isDirectory()) throw placeTaken(shown, 'a file');
  if (readdirSync(at).length > 0) throw placeTaken(shown, 'a directory that holds something');
}

interface BagFiles {
  readonly payload: Payload;
  readonly page: string;
}

function payloadFiles(request: BagRequest): BagFiles {
  const { book, gathered } = request;
  const proofs = proofsOf(book, gathered);
  const planned = planPayload({
    gathered,
    sizeOf: (digest) => statSync(book.store.path(digest), { throwIfNoEntry: false })?.size ?? null,
    locate: (input, given) => locate(input, given, request),
    texts: [...entryTexts(gathered, (number) => proofs.documents.get(number) ?? null), ...proofs.beside],
    digestOf,
  });
  const described = describePayload(gathered, planned, programVersion);
  const page = pageText({ gathered, payload: planned, programVersion, seal: proofs.seal });
  return { payload: { ...planned, files: described }, page };
}

/** Digest and size of a text's UTF-8. */
export function digestOf(text: string) {
  return { digest: sha256(text), bytes: Buffer.byteLength(text) };
}

/** The payload with the two documents that describe it. */
export function describePayload(
  gathered: Gathered,
  { files }: Pick<Payload, 'files'>,
  programVersion: string,
): PayloadFile[] {
  const documentFile = (name: string, content: unknown, about: string): PayloadFile => {
    const text = `${JSON.stringify(content, null, 1)}\n`;
    const path = `data/${name}`;
    const own = { path, role: 'description' as const, entry: null, name, mediaType: mediaTypeOf(path) };
    return { ...own, ...digestOf(text), about, from: { text } };
  };
  const records = provenanceOf(gathered);
  const [fault] = provFaults(records);
  if (fault !== undefined) throw new InternalError('provenanceOf', fault);
  const provenance = documentFile('provenance.json', records, 'What was made from what, in PROV-JSON');
  const all = [...files, provenance];
  const crate = crateOf({ gathered, files: all, programVersion, date: dateOf(gathered) });
  return [...all, documentFile('ro-crate-metadata.json', crate, 'This description')];
}

/** The day of the newest entry. */
function dateOf({ entries }: Gathered): string {
  const times = entries.map(({ entry }) => entry.time).sort();
  return (times.at(-1) ?? '').slice(0, 10);
}

/** A file from outside: its copy in the store, or the file itself while it has the recorded bytes. */
function locate(input: RecordedInput, given: string, request: BagRequest): PayloadFile['from'] | null {
  const { book, gathered, locations, cwd } = request;
  const url = locations.get(given);
  if (url !== undefined) return { url };
  if (request.inputs === 'reference') return null;
  if (book.store.has(input)) return { digest: input.digest };
  const path = resolve(cwd, dirname(gathered.run?.recipe.path ?? '.'), given);
  const advice = 'Restore it, or make the bag with --inputs reference.';
  if (!existsSync(path))
    throw cannotBag(path, `the file with digest ${input.digest.slice(0, 12)}…`, 'none', advice);
  const { digest } = book.digestOfFile(path, { strict: true });
  if (digest === input.digest) return { file: path };
  throw cannotBag(
    path,
    `the file with digest ${input.digest.slice(0, 12)}…`,
    `one with digest ${digest.slice(0, 12)}…`,
    advice,
  );
}

/** Lays a payload file down and reads it back: what a manifest states are the bytes in the bag. */
function layFile(file: PayloadFile, draft: string, book: Book): void {
  if ('url' in file.from) return;
  const to = join(draft, file.path);
  mkdirSync(dirname(to), { recursive: true });
  if ('text' in file.from) writeFileSync(to, file.from.text);
  else copyTo(to, 'digest' in file.from ? book.store.path(file.from.digest) : file.from.file, file);
}

function copyTo(to: string, from: string, file: PayloadFile): void {
  if (!existsSync(from)) throw cannotBag(from, `the file of ${file.path}`, 'none', 'Audit the book.');
  copyFileSync(from, to, constants.COPYFILE_FICLONE);
  // A copy takes the mode of the store's file over, which nobody may write.
  chmodSync(to, 0o644);
  const found = sha256File(to);
  if (found === file.digest && statSync(to).size === file.bytes) return;
  throw cannotBag(from, `bytes with digest ${file.digest}`, `bytes with digest ${found}`, 'Audit the book.');
}

function layTags(draft: string, { payload, page }: BagFiles, gathered: Gathered): void {
  const manifest = formatManifest(new Map(payload.files.map(({ path, digest }) => [path, digest])));
  const fetched = payload.files.flatMap(({ path, bytes, from }) =>
    'url' in from ? [{ url: from.url, bytes, path }] : [],
  );
  const tags: Record<string, string> = {
    'bagit.txt': BAG_DECLARATION,
    'bag-info.txt': formatBagInfo([
      ['External-Identifier', `${gathered.book}, entry ${gathered.subject}`],
      ['External-Description', `${gathered.title} of the book ${gathered.book}`],
      ['Bagging-Date', dateOf(gathered)],
      ['Payload-Oxum', formatOxum(sizeOf(payload.files))],
      ['Bag-Software-Agent', `Platebook ${programVersion}`],
      ['Platebook-Entry', String(gathered.subject)],
    ]),
    'manifest-sha256.txt': manifest,
    'README.txt': page,
    ...(fetched.length === 0 ? {} : { 'fetch.txt': formatFetch(fetched) }),
  };
  for (const [name, text] of Object.entries(tags)) writeFileSync(join(draft, name), text);
  const digests = new Map(Object.entries(tags).map(([name, text]) => [name, sha256(text)]));
  writeFileSync(join(draft, 'tagmanifest-sha256.txt'), formatManifest(digests));
}

function sizeOf(files: readonly PayloadFile[]): { files: number; bytes: number } {
  return { files: files.length, bytes: files.reduce((sum, { bytes }) => sum + bytes, 0) };
}
