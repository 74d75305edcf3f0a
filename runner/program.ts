/** Where the program lies, which runtime computes, and which parts of it a stage may read. */

import { existsSync, readFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';

/** The folder that holds runner/, stages/ and ledger/: the checkout, or lib/ in an installed package. */
export const sourceRoot = dirname(dirname(fileURLToPath(import.meta.url)));

/** The folder that holds package.json. */
export const packageRoot = existsSync(join(sourceRoot, 'package.json')) ? sourceRoot : dirname(sourceRoot);

/** `.ts` in a checkout, `.js` in an installed package. */
export const sourceExtension = fileURLToPath(import.meta.url).slice(-3);

/** The folder of the stage kinds. */
export const kindsFolder = join(sourceRoot, 'stages');

export const programVersion: string = JSON.parse(
  readFileSync(join(packageRoot, 'package.json'), 'utf8'),
).version;

/** The Node executable that stages run with: this one, unless the environment names another (an emulator's wrapper,
 *  for the comparison between processors). */
export function stageEngine(env: Readonly<Record<string, string | undefined>>): string {
  return env.PLATEBOOK_ENGINE ?? process.execPath;
}

/** The folder with the nearest node_modules, upwards from the package (a package installed by npm lies in one). */
export function modulesFolder(): string {
  for (let folder = packageRoot; ; folder = dirname(folder)) {
    if (existsSync(join(folder, 'node_modules', 'yaml'))) return join(folder, 'node_modules');
    if (dirname(folder) === folder) return join(packageRoot, 'node_modules');
  }
}
