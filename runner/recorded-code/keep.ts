/** Keeps the code of a stage in the store: every file of the import closure, package.json and the lock file, so that the
 *  book alone is enough to compute again as it was computed. Files stand under the digests that the entry's code names. */

import { existsSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import type { RecordedCode } from '../../ledger/entry.ts';
import type { Store } from '../../ledger/store.ts';
import { codeFilesOf } from '../code-digest.ts';
import { packageRoot } from '../program.ts';

/** The code with `package` and `lock` added, and all of it in the store. The digest stays as it is: neither file is part
 *  of what is computed, only of how it can be installed.
 *  @throws LedgerProblem 'cannot-write'. Cost: one look-up per file that is kept already. */
export function keepCode(store: Store, folder: string, kind: string, code: RecordedCode): RecordedCode {
  for (const bytes of codeFilesOf(folder, kind).values()) store.keepBytes(bytes);
  const packageFile = store.keepBytes(readFileSync(join(packageRoot, 'package.json')));
  const lockPath = join(packageRoot, 'package-lock.json');
  if (!existsSync(lockPath)) return { ...code, package: packageFile };
  return { ...code, package: packageFile, lock: store.keepBytes(readFileSync(lockPath)) };
}

/** Path and digest of all files that the record of a code says are kept; none for an entry from before code was kept. */
export function keptCode(code: RecordedCode): [path: string, digest: string][] {
  if (code.package === undefined) return [];
  const lock: [string, string][] = code.lock === undefined ? [] : [['package-lock.json', code.lock.digest]];
  return [...Object.entries(code.files), ['package.json', code.package.digest], ...lock];
}
