/** The runtime of recorded code: the present one where it is of the recorded release, otherwise that release, fetched as
 *  the registry package that package.json pins for this system. */

import { existsSync, mkdirSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { callNpm } from './packages.ts';
import { codeNotRestored } from './problem.ts';

/** The Node executable of a release.
 *  @param release  as `process.version` has it
 *  @param present  the executable to take where the release is the present one
 *  @param folder   where another one is installed
 *  @throws RunnerProblem 'code-not-restored' when it cannot be had */
export async function engineOfRelease(release: string, present: string, folder: string): Promise<string> {
  if (release === process.version) return present;
  const place = 'the recorded runtime';
  if (!/^v\d+\.\d+\.\d+$/.test(release)) {
    throw codeNotRestored(place, 'a release such as v24.1.0', JSON.stringify(release.slice(0, 40)));
  }
  const system = process.platform === 'win32' ? 'win' : process.platform;
  const name = `node-${system}-${process.arch}`;
  const engine = join(
    folder,
    'node_modules',
    name,
    'bin',
    process.platform === 'win32' ? 'node.exe' : 'node',
  );
  if (existsSync(engine)) return engine;
  mkdirSync(folder, { recursive: true });
  writeFileSync(join(folder, 'package.json'), '{"private":true}\n');
  await callNpm(
    ['install', '--no-save', '--no-package-lock', `${name}@${release.slice(1)}`],
    folder,
    `Node ${release} (${name})`,
  );
  if (!existsSync(engine)) throw codeNotRestored(place, `Node ${release}`, `a package ${name} without it`);
  return engine;
}
