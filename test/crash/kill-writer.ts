/** The writer that the crash tests kill: node kill-writer.ts ROOT STEP [half] [again] ['rename before write']. It kills itself (SIGKILL) just
 *  before the step, or with `half` when the write that is the step is half done, and ends with status 0 when there is no
 *  such step. With `again` it goes on with a book that is there; the last word breaks it on purpose. What the book reports as done goes to standard output,
 *  one line of JSON each with the number of steps so far; a last line says which steps are writes. */

import { writeSync } from 'node:fs';
import { installLayer } from './file-layer.ts';
import { type Report, write, writeAgain } from './writer.ts';

export type Line = (
  | Report
  | { readonly what: 'ended'; readonly writes: readonly number[]; readonly lines: readonly number[] }
) & {
  readonly steps: number;
};

const [root = '', step = '', ...words] = process.argv.slice(2);
const writes: number[] = [];
/** Those of them that write to the ledger. */
const lines: number[] = [];
const layer = installLayer({
  root,
  stop: { at: Number(step), how: words.includes('half') ? 'kill half' : 'kill' },
  ...(words.includes('rename before write') ? { sabotage: 'rename before write' } : {}),
  onStep({ op }, number, path) {
    if (op === 'write') writes.push(number);
    if (op === 'write' && path.endsWith('/ledger.jsonl')) lines.push(number);
  },
});
const say = (line: Line) => writeSync(1, `${JSON.stringify(line)}\n`);
(words.includes('again') ? writeAgain : write)(root, (report) => say({ ...report, steps: layer.steps() }));
say({ what: 'ended', writes, lines, steps: layer.steps() });
