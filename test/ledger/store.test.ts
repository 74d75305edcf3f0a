/** The store, and the digests of files outside it. */

import {
  appendFileSync,
  existsSync,
  mkdirSync,
  readdirSync,
  readFileSync,
  renameSync,
  rmSync,
  statSync,
  symlinkSync,
  utimesSync,
  writeFileSync,
} from 'node:fs';
import { join } from 'node:path';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { type Book, openBook } from '../../ledger/book.ts';
import { listStore, openStore, type Store, sweepStore } from '../../ledger/store.ts';
import { makeBook, temporary } from './make-book.ts';

// Source: FIPS 180-4; NIST's example values.
const ABC = { digest: 'ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad', bytes: 3 };

let directory: string;
let remove: () => void;
let store: Store;

beforeEach(() => {
  ({ directory, remove } = temporary());
  mkdirSync(join(directory, 'store'));
  store = openStore(join(directory, 'store'));
});

afterEach(() => remove());

describe('the store', () => {
  const path = () => join(directory, 'store/ba7', ABC.digest);

  test('keeps bytes, text and files under their digest, read-only', () => {
    writeFileSync(join(directory, 'file'), 'abc');
    for (const keep of [
      () => store.keepBytes('abc'),
      () => store.keepBytes(Buffer.from('abc')),
      () => store.keepFile(join(directory, 'file')),
      () => store.keepFile(join(directory, 'file'), { move: true }),
    ]) {
      rmSync(join(directory, 'store'), { recursive: true });
      mkdirSync(join(directory, 'store'));
      expect(store.has(ABC)).toBe(false);
      expect(keep()).toEqual(ABC);
      expect(store.path(ABC.digest)).toBe(path());
      expect(readFileSync(path(), 'utf8')).toBe('abc');
      expect(statSync(path()).mode & 0o777).toBe(0o444);
      expect(store.has(ABC)).toBe(true);
      expect(store.has({ ...ABC, bytes: 4 })).toBe(false);
      expect(readdirSync(join(directory, 'store/new'))).toEqual([]);
    }
    expect(existsSync(join(directory, 'file'))).toBe(false);
  });

  test('does not write again what stands, and replaces what was cut short', () => {
    store.keepBytes('abc');
    const { ino } = statSync(path());
    writeFileSync(join(directory, 'file'), 'abc');
    store.keepBytes('abc');
    store.keepFile(join(directory, 'file'));
    expect(statSync(path()).ino).toBe(ino);
    rmSync(path());
    writeFileSync(path(), 'ab');
    store.keepFile(join(directory, 'file'));
    expect(readFileSync(path(), 'utf8')).toBe('abc');
  });

  test('reads bytes and holds them against the digest', () => {
    store.keepBytes('abc');
    expect(store.read(ABC.digest).toString()).toBe('abc');
    rmSync(path());
    expect(() => store.read(ABC.digest)).toThrow(
      `${path()}: the store has no such file. Run the recipe again, or take the file from a copy of the book.`,
    );
    writeFileSync(path(), 'abd');
    expect(() => store.read(ABC.digest)).toThrow(`${path()}: expected bytes of the digest in its name, got`);
  });

  test.each(['', '../../etc/passwd', ABC.digest.toUpperCase(), `${ABC.digest}/`])(
    'has no path for %j',
    (digest) => {
      expect(() => store.path(digest)).toThrow('Expected a digest, 64 hexadecimal digits in lower case');
    },
  );

  test('tells of a file that cannot be read', () => {
    expect(() => store.keepFile(join(directory, 'nowhere'))).toThrow(
      `${join(directory, 'nowhere')}: cannot be read (no such file). Check the path and the permissions.`,
    );
    expect(() => store.keepFile(directory)).toThrow('cannot be read');
    expect(readdirSync(join(directory, 'store/new'))).toEqual([]);
  });

  test('lists its files, and what does not belong', () => {
    store.keepBytes('abc');
    writeFileSync(join(directory, 'store/stray'), '');
    writeFileSync(join(directory, 'store/ba7/short'), '');
    mkdirSync(join(directory, 'store/000'));
    writeFileSync(join(directory, 'store/000', ABC.digest), 'abc');
    expect(listStore(join(directory, 'store'))).toEqual({
      digests: [ABC.digest],
      others: [`000/${ABC.digest}`, 'ba7/short', 'stray'],
    });
  });

  test('sweeps what a crash left a day ago', () => {
    mkdirSync(join(directory, 'store/new'));
    for (const name of ['old', 'young']) writeFileSync(join(directory, 'store/new', name), 'half');
    const now = Date.now();
    utimesSync(join(directory, 'store/new/old'), now / 1000 - 90_000, now / 1000 - 90_000);
    sweepStore(join(directory, 'store'), now);
    expect(readdirSync(join(directory, 'store/new'))).toEqual(['young']);
  });
});

describe('the digest of a file outside', () => {
  let book: Book;
  let path: string;
  const later = () => new Date(Date.now() + 3_600_000);
  const remembered = () =>
    book.ask((index) => index.all<{ path: string; digest: string }>('SELECT * FROM remembered'));

  beforeEach(() => {
    book = makeBook(join(directory, 'book'), { now: later });
    path = join(directory, 'data.uvfits');
    writeFileSync(path, 'abc');
  });

  afterEach(() => book.close());

  test('is taken, and remembered', () => {
    expect(book.digestOfFile(path)).toEqual(ABC);
    expect(remembered()).toMatchObject([{ path, digest: ABC.digest }]);
    expect(book.digestOfFile(path)).toEqual(ABC);
    book.close();
    const again = openBook(book.directory);
    expect(again.digestOfFile(path)).toEqual(ABC);
    again.close();
  });

  test('is taken from memory while nothing changed, and with strict from the file', () => {
    book.digestOfFile(path);
    book.ask((index) => index.all("UPDATE remembered SET digest = 'remembered'"));
    expect(book.digestOfFile(path).digest).toBe('remembered');
    expect(book.digestOfFile(path, { strict: true })).toEqual(ABC);
    expect(book.digestOfFile(path)).toEqual(ABC);
  });

  test.each<[string, () => void]>([
    ['grew', () => appendFileSync(path, 'd')],
    ['was written again with the same size', () => writeFileSync(path, 'abd')],
    [
      'was exchanged for another of the same size and times',
      () => {
        const { atime, mtime } = statSync(path);
        writeFileSync(join(directory, 'other'), 'abd');
        utimesSync(join(directory, 'other'), atime, mtime);
        renameSync(join(directory, 'other'), path);
      },
    ],
  ])('is taken anew when the file %s', (_, change) => {
    book.digestOfFile(path);
    book.ask((index) => index.all("UPDATE remembered SET digest = 'remembered'"));
    // Steps of the file system's clock.
    const written = statSync(path).ctimeMs;
    do change();
    while (statSync(path).ctimeMs === written && statSync(path).size === 3);
    const { digest } = book.digestOfFile(path);
    expect(digest).not.toBe('remembered');
    expect(digest).not.toBe(ABC.digest);
  });

  test('is not remembered so shortly after a change that another could hide', () => {
    const hasty = makeBook(join(directory, 'hasty'), { now: () => new Date() });
    expect(hasty.digestOfFile(path)).toEqual(ABC);
    expect(hasty.ask((index) => index.all('SELECT * FROM remembered'))).toEqual([]);
    hasty.close();
  });

  test('follows a link', () => {
    symlinkSync(path, join(directory, 'link'));
    expect(book.digestOfFile(join(directory, 'link'))).toEqual(ABC);
  });

  test('is refused for what is no file', () => {
    expect(() => book.digestOfFile(join(directory, 'nowhere'))).toThrow('cannot be read (no such file)');
    expect(() => book.digestOfFile(directory)).toThrow('cannot be read (it is a directory)');
    expect(() => book.digestOfFile('/dev/null')).toThrow('cannot be read (it is no regular file)');
  });
});
