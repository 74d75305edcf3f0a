/** How long the book takes: node test/bench/ledger.ts. Times in milliseconds; entries of the larger book
 *  as a pipeline writes them, some 10 kB each. A million entries: million.ts. */

import { closeSync, fsyncSync, openSync, writeSync } from 'node:fs';
import { join } from 'node:path';
import { audit } from '../../ledger/audit.ts';
import { openBook } from '../../ledger/book.ts';
import { canonicalJson } from '../../ledger/canonical.ts';
import { sha256 } from '../../ledger/digest.ts';
import type { Json } from '../../ledger/entry.ts';
import { keyFile, makeBook, stageDraft, temporary } from '../ledger/make-book.ts';
import { writeManyRuns } from './many-runs.ts';

const ENTRIES = 10_000;
const { directory, remove } = temporary();

function measure(what: string, count: number, work: (i: number) => unknown): void {
  const times: number[] = [];
  for (let i = 0; i < count; i += 1) {
    const start = performance.now();
    work(i);
    times.push(performance.now() - start);
  }
  times.sort((a, b) => a - b);
  const [least, middle] = [times[0] ?? 0, times[count >> 1] ?? 0];
  console.log(
    `${what.padEnd(60)} min ${least.toFixed(3).padStart(9)}   median ${middle.toFixed(3).padStart(9)}`,
  );
}

console.log(`node ${process.version}, ${process.arch}`);

const small = makeBook(join(directory, 'small'));
const draft = stageDraft(small);
for (let i = 0; i < 20; i += 1) small.append(draft);
measure('append', 200, () => small.append(draft));
const line = Buffer.from(`${canonicalJson(small.entry(1) as unknown as Json)}\n`);
const bare = openSync(join(directory, 'bare'), 'a');
measure('bare append of the same line and fsync', 200, () => {
  writeSync(bare, line);
  fsyncSync(bare);
});
closeSync(bare);
small.close();

const large = join(directory, 'large');
writeManyRuns(large, ENTRIES, keyFile(directory));
const key = (i: number) => sha256(`key ${1 + ((i * 7919) % ENTRIES)}`);
measure(`first question, index made anew, ${ENTRIES} entries`, 1, () => {
  const book = openBook(large);
  book.count();
  book.close();
});
measure('open and close', 100, () => openBook(large).close());
measure('open, findStage, close', 100, (i) => {
  const book = openBook(large);
  book.findStage(key(i));
  book.close();
});
const book = openBook(large, { by: { name: 'A. Keeper' }, key: keyFile(directory) });
const another = stageDraft(book);
measure('findStage', 1000, (i) => book.findStage(key(i)));
measure('entry', 1000, (i) => book.entry(1 + ((i * 7919) % ENTRIES)));
measure('all entries', 3, () => [...book.entries()].length);
measure('append', 50, () => book.append(another));
measure('audit', 3, () => audit(book));
book.close();
remove();
