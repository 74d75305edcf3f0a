/** Bags of a book that goes on: the seal that they rest on, and what is withdrawn later. */

import { cpSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { beforeAll, describe, expect, it } from 'vitest';
import { openBook } from '../../../ledger/book.ts';
import { gather } from '../../../runner/bag/gather.ts';
import { proofsOf } from '../../../runner/bag/proofs.ts';
import { document, platebook } from '../test-io.ts';
import { temporaryFolder } from '../test-jobs.ts';
import { filesBelow, tinyBook } from './tiny-book.ts';

let folder = '';
let bag = '';

beforeAll(async () => {
  folder = await tinyBook();
  await document(folder, ['bag', 'run', '1', '--to', 'bag']);
  bag = join(folder, 'bag');
});

describe('a bag', () => {
  it('rests on the latest seal, which its page names; when the book has grown, nothing else differs', async () => {
    const grown = temporaryFolder();
    for (const path of ['book', 'data', 'tiny.yaml'])
      cpSync(join(folder, path), join(grown, path), { recursive: true });
    expect((await platebook(grown, ['run', 'tiny.yaml'])).status).toBe(0);
    for (const to of ['bag', 'again']) await document(grown, ['bag', 'run', '1', '--to', to]);
    const bytes = (at: string, path: string) => readFileSync(join(at, path));
    const [later, again] = [join(grown, 'bag'), join(grown, 'again')];
    for (const path of filesBelow(later)) expect(bytes(again, path), path).toEqual(bytes(later, path));
    expect(filesBelow(later)).toEqual(filesBelow(bag));
    const differing = filesBelow(bag).filter((path) => !bytes(bag, path).equals(bytes(later, path)));
    const sealed = (path: string) => !/^data\/(proofs\/|seal\.txt|ro-crate-metadata\.json)/.test(path);
    // Payload-Oxum counts the proofs, which grow with the tree.
    expect(differing.filter((path) => path.startsWith('data/') && sealed(path))).toEqual([]);
    const time = /^time (\S+)$/m.exec(bytes(later, 'data/seal.txt').toString())?.[1];
    const page = bytes(later, 'README.txt').toString();
    expect(page).toContain(`The proofs rest on the seal of 5 entries, of ${time}: the latest when`);
  });

  it('rests on one seal when others write while it is made', () => {
    const directory = join(temporaryFolder(), 'book');
    cpSync(join(folder, 'book'), directory, { recursive: true });
    const book = openBook(directory, { by: { name: 'A. Tester' } });
    const entry: typeof book.entry = (number) => {
      book.append({ type: 'withdrawal', withdraws: 1, reason: 'another process' });
      return book.entry(number);
    };
    const { documents, beside } = proofsOf({ ...book, entry }, gather(book, ['run', '1'], folder));
    book.close();
    const seals = new Set([...documents.values()].map((text) => JSON.parse(text).checkpoint));
    expect([...seals]).toEqual([beside[0]?.text]);
  });

  it('says that its plate’s run is withdrawn, and so do trace and contents', async () => {
    const withdrawn = temporaryFolder();
    for (const path of ['book', 'data'])
      cpSync(join(folder, path), join(withdrawn, path), { recursive: true });
    const words = ['withdraw', 'run', '1', '--reason', 'the recipe was meant for another field'];
    expect((await platebook(withdrawn, words)).status).toBe(0);
    expect((await platebook(withdrawn, ['bag', '3', '--to', 'bag'])).status).toBe(0);
    expect(readFileSync(join(withdrawn, 'bag', 'README.txt'), 'utf8')).toContain(
      'Do not rely on what depends on these:\n\n  entry 4, by A. Tester: the recipe was meant for another field\n',
    );
    expect((await platebook(withdrawn, ['trace', '3'])).out).toContain('DEPENDS ON SOMETHING WITHDRAWN:');
    expect((await platebook(withdrawn, ['contents', '--type', 'plate'])).out).toMatch(/^ +3 .*†$/m);
  });
});
