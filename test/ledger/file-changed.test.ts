/** A file that is written while its digest is taken. */

import { appendFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterAll, beforeAll, expect, test, vi } from 'vitest';

// Modules are shared with other files of tests: here they are loaded anew, with another module for digests.
beforeAll(() => {
  vi.resetModules();
  vi.doMock(import('../../ledger/digest.ts'), async (original) => {
    const real = await original();
    return { ...real, digestOfDescriptor: vi.fn(real.digestOfDescriptor) };
  });
});
afterAll(() => {
  vi.doUnmock('../../ledger/digest.ts');
  vi.resetModules();
});

test('is noticed, and its digest not remembered', async () => {
  const digest = await import('../../ledger/digest.ts');
  const { makeBook, temporary } = await import('./make-book.ts');
  const { directory, remove } = temporary();
  const book = makeBook(join(directory, 'book'), { now: () => new Date(Date.now() + 3_600_000) });
  const path = join(directory, 'data.uvfits');
  writeFileSync(path, 'abc');
  const real = vi.mocked(digest.digestOfDescriptor).getMockImplementation();
  vi.mocked(digest.digestOfDescriptor).mockImplementationOnce((descriptor) => {
    const file = real?.(descriptor) ?? { digest: '', bytes: 0 };
    appendFileSync(path, 'more');
    return file;
  });
  expect(() => book.digestOfFile(path)).toThrow(
    `${path}: changed while it was read. Wait until whatever writes it has finished, then repeat.`,
  );
  expect(book.ask((index) => index.all('SELECT * FROM remembered'))).toEqual([]);
  expect(book.digestOfFile(path).bytes).toBe(7);
  book.close();
  remove();
});
