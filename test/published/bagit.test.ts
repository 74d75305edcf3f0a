/** Bags against RFC 8493 (The BagIt File Packaging Format, October 2018). */

import { execFileSync } from 'node:child_process';
import { mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { beforeAll, describe, expect, it } from 'vitest';
import { checkBag } from '../../runner/bag/check-bag.ts';
import { formatManifest, parseManifest } from '../../runner/bag/manifest.ts';
import {
  formatBagInfo,
  formatFetch,
  formatOxum,
  parseBagInfo,
  parseFetch,
  parseOxum,
} from '../../runner/bag/tag-files.ts';
import { checkWithSha256sum, filesBelow } from '../runner/bag/tiny-book.ts';
import { declaration, forgeBook } from '../runner/recorded-code/forged-book.ts';
import { document } from '../runner/test-io.ts';
import { temporaryFolder } from '../runner/test-jobs.ts';

/** A bag made by hand after RFC 8493, sections 2.1.1 to 2.1.3 and 2.2.1 to 2.2.2; its digests were computed and checked
 *  with coreutils sha256sum. The first is that of "abc", FIPS 180-4. */
const example: Readonly<Record<string, string>> = {
  'bagit.txt': 'BagIt-Version: 1.0\nTag-File-Character-Encoding: UTF-8\n',
  'bag-info.txt': 'Bagging-Date: 2024-01-01\nPayload-Oxum: 3.1\n',
  'manifest-sha256.txt': 'ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad  data/note.txt\n',
  'data/note.txt': 'abc',
};

function laid(files: Readonly<Record<string, string>>): string {
  const bag = temporaryFolder();
  for (const [path, text] of Object.entries(files)) {
    mkdirSync(dirname(join(bag, path)), { recursive: true });
    writeFileSync(join(bag, path), text);
  }
  const tags = Object.keys(files).filter((path) => !path.startsWith('data/'));
  // The tag manifest is coreutils' own: its lines are those that RFC 8493 asks for.
  writeFileSync(join(bag, 'tagmanifest-sha256.txt'), execFileSync('sha256sum', tags.sort(), { cwd: bag }));
  return bag;
}

describe('a bag that others made', () => {
  it('is read', () => {
    const checked = checkBag(laid(example));
    expect([...checked.payload]).toEqual([
      ['data/note.txt', 'ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad'],
    ]);
    expect(checked.info).toEqual([
      ['Bagging-Date', '2024-01-01'],
      ['Payload-Oxum', '3.1'],
    ]);
  });

  it('is refused when it is not complete or not valid (RFC 8493, section 3)', () => {
    expect(() => checkBag(laid({ ...example, 'data/note.txt': 'abd' }))).toThrow(
      'data/note.txt: expected bytes with digest ba7816bf',
    );
    expect(() => checkBag(laid({ ...example, 'data/more.txt': 'x' }))).toThrow(
      'data/more.txt: expected only files that manifest-sha256.txt lists',
    );
    expect(() => checkBag(laid({ ...example, 'bag-info.txt': 'Payload-Oxum: 4.1\n' }))).toThrow(
      'expected a payload of 4.1 (bytes.files), got 3.1',
    );
  });
});

describe('tag files', () => {
  it('have the lines of the RFC', () => {
    // RFC 8493, section 2.2.2: the form of Payload-Oxum, with its example.
    expect(parseOxum('279164409832.1198')).toEqual({ bytes: 279164409832, files: 1198 });
    expect(formatOxum({ bytes: 279164409832, files: 1198 })).toBe('279164409832.1198');
    // Section 2.2.2: a value may go on in the next line, after white space.
    expect(parseBagInfo('External-Description: one\n  two\nBag-Count: 1 of 15\n')).toEqual([
      ['External-Description', 'one two'],
      ['Bag-Count', '1 of 15'],
    ]);
    expect(formatBagInfo([['Contact-Name', 'A.\nKeeper']])).toBe('Contact-Name: A. Keeper\n');
    // Section 2.2.3: url length filename; an unknown length is a hyphen.
    const fetch = 'https://example.org/a 100 data/a%0Ab\nhttps://example.org/b - data/b c\n';
    expect(parseFetch(fetch).map(({ path, bytes }) => [path, bytes])).toEqual([
      ['data/a\nb', 100],
      ['data/b c', null],
    ]);
    expect(formatFetch(parseFetch(fetch))).toBe(fetch);
  });

  it('of a manifest are those of sha256sum', () => {
    const bag = temporaryFolder();
    const names = ["it's ‘ü’.txt", 'a b', 'plain'];
    for (const name of names) writeFileSync(join(bag, name), name);
    const theirs = execFileSync('sha256sum', names.sort(), { cwd: bag }).toString();
    expect(formatManifest(parseManifest(theirs, 'm'))).toBe(theirs);
  });
});

describe('our bag', () => {
  let bag = '';

  beforeAll(async () => {
    const folder = temporaryFolder();
    forgeBook(folder, { 'stages/features/features.ts': declaration });
    bag = join(folder, 'bag');
    await document(folder, ['bag', 'run', '1', '--to', bag]);
  });

  it('holds to every rule', () => {
    checkWithSha256sum(bag);
    const read = (name: string) => readFileSync(join(bag, name), 'utf8');
    // Section 2.1.1: exactly two lines, no byte order mark.
    expect(read('bagit.txt')).toBe('BagIt-Version: 1.0\nTag-File-Character-Encoding: UTF-8\n');
    const files = filesBelow(bag);
    const listed = (name: string) =>
      read(name)
        .trimEnd()
        .split('\n')
        .map((line) => line.slice(66));
    // Section 2.1.3: every payload file once in every payload manifest, with forward slashes, nothing else.
    expect(listed('manifest-sha256.txt').sort()).toEqual(
      files.filter((path) => path.startsWith('data/')).sort(),
    );
    expect(files.filter((path) => /^manifest-/.test(path))).toEqual(['manifest-sha256.txt']);
    // Section 2.2.1: a tag manifest lists no tag manifest and the other tag files.
    const tags = files.filter((path) => !path.startsWith('data/') && path !== 'tagmanifest-sha256.txt');
    expect(listed('tagmanifest-sha256.txt').sort()).toEqual(tags.sort());
    for (const name of ['manifest-sha256.txt', 'tagmanifest-sha256.txt']) {
      for (const line of read(name).trimEnd().split('\n'))
        expect(line).toMatch(/^[0-9a-f]{64} {2}[^/\s%][^%\\]*$/);
    }
    // Section 2.2.2: reserved words as they are defined; dates as YYYY-MM-DD.
    const info = new Map(parseBagInfo(read('bag-info.txt')));
    expect(info.get('Bagging-Date')).toMatch(/^\d{4}-\d\d-\d\d$/);
    expect(info.get('Payload-Oxum')).toMatch(/^\d+\.\d+$/);
    expect(info.get('External-Identifier')).toBe('book, entry 2');
    // Section 2.2.3: without fetch.txt nothing is missing.
    expect(files).not.toContain('fetch.txt');
  });
});
