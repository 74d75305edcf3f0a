/** Small disks for tests: a tmpfs of a stated size, and the command line in a process of its own. Mounting needs rights that not
 *  every machine gives; tests then say that they were left out. */

import { execFileSync, spawnSync } from 'node:child_process';
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';

const root = dirname(dirname(dirname(fileURLToPath(import.meta.url))));
export const PROGRAM = join(root, 'bin', 'platebook.js');
export const SMALL_RECIPE = join(root, 'recipes', 'lantern', 'small.yaml');
/** The user and group without rights of Debian and most others. */
const NOBODY = '65534';

export interface SmallDisk {
  readonly path: string;
  /** Mounts again with another size in kB, or read-only. */
  remount(options: string): void;
}

/** A disk for the time of some work. @param kilobytes  what it holds */
export function withSmallDisk<T>(kilobytes: number, work: (disk: SmallDisk) => T): T {
  const path = mkdtempSync(join(tmpdir(), 'platebook-disk-'));
  execFileSync('mount', ['-t', 'tmpfs', '-o', `size=${kilobytes}k,mode=0755`, 'tmpfs', path]);
  try {
    return work({
      path,
      remount: (options) => void execFileSync('mount', ['-o', `remount,${options}`, path]),
    });
  } finally {
    execFileSync('umount', ['-l', path]);
    rmSync(path, { recursive: true, force: true });
  }
}

/** Whether this machine lets us mount. */
export function canMount(): boolean {
  try {
    return withSmallDisk(64, () => true);
  } catch {
    console.log('left out: this machine does not let the tests mount a small disk');
    return false;
  }
}

/** Whether we may become somebody without rights, who can still execute the program. */
export function canBecomeNobody(): boolean {
  const can = process.getuid?.() === 0 && asNobody(['--version'], tmpdir()).status === 0;
  if (!can)
    console.log('left out: the tests cannot become another user here, or that user cannot read the program');
  return can;
}

export interface Said {
  readonly status: number | null;
  readonly out: string;
  readonly err: string;
}

/** The command line as a process. */
export function platebook(words: readonly string[], cwd: string, env: Record<string, string> = {}): Said {
  return said(process.execPath, [PROGRAM, ...words], cwd, env);
}

/** The same, by a user without rights. */
export function asNobody(words: readonly string[], cwd: string, env: Record<string, string> = {}): Said {
  const become = ['--reuid', NOBODY, '--regid', NOBODY, '--clear-groups'];
  return said('setpriv', [...become, process.execPath, PROGRAM, ...words], cwd, env);
}

function said(file: string, words: readonly string[], cwd: string, env: Record<string, string>): Said {
  const { PATH = '', PLATEBOOK_KEY = '' } = process.env;
  const { status, stdout, stderr } = spawnSync(file, words, {
    cwd,
    encoding: 'utf8',
    env: { PATH, PLATEBOOK_KEY, PLATEBOOK_BY: 'A. Tester', ...env },
  });
  return { status, out: stdout ?? '', err: stderr ?? '' };
}

/** What a user must never see. */
export const STACK_TRACE = /^\s+at .*[:(]\d+/m;
