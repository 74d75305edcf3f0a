/** Files that a recipe names: they exist, are regular and readable, and lie below an allowed directory. */

import { accessSync, constants, readdirSync, realpathSync, type Stats, statSync } from 'node:fs';
import { basename, dirname, resolve, sep } from 'node:path';
import { didYouMean } from '../../stages/near-miss.ts';
import type { RunnerCode } from '../problem.ts';

export interface FileRules {
  /** Absolute; paths in the recipe count from here. */
  readonly directory: string;
  /** Absolute; `directory` is among them. As written and with links followed. */
  readonly roots: readonly string[];
}

export interface FileFault {
  readonly code: RunnerCode;
  readonly expected: string;
  readonly found: string;
  readonly advice?: string;
}

/** Rules for a recipe in this directory. Roots that do not exist stay as written: nothing can lie below them. */
export function fileRules(directory: string, roots: readonly string[]): FileRules {
  const all = [directory, ...roots.map((root) => resolve(root))];
  return { directory, roots: [...new Set(all.flatMap((root) => [root, realPath(root) ?? root]))] };
}

/** The real path of a file, links followed, or what is wrong with it. */
export function findFile(given: string, rules: FileRules): string | FileFault {
  const path = resolve(rules.directory, given);
  if (!isAllowed(path, rules)) return outside('a path that leaves it');
  try {
    const real = realpathSync(path);
    if (!isAllowed(real, rules)) return outside('a link that leaves it');
    const stats = statSync(real);
    if (!stats.isFile())
      return { code: 'not-a-file', expected: 'a regular file', found: describeFile(stats) };
    accessSync(real, constants.R_OK);
    return real;
  } catch (error) {
    return fileFault(error, path);
  }
}

function isAllowed(path: string, rules: FileRules): boolean {
  return rules.roots.some((root) => path === root || path.startsWith(root.endsWith(sep) ? root : root + sep));
}

function outside(found: string): FileFault {
  return { code: 'outside-roots', expected: 'a file below the directory of the recipe', found };
}

/** What something that is no regular file is. */
export function describeFile(stats: Stats): string {
  if (stats.isDirectory()) return 'a directory';
  if (stats.isFIFO()) return 'a pipe';
  if (stats.isSocket()) return 'a socket';
  return stats.isCharacterDevice() || stats.isBlockDevice() ? 'a device' : 'something else';
}

function fileFault(error: unknown, path: string): FileFault {
  const code = (error as NodeJS.ErrnoException).code;
  if (code === 'ENOENT' || code === 'ENOTDIR') {
    const advice = didYouMean(basename(path), neighbours(path)).trim() || undefined;
    return { code: 'no-file', expected: 'a file that exists', found: 'none at this path', advice };
  }
  if (code === 'EACCES' || code === 'EPERM') {
    return { code: 'unreadable-file', expected: 'a file that may be read', found: 'one that may not' };
  }
  if (code === 'ELOOP') return { code: 'not-a-file', expected: 'a regular file', found: 'links in a loop' };
  if (code === 'ENAMETOOLONG') return { code: 'no-file', expected: 'a path', found: 'one that is too long' };
  throw error;
}

/** Names beside a path that does not exist, sorted; none when the directory cannot be read. */
function neighbours(path: string): readonly string[] {
  try {
    return readdirSync(dirname(path)).sort();
  } catch {
    return [];
  }
}

function realPath(path: string): string | undefined {
  try {
    return realpathSync(path);
  } catch {
    return undefined;
  }
}
