/** Third-party packages of recorded code: those installed here where their versions are the recorded ones, otherwise
 *  installed from the recorded lock file, whose integrity hashes the package manager checks. Scripts of packages are
 *  never run. */

import { existsSync, mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { modulesFolder } from '../program.ts';
import { codeNotRestored } from './problem.ts';

export interface PackageDifference {
  readonly name: string;
  readonly recorded: string;
  /** Null when it is not installed at all. */
  readonly installed: string | null;
}

/** Packages whose version below `modules` is not the recorded one.
 *  @param recorded  as entries have them; a nested copy is named by its place, `outer/inner`
 *  @param modules   a node_modules folder */
export function differingPackages(
  recorded: Readonly<Record<string, string>>,
  modules = modulesFolder(),
): PackageDifference[] {
  return Object.entries(recorded).flatMap(([name, version]) => {
    const installed = installedVersion(name, modules);
    return installed === version ? [] : [{ name, recorded: version, installed }];
  });
}

/** `fft.js 4.0.4 (installed: 4.0.3) and 2 more`. */
export function packagesText(differences: readonly PackageDifference[]): string {
  const shown = differences
    .slice(0, 3)
    .map((each) => `${each.name} ${each.recorded} (installed: ${each.installed ?? 'none'})`);
  return shown.join(', ') + (differences.length > 3 ? ` and ${differences.length - 3} more` : '');
}

/** Installs what a lock file names into `folder` and returns its node_modules folder.
 *  @throws RunnerProblem 'code-not-restored' when the package manager cannot, with what it said, or when it installed
 *  other versions than recorded. */
export async function installPackages(
  folder: string,
  files: { readonly package: Uint8Array; readonly lock: Uint8Array },
  recorded: Readonly<Record<string, string>>,
): Promise<string> {
  mkdirSync(folder, { recursive: true });
  writeFileSync(join(folder, 'package.json'), files.package);
  writeFileSync(join(folder, 'package-lock.json'), files.lock);
  const wanted = packagesText(differingPackages(recorded));
  await callNpm(['ci', '--omit=dev', '--omit=optional'], folder, wanted);
  const modules = join(folder, 'node_modules');
  const differing = differingPackages(recorded, modules);
  if (differing.length > 0) {
    throw codeNotRestored(
      'the recorded lock file',
      'the recorded packages in it',
      `others: ${packagesText(differing)}`,
    );
  }
  return modules;
}

/** Calls the package manager; it runs no script of a package and asks nothing.
 *  @param wanted  what cannot be had when it fails */
export async function callNpm(words: readonly string[], folder: string, wanted: string): Promise<void> {
  const { execa } = await import('execa');
  const quiet = ['--ignore-scripts', '--no-audit', '--no-fund', '--no-update-notifier', '--loglevel=error'];
  const ended = await execa('npm', [...words, ...quiet], {
    cwd: folder,
    reject: false,
    stdin: 'ignore',
    timeout: 600_000,
  });
  if (!ended.failed) return;
  const said = `${ended.stderr ?? ''}`.trim().split('\n').slice(0, 3).join(' ').slice(0, 300);
  const found = `a package manager that ended without them (${said || (ended.shortMessage ?? 'it said nothing')})`;
  throw codeNotRestored(
    'packages',
    wanted,
    found,
    'Repeat with the package registry within reach, or leave out --as-recorded.',
  );
}

/** The version of a package as it lies on the disk. */
function installedVersion(name: string, modules: string): string | null {
  const file = join(dirname(modules), placeOf(name), 'package.json');
  if (!existsSync(file)) return null;
  const { version } = JSON.parse(readFileSync(file, 'utf8'));
  return typeof version === 'string' ? version : null;
}

/** `a/@b/c` lies in node_modules/a/node_modules/@b/c. */
function placeOf(name: string): string {
  return name.replace(/@[^/]+\/[^/]+|[^/]+/g, 'node_modules/$&');
}
