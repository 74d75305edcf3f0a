/** What a command prints, and the files that it lays down: whole, or said not to be. */

import { spawnSync } from 'node:child_process';
import { existsSync, mkdirSync, readdirSync, readFileSync, statSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { describe, expect, test } from 'vitest';
import { writeWhole } from '../../runner/write-whole.ts';
import { temporaryFolder } from './test-jobs.ts';

const program = fileURLToPath(new URL('../../bin/platebook.js', import.meta.url));

/** Runs a line of the shell in which `platebook` is the program. */
function shell(line: string) {
  const { status, stdout, stderr } = spawnSync(
    'bash',
    ['-c', `set -o pipefail; platebook() { "${process.execPath}" "${program}" "$@"; }; ${line}`],
    { encoding: 'utf8', cwd: temporaryFolder() },
  );
  return { status, out: stdout, err: stderr };
}

describe('what is printed', () => {
  test('may be read in part: nothing is complained of', () => {
    expect(shell('platebook kinds --json | head -c 1')).toEqual({ status: 0, out: '{', err: '' });
    expect(shell('platebook kinds --json >&-')).toEqual({ status: 0, out: '', err: '' });
  });

  // A device of Linux that is always full.
  test.skipIf(!existsSync('/dev/full'))('is said not to be whole where it finds no room', () => {
    expect(shell('platebook kinds --json > /dev/full')).toEqual({
      status: 1,
      out: '',
      err: 'standard output: cannot be written (no space left on the disk). Mend the cause and repeat.\n',
    });
    expect(shell('platebook kinds --json 2> /dev/full').status).toBe(0);
    expect(shell('platebook trace nothing 2> /dev/full')).toEqual({ status: 2, out: '', err: '' });
  });
});

// Common practice: no stack of calls reaches a user.
test('a process that cannot be started is a sentence', () => {
  const recipe = fileURLToPath(new URL('../../recipes/lantern/small.yaml', import.meta.url));
  const { status, err } = shell(`ulimit -n 28; platebook run "${recipe}"`);
  expect(status).toBe(1);
  expect(err.split('\n').at(-2)).toMatch(
    /: too many files are open \(EMFILE\)\. Allow more open files \(`ulimit -n`\), and repeat: what is finished is carried forward\.$/,
  );
  expect(err).not.toContain('    at ');
});

describe('a file for people', () => {
  test('is replaced whole, and left alone where it has the bytes already', () => {
    const path = join(temporaryFolder(), 'numbers.json');
    writeWhole(path, Buffer.from('one'));
    const before = statSync(path);
    writeWhole(path, Buffer.from('one'));
    expect(statSync(path).ino).toBe(before.ino);
    writeWhole(path, Buffer.from('two'));
    expect(readFileSync(path, 'utf8')).toBe('two');
    expect(readdirSync(join(path, '..'))).toEqual(['numbers.json']);
  });

  test('stays what it was where the new one cannot be written', () => {
    const folder = temporaryFolder();
    const path = join(folder, 'ring.png');
    writeFileSync(path, 'as it was');
    // In the way of what is written first.
    mkdirSync(join(folder, `.ring.png.${process.pid}.part`));
    expect(() => writeWhole(path, Buffer.from('as it should be'))).toThrow('EISDIR');
    expect(readFileSync(path, 'utf8')).toBe('as it was');
  });
});
