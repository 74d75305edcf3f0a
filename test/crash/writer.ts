/** What the crash harness lets a program do to a book: start it, keep outputs of several sorts, enter stages, a plate and
 *  a run, open it again and enter more. It tells of each thing that the book reported as done. Content and clock are
 *  invented and always the same. */

import { createHash } from 'node:crypto';
import { mkdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { type Book, openBook } from '../../ledger/book.ts';
import type { StageDraft, StoredFile } from '../../ledger/entry.ts';
import { entryInput, fixedClock, plateDraft, runDraft, stageDraft } from '../ledger/make-book.ts';

export type Report =
  | { readonly what: 'started' }
  | { readonly what: 'kept'; readonly digest: string }
  | { readonly what: 'entered'; readonly number: number; readonly digest: string };

export type Tell = (report: Report) => void;

/** Where things lie below the directory that the harness watches. */
export const PLACES = {
  book: 'group/2026/book',
  key: 'configuration/keys/seal.pem',
  scratch: 'scratch',
} as const;

/** Makes the files that a stage would have left. Before the layer is laid. */
export function prepare(root: string): void {
  mkdirSync(join(root, PLACES.scratch));
  for (const name of ['samples', 'data', 'late'])
    writeFileSync(join(root, PLACES.scratch, name), `${name} `.repeat(40));
}

/** Opens the harness's book as its writer. */
export function openAsWriter(root: string, announce: (text: string) => void = () => {}): Book {
  return openBook(join(root, PLACES.book), {
    by: { name: 'A. Keeper' },
    name: 'lantern',
    create: true,
    now: fixedClock(),
    // The file of the key that signs seals.
    ...{ key: join(root, PLACES.key) },
    announce,
  });
}

/** The writer. */
export function write(root: string, tell: Tell): void {
  const book = openAsWriter(root);
  tell({ what: 'started' });
  const keep = (file: StoredFile) => {
    tell({ what: 'kept', digest: file.digest });
    return file;
  };
  const stage = stageOf(book, keep, root);
  const drawn = enter(book, stage, tell);
  enter(book, plateDraft(book, drawn, 'image'), tell);
  enter(book, { ...runDraft(book, [drawn]), plates: [] }, tell);
  enter(
    book,
    stageDraft(book, { name: 'features', inputs: { image: [entryInput(book, drawn, 'image')] } }),
    tell,
  );
  book.close();
}

/** Makes a book as the first version of the program left it: with an unsigned seal, and without keys and tree. */
export function prepareFirstVersion(root: string): void {
  prepare(root);
  write(root, () => {});
  const directory = join(root, PLACES.book);
  const ledger = readFileSync(join(directory, 'ledger.jsonl'));
  const last = createHash('sha256')
    .update(ledger.subarray(ledger.lastIndexOf(0x0a, -2) + 1, -1))
    .digest('hex');
  const entries = ledger.filter((byte) => byte === 0x0a).length;
  for (const name of ['latest', 'keys', 'kept']) rmSync(join(directory, 'seals', name));
  rmSync(join(directory, 'tree'));
  writeFileSync(
    join(directory, 'seals', 'latest.json'),
    `{"book":"lantern","bytes":${ledger.length},"entries":${entries},"last":"${last}"}\n`,
  );
}

/** Opens a book that is there, and enters what was entered before once more. @param more  another run, too */
export function writeAgain(root: string, tell: Tell, more = true): void {
  const book = openAsWriter(root);
  tell({ what: 'started' });
  const stage = stageDraft(book, { name: 'fit', outputs: OUTPUTS });
  for (const { digest } of Object.values(stage.outputs)) tell({ what: 'kept', digest });
  const drawn = enter(book, stage, tell);
  if (more) enter(book, runDraft(book, [drawn]), tell);
  book.close();
}

const OUTPUTS = { image: ['svg', '<svg>an image</svg>\n'], ring: ['numbers', '{"values":{}}\n'] } as const;

/** A stage with outputs kept as bytes, one moved into the store and one copied. */
function stageOf(book: Book, keep: (file: StoredFile) => StoredFile, root: string): StageDraft {
  const draft = stageDraft(book, { name: 'fit', outputs: OUTPUTS });
  for (const file of Object.values(draft.outputs)) keep(file);
  const samples = keep(book.store.keepFile(join(root, PLACES.scratch, 'samples'), { move: true }));
  const data = keep(book.store.keepFile(join(root, PLACES.scratch, 'data')));
  const outputs = {
    ...draft.outputs,
    samples: { ...samples, format: 'fits-table' },
    data: { ...data, format: 'oifits' },
  };
  return { ...draft, outputs };
}

function enter(book: Book, draft: Parameters<Book['append']>[0], tell: Tell): number {
  const { entry, digest } = book.append(draft);
  tell({ what: 'entered', number: entry.number, digest });
  return entry.number;
}
