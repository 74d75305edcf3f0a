/** A process that reads a book until it is told to end: node read-on.ts DIRECTORY. At the end it writes how often it asked, and
 *  the fewest and the most entries that it saw. Anything that fails ends it. */

import { audit } from '../../ledger/audit.ts';
import { openBook } from '../../ledger/book.ts';
import { contents } from '../../ledger/contents.ts';
import { findSubject } from '../../ledger/subject.ts';
import { trace } from '../../ledger/trace.ts';

const [directory = ''] = process.argv.slice(2);
let isOver = false;
process.on('SIGTERM', () => {
  isOver = true;
});
let [rounds, fewest, most] = [0, Number.POSITIVE_INFINITY, 0];

while (!isOver) {
  const book = openBook(directory);
  const count = book.count();
  if (count < most) throw new Error(`the book had ${most} entries, now ${count}`);
  if (count > 0) {
    const { document } = contents(book, { last: 5 });
    for (const { number } of document.entries) trace(book, findSubject(book, [String(number)]));
    if (document.entries.length === 0) throw new Error('no contents');
    const read = [...book.entries(Math.max(1, count - 20))].length;
    if (read < Math.min(count, 21)) throw new Error(`${read} entries after ${count - 20}`);
  }
  if (rounds % 20 === 19) {
    const { verdict, problems } = audit(book, { quick: true });
    if (verdict !== 'sound') throw new Error(JSON.stringify(problems));
  }
  book.close();
  rounds += 1;
  fewest = Math.min(fewest, count);
  most = count;
  await new Promise((resolve) => setImmediate(resolve));
}
process.stdout.write(`${rounds} ${fewest} ${most}\n`);
