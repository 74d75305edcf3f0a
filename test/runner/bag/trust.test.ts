/** Code that comes out of a bag. */

import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { computation, declaration, forgeBook } from '../recorded-code/forged-book.ts';
import { document, platebook } from '../test-io.ts';
import { temporaryFolder } from '../test-jobs.ts';

async function forgedBag(first = ''): Promise<string> {
  const folder = temporaryFolder();
  forgeBook(folder, {
    'stages/features/features.ts': declaration,
    'stages/features/compute.ts': computation(first),
  });
  await document(folder, ['bag', 'run', '1', '--to', 'bag']);
  return join(folder, 'bag');
}

describe('code out of a bag', () => {
  it('does not run by itself: the installed code does, and whose the other is stands in the answer', async () => {
    const bag = await forgedBag();
    const { status, out, err } = await platebook(temporaryFolder(), ['rerun', bag, '--json']);
    expect(status).toBe(1);
    const { verdict, differences } = JSON.parse(out);
    expect(verdict).toBe('different');
    expect(differences).toContain('ring: the code or the runtime is not the recorded one (entry 1)');
    expect(differences.at(-1)).toBe(
      '--trust-code computes with the code in the bag instead; its entries were written by M. Stranger',
    );
    expect(err).not.toContain('M. Stranger');
  });

  it('is refused where it is asked for without being trusted', async () => {
    const { status, err, out } = await platebook(temporaryFolder(), [
      'rerun',
      await forgedBag(),
      '--as-recorded',
      '--quiet',
    ]);
    expect([status, out, err]).toEqual([
      2,
      '',
      'ring: expected code that is installed here, got code out of the bag, by M. Stranger. ' +
        'Read the code in the bag; if you trust whose it is, repeat with --trust-code.\n',
    ]);
  });

  it('runs once it is trusted, after saying whose it is, and gives what it gave then', async () => {
    const { status, err, out } = await platebook(temporaryFolder(), [
      'rerun',
      await forgedBag(),
      '--trust-code',
    ]);
    expect(err).toContain(
      'The installed code is not the recorded one, so code out of the bag computes ring. Its entries were written by ' +
        'M. Stranger; it has no network and reads its inputs only.\n',
    );
    expect(out).toContain('identical: every output has the recorded bytes');
    expect(status).toBe(0);
  });

  it('has no more rights when it is trusted', async () => {
    const bag = await forgedBag("import { readFileSync } from 'node:fs'; readFileSync('/etc/hostname');");
    const { out } = await platebook(temporaryFolder(), ['rerun', bag, '--trust-code', '--json']);
    expect(JSON.parse(out).differences.join(' ')).toContain('FileSystemRead of /etc/hostname');
  });

  it('cannot be asked for where there is no bag', async () => {
    const { status, err } = await platebook(temporaryFolder(), ['rerun', '1', '--trust-code']);
    expect([status, err]).toEqual([
      2,
      '--trust-code: expected a bag, got 1. The code in a book is its keeper’s: use --as-recorded.\n',
    ]);
  });
});
