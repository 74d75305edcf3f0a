/** `make-small.ts BOOK`: makes `small/` anew from run 1 of a book that holds a run of recipes/lantern/small.yaml and
 *  nothing before it: the run's entries as they stand in the ledger, and the sizes of the code files that they name. */

import { writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { openBook } from '../../../../ledger/book.ts';
import { gather } from '../../../../runner/bag/gather.ts';
import { keptCode } from '../../../../runner/recorded-code/keep.ts';

const small = join(dirname(dirname(fileURLToPath(import.meta.url))), 'small');
const book = openBook(process.argv[2] ?? 'book');
const { entries } = gather(book, ['run', '1'], process.cwd());
const sizes: Record<string, number> = {};
for (const { entry } of entries) {
  if (entry.type !== 'stage') continue;
  for (const [, digest] of keptCode(entry.code)) sizes[digest] = book.store.read(digest).length;
}
const sorted = Object.fromEntries(Object.entries(sizes).sort(([a], [b]) => (a < b ? -1 : 1)));
writeFileSync(join(small, 'entries.jsonl'), entries.map(({ line }) => `${line}\n`).join(''));
writeFileSync(join(small, 'sizes.json'), `${JSON.stringify(sorted, null, 1)}\n`);
book.close();
