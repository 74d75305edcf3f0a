/** The key that signs seals is the one that the environment of the command line names, in every command that writes. */

import { existsSync } from 'node:fs';
import { join } from 'node:path';
import { beforeAll, expect, test } from 'vitest';
import type { Io } from '../../../runner/command.ts';
import { main } from '../../../runner/main.ts';
import { tinyBook } from '../bag/tiny-book.ts';
import { keepingIo } from './book-io.ts';

let folder = '';

beforeAll(async () => {
  folder = await tinyBook();
  expect(await write(['bag', 'run', '1', '--to', 'bag'], 'none.pem')).toBe(0);
});

function write(words: readonly string[], key: string): Promise<number> {
  const env = { PLATEBOOK_BY: 'B. Reader', PLATEBOOK_KEY: join(folder, key) };
  const io: Io = { ...keepingIo(folder), env };
  return main(words, io, new AbortController().signal);
}

test.each([
  ['run', ['run', 'tiny.yaml']],
  ['rerun', ['rerun', '2']],
  ['bag', ['bag', 'bag', '--into', 'other']],
  ['withdraw', ['withdraw', '2', '--reason', 'invented']],
  ['countersign', ['countersign', '1']],
])('%s', async (name, words) => {
  expect(await write(words, `${name}.pem`)).toBe(0);
  expect(existsSync(join(folder, `${name}.pem`))).toBe(true);
});

test('a bag is made without a key', () => {
  expect(existsSync(join(folder, 'none.pem'))).toBe(false);
});
