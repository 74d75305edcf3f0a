/** The book on a disk that fills up, is read-only, or is closed to the user: a clear error, and nothing lost. */

import { chmodSync, mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { describe, expect, test } from 'vitest';
import { audit } from '../../ledger/audit.ts';
import { openBook } from '../../ledger/book.ts';
import { LedgerProblem } from '../../ledger/problem.ts';
import { keyFile, stageDraft } from '../ledger/make-book.ts';
import {
  asNobody,
  canBecomeNobody,
  canMount,
  platebook,
  SMALL_RECIPE,
  type SmallDisk,
  STACK_TRACE,
  withSmallDisk,
} from './small-disk.ts';

const enough = 'size=64m';
const newFolder = () => mkdtempSync(join(tmpdir(), 'platebook-long-'));
/** Others may pass through the tests' own folder. */
const openUp = () => chmodSync(tmpdir(), 0o755);

describe.skipIf(!canMount())('a disk that fills up', () => {
  /** Appends until the disk is full. @returns how many entries were reported as written */
  function appendUntilFull(directory: string, key: string): number {
    const book = openBook(directory, { by: { name: 'A. Keeper' }, key, create: true });
    let entered = 0;
    try {
      for (;;) {
        book.append(
          stageDraft(book, { outputs: { image: ['fits-image', `picture ${entered} `.repeat(40)] } }),
        );
        entered += 1;
      }
    } catch (error) {
      expect(error).toBeInstanceOf(LedgerProblem);
      expect((error as LedgerProblem).code).toBe('cannot-write');
      expect((error as Error).message).toMatch(/no space left on the disk/);
      return entered;
    } finally {
      book.close();
    }
  }

  test('keeps every entry that was reported, whatever the write was that found no room', () => {
    const key = keyFile(newFolder());
    const counts: number[] = [];
    for (let kilobytes = 120; kilobytes <= 600; kilobytes += 12) {
      withSmallDisk(kilobytes, (disk) => {
        const directory = join(disk.path, 'book');
        let entered: number;
        try {
          entered = appendUntilFull(directory, key);
        } catch (error) {
          // Too small to start a book.
          expect((error as LedgerProblem).code).toBe('cannot-write');
          disk.remount(enough);
          expect(appendSome(directory, key)).toBe(1);
          return;
        }
        const asked = openBook(directory);
        expect({ kilobytes, count: asked.count() }).toEqual({ kilobytes, count: entered });
        asked.close();
        disk.remount(enough);
        const book = openBook(directory, { by: { name: 'A. Keeper' }, key });
        expect(book.count()).toBe(entered);
        expect(audit(book)).toMatchObject({ verdict: 'sound', entries: entered, problems: [] });
        expect(book.append(stageDraft(book)).entry.number).toBe(entered + 1);
        expect(audit(book)).toMatchObject({ verdict: 'sound', problems: [] });
        book.close();
        counts.push(entered);
      });
    }
    console.log(
      `full disks: ${counts.length} sizes, ${Math.min(...counts)} to ${Math.max(...counts)} entries`,
    );
    expect(new Set(counts).size).toBeGreaterThan(10);
  });

  function appendSome(directory: string, key: string): number {
    const book = openBook(directory, { by: { name: 'A. Keeper' }, key, create: true });
    const { number } = book.append(stageDraft(book)).entry;
    expect(audit(book)).toMatchObject({ verdict: 'sound', problems: [] });
    book.close();
    return number;
  }

  test('ends a run with status 1 and a clear message, and the run goes on where there is room again', () => {
    const folder = newFolder();
    withSmallDisk(64, (disk) => {
      const book = join(disk.path, 'book');
      const run = () =>
        platebook(
          ['run', SMALL_RECIPE, '--book', book, '--plates', join(folder, 'plates'), '--quiet'],
          folder,
        );
      const failures: string[] = [];
      for (let kilobytes = 64; ; kilobytes = Math.ceil(kilobytes * 1.35)) {
        disk.remount(`size=${kilobytes}k`);
        const { status, err } = run();
        if (status === 0) break;
        expect(status, err).toBe(1);
        expect(err).toMatch(/no space left|disk is full/);
        expect(err).not.toMatch(STACK_TRACE);
        failures.push(`${kilobytes} kB: ${err.trim().split('\n').at(-1)}`);
        // Still full: a reader needs no room.
        const audited = platebook(['audit', '--book', book], folder);
        if (/there is no book here/.test(audited.err)) continue;
        expect(audited.out + audited.err).toMatch(/: sound/);
        expect(audited.status).toBe(0);
      }
      console.log(failures.join('\n'));
      expect(failures.length).toBeGreaterThan(5);
      expect(platebook(['audit', '--book', book], folder).out).toMatch(/: sound/);
    });
  });

  test('says so when the plates find no room, and makes them when there is', () => {
    const folder = newFolder();
    withSmallDisk(16, (disk) => {
      const words = ['run', SMALL_RECIPE, '--quiet', '--plates', join(disk.path, 'plates')];
      const failed = platebook(words, folder);
      expect(failed.err).toMatch(/plates.*no space left on the disk/s);
      expect(failed.err).not.toMatch(STACK_TRACE);
      expect(failed.status).toBe(1);
      expect(platebook(['audit'], folder).out).toMatch(/: sound/);
      disk.remount(enough);
      expect(platebook(words, folder).status).toBe(0);
    });
  });
});

describe.skipIf(!canMount())('a disk that is read-only', () => {
  const filled = (disk: SmallDisk) => {
    const key = keyFile(newFolder());
    const directory = join(disk.path, 'book');
    const book = openBook(directory, { by: { name: 'A. Keeper' }, key, create: true });
    for (let i = 0; i < 3; i += 1) book.append(stageDraft(book));
    book.close();
    return { key, directory };
  };

  test.each(['with its index', 'without an index'])('is read, %s', (how) => {
    withSmallDisk(4096, (disk) => {
      const { directory } = filled(disk);
      const folder = newFolder();
      if (how === 'without an index')
        for (const suffix of ['', '-wal', '-shm'])
          rmSync(`${directory}/index.sqlite${suffix}`, { force: true });
      disk.remount('ro');
      for (const words of [['contents'], ['trace', '2'], ['audit'], ['reach', '1']]) {
        const { status, err } = platebook([...words, '--book', directory], folder);
        expect({
          words,
          status,
          err:
            how === 'with its index'
              ? err
              : err.replace(/^The index of the book cannot be kept where it lies: .*\n/, ''),
        }).toEqual({
          words,
          status: 0,
          err: '',
        });
      }
    });
  });

  test('is not written to', () => {
    withSmallDisk(4096, (disk) => {
      const { directory, key } = filled(disk);
      const folder = newFolder();
      disk.remount('ro');
      for (const words of [
        ['withdraw', '2', '--reason', 'a test'],
        ['run', SMALL_RECIPE, '--quiet'],
      ]) {
        const { status, err } = platebook([...words, '--book', directory], folder, { PLATEBOOK_KEY: key });
        expect(err).toMatch(/cannot be written \(the file system is read-only\)/);
        expect(err).not.toMatch(STACK_TRACE);
        expect(status).toBe(1);
      }
      disk.remount('rw');
      expect(platebook(['audit', '--book', directory], folder).out).toMatch(/3 entries.*sound|sound/s);
    });
  });
});

describe.skipIf(!canBecomeNobody())('somebody without rights', () => {
  const filled = () => {
    openUp();
    const folder = newFolder();
    chmodSync(folder, 0o755);
    const directory = join(folder, 'book');
    const book = openBook(directory, { by: { name: 'A. Keeper' }, key: keyFile(newFolder()), create: true });
    for (let i = 0; i < 3; i += 1) book.append(stageDraft(book));
    book.close();
    return { folder, directory };
  };

  test('reads a book that is open to all, and is told why nothing can be written', () => {
    const { folder, directory } = filled();
    const own = newFolder();
    chmodSync(own, 0o777);
    const env = { PLATEBOOK_KEY: join(own, 'key.pem'), HOME: own };
    for (const words of [['contents'], ['trace', '2'], ['audit']]) {
      expect({ words, ...asNobody([...words, '--book', directory], folder, env) }).toMatchObject({
        words,
        status: 0,
        err: '',
      });
    }
    const { status, err } = asNobody(['withdraw', '2', '--reason', 'a test', '--book', directory], own, env);
    expect(err).toMatch(/cannot be written \(permission denied\)/);
    expect(err).not.toMatch(STACK_TRACE);
    expect(status).toBe(1);
  });

  test('is told that a closed book cannot be read', () => {
    const { directory } = filled();
    chmodSync(directory, 0o700);
    for (const words of [['contents'], ['audit'], ['trace', '1']]) {
      const { status, err } = asNobody([...words, '--book', directory], tmpdir());
      expect(err).toMatch(/permission denied/);
      expect(err).not.toMatch(STACK_TRACE);
      expect(status).not.toBe(0);
    }
  });
});
