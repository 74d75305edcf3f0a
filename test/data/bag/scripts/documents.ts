/** The two documents that describe the bag of the small recipe, made from the committed entries of a run of it. Called as
 *  a program, writes them into the directory that it is given, for validate.py. */

import { readFileSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { sha256 } from '../../../../ledger/digest.ts';
import { parseEntry } from '../../../../ledger/ledger-file.ts';
import type { Gathered } from '../../../../runner/bag/gather.ts';
import { describePayload, digestOf } from '../../../../runner/bag/make-bag.ts';
import { entryTexts, planPayload } from '../../../../runner/bag/payload.ts';

const small = join(dirname(dirname(fileURLToPath(import.meta.url))), 'small');

/** The run of the small recipe, as `gather` hands it over. */
export function smallRun(): Gathered {
  const lines = readFileSync(join(small, 'entries.jsonl'), 'utf8').trimEnd().split('\n');
  const entries = lines.map((line) => ({ entry: parseEntry(Buffer.from(line)), digest: sha256(line), line }));
  const run = entries.map(({ entry }) => entry).find((entry) => entry.type === 'run');
  if (run?.type !== 'run') throw new Error('no run among the entries');
  return { book: run.book, subject: run.number, title: `run ${run.run}`, entries, run };
}

/** The documents by name. */
export function smallDocuments(gathered = smallRun()): Record<string, string> {
  const sizes: Record<string, number> = JSON.parse(readFileSync(join(small, 'sizes.json'), 'utf8'));
  const payload = planPayload({
    gathered,
    sizeOf: (digest) => sizes[digest] ?? null,
    locate: () => null,
    texts: entryTexts(gathered, () => null),
    digestOf,
  });
  const files = describePayload(gathered, payload, '1.2.3');
  const described = files.filter(({ role }) => role === 'description');
  return Object.fromEntries(described.map(({ name, from }) => [name, 'text' in from ? from.text : '']));
}

if (process.argv[1] === fileURLToPath(import.meta.url)) {
  for (const [name, text] of Object.entries(smallDocuments())) writeFileSync(join(process.argv[2] ?? '.', name), text);
}
