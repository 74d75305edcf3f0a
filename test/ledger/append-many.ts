/** A process that appends: node append-many.ts DIRECTORY COUNT NAME. It writes a line when the book is
 *  open, and one after each entry. */

import { dirname } from 'node:path';
import { openBook } from '../../ledger/book.ts';
import { keyFile, stageDraft } from './make-book.ts';

const [directory = '', count = '', name = ''] = process.argv.slice(2);
const key = keyFile(dirname(directory));
const book = openBook(directory, {
  by: { name },
  key,
  announce: (text) => process.stdout.write(`${text}\n`),
});
process.stdout.write('ready\n');
for (let i = 0; i < Number(count); i += 1) {
  book.append(stageDraft(book, { name: `${name}-${i}`, outputs: { image: ['fits-image', `${name} ${i}`] } }));
  process.stdout.write('entered\n');
}
book.close();
