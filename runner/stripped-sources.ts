/** Sources with their types taken out, for the processes of stages. To take them out costs a process half a second of
 *  each start; here it is done once in a run, and of the very bytes that the code's digest was taken of. What is
 *  left out, a process takes the types out of by itself: the positions in stacks are the same. */

import { stripTypeScriptTypes } from 'node:module';
import { pathToFileURL } from 'node:url';
import { importClosure } from './code-digest.ts';

const stripped = new Map<string, string>();

/** Source text by URL, of all files of ours that the entries reach; none of an installed package, whose files have no
 *  types. @throws Error when a file of the closure cannot be read. Cost: about 1.5 ms per file not asked for before. */
export function strippedSources(entries: readonly string[]): Record<string, string> {
  const sources: Record<string, string> = {};
  for (const entry of entries) {
    for (const [path, { bytes }] of importClosure(entry).files) {
      if (!path.endsWith('.ts')) continue;
      const source = stripped.get(path) ?? strip(bytes.toString('utf8'));
      stripped.set(path, source);
      sources[pathToFileURL(path).href] = source;
    }
  }
  return sources;
}

/** The runtime warns at the first call that the function may change; its release is pinned. */
function strip(source: string): string {
  const warn = process.emitWarning;
  process.emitWarning = () => {};
  try {
    return stripTypeScriptTypes(source);
  } finally {
    process.emitWarning = warn;
  }
}
