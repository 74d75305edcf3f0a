/** How long the book takes: node test/bench/ledger.ts. Entries of about 900 bytes; times in milliseconds. */

import { closeSync, fsyncSync, openSync, rmSync, writeFileSync, writeSync } from 'node:fs';
import { join } from 'node:path';
import { audit } from '../../ledger/audit.ts';
import { openBook } from '../../ledger/book.ts';
import { canonicalJson } from '../../ledger/canonical.ts';
import { sha256 } from '../../ledger/digest.ts';
import type { Json } from '../../ledger/entry.ts';
import { firstVersionPath, sealPath } from '../../ledger/seal.ts';
import { makeBook, stageDraft, temporary } from '../ledger/make-book.ts';

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

/** A book of many entries, written without its index. */
function writeLargeBook(at: string): string {
  const book = makeBook(at);
  const draft = stageDraft(book);
  book.close();
  let before = sha256('');
  const lines: string[] = [];
  for (let number = 1; number <= ENTRIES; number += 1) {
    const common = {
      book: 'lantern',
      number,
      before,
      time: '2026-01-02T03:04:05.678Z',
      by: { name: 'A. Keeper' },
    };
    const line = canonicalJson({ ...draft, ...common, key: sha256(String(number)) } as unknown as Json);
    before = sha256(line);
    lines.push(`${line}\n`);
  }
  const ledger = Buffer.from(lines.join(''));
  writeFileSync(join(at, 'ledger.jsonl'), ledger);
  const seal = { book: 'lantern', bytes: ledger.length, entries: ENTRIES, last: before };
  // A seal of the first version, without root and signature: the book is taken up and sealed anew when it is opened.
  rmSync(sealPath(at));
  writeFileSync(firstVersionPath(at), canonicalJson(seal));
  return at;
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

const large = writeLargeBook(join(directory, 'large'));
const key = (i: number) => sha256(String(1 + ((i * 7919) % ENTRIES)));
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
const book = openBook(large, { by: { name: 'A. Keeper' } });
measure('findStage', 1000, (i) => book.findStage(key(i)));
measure('entry', 1000, (i) => book.entry(1 + ((i * 7919) % ENTRIES)));
measure('all entries', 3, () => [...book.entries()].length);
measure('append', 50, () => book.append(draft));
measure('audit', 3, () => audit(book));
book.close();
remove();
