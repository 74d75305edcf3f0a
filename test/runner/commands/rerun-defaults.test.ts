/** A rerun of a stage that was recorded before its kind had a parameter: the default holds, and that is said. */

import { join } from 'node:path';
import { expect, test } from 'vitest';
import { openBook } from '../../../ledger/book.ts';
import { sha256 } from '../../../ledger/digest.ts';
import type { StageEntry } from '../../../ledger/entry.ts';
import { tinyBook } from '../bag/tiny-book.ts';
import { platebook } from '../test-io.ts';

test('a parameter that came since has its default, and the text names it', async () => {
  const folder = await tinyBook();
  const book = openBook(join(folder, 'book'), { by: { name: 'A. Tester' } });
  const stages = [1, 2].map((number) => book.entry(number) as StageEntry);
  const library = stages.find(({ name }) => name === 'library') as StageEntry;
  const { copyScale, ...parameters } = library.parameters;
  expect(copyScale).toBeDefined();
  const code = { ...library.code, digest: sha256('the code of then') };
  const { entry } = book.append({ ...library, parameters, code, key: sha256('then') });
  book.close();
  const { status, out, err } = await platebook(folder, ['rerun', String(entry.number)]);
  expect(err).not.toContain('failed');
  const said = out.replace(/\s+/g, ' ');
  expect(said).toContain(
    `library: the kind has had copyScale only since (entry ${entry.number}); the default holds`,
  );
  expect(said).toContain('identical: every output has the recorded bytes');
  expect(status).toBe(0);
});
