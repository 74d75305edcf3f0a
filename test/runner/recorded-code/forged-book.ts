/** Books whose one stage was made with code that is not the installed one: a kind of the program's name with a source of
 *  the test's. */

import { join } from 'node:path';
import { openBook } from '../../../ledger/book.ts';
import { canonicalJson } from '../../../ledger/canonical.ts';
import { sha256 } from '../../../ledger/digest.ts';
import type { Json, RecordedCode, StageDraft } from '../../../ledger/entry.ts';
import type { Store } from '../../../ledger/store.ts';

/** What the recorded code wrote. */
export const recordedText = 'made by recorded code\n';

export const declaration =
  "export const features = { kind: 'features', version: 1, load: () => import('./compute.ts') };\n";

/** A computation that writes the recorded text, after doing something else. */
export function computation(first = ''): string {
  return `${first.startsWith('import') ? first : ''}
export const compute = async (task: any): Promise<object> => {
  ${first.startsWith('import') ? '' : first}
  const made: string = ${JSON.stringify(recordedText)};
  for (const sink of Object.values(task.outputs) as any[]) sink.write(Buffer.from(made));
  return {};
};
`;
}

/** Facts that are not those of the present program; `kept: false` for an entry from before code was kept. */
export type More = Partial<RecordedCode> & {
  readonly kept?: boolean;
  /** The texts of package.json and the lock file. */
  readonly texts?: { readonly package: string; readonly lock: string };
};

/** A record of code whose files are kept in the store. */
export function recordCode(store: Store, sources: Record<string, string>, more: More = {}): RecordedCode {
  const files = Object.fromEntries(
    Object.entries(sources).map(([path, text]) => [path, store.keepBytes(text).digest]),
  );
  const facts = {
    files,
    packages: more.packages ?? {},
    runtime: more.runtime ?? process.version,
    version: 1,
  };
  const packageFile = store.keepBytes(more.texts?.package ?? '{ "type": "module" }\n');
  const lockFile = more.texts === undefined ? more.lock : store.keepBytes(more.texts.lock);
  const lock = lockFile === undefined ? {} : { lock: lockFile };
  const kept = more.kept === false ? {} : { package: packageFile, ...lock };
  return { ...kept, ...facts, digest: sha256(canonicalJson(facts as unknown as Json)) };
}

/** Starts `FOLDER/book` with one stage of that code, and a run of it. */
export function forgeBook(folder: string, sources: Record<string, string>, more: More = {}): void {
  process.env.PLATEBOOK_KEY = join(folder, 'key.pem');
  const book = openBook(join(folder, 'book'), { by: { name: 'M. Stranger' }, create: true });
  const code = recordCode(book.store, sources, more);
  const made = book.store.keepBytes(recordedText);
  const stage: StageDraft = {
    type: 'stage',
    name: 'ring',
    kind: 'features',
    key: sha256(canonicalJson({ kind: 'features', code: code.digest, inputs: {}, parameters: {} })),
    code,
    inputs: {},
    parameters: {},
    seed: null,
    seconds: 1,
    peakMemory: 1,
    log: null,
    platform: 'linux-x64',
    outputs: { ring: { ...made, format: 'json' } },
    findings: [],
    warnings: [],
    stop: null,
    mark: null,
  };
  const { entry } = book.append(stage);
  book.append({
    type: 'run',
    recipe: { ...book.store.keepBytes('recipe: forged\nstages: {}\n'), name: 'forged', path: 'forged.yaml' },
    overrides: [],
    stages: [{ stage: 'ring', kind: 'features', state: 'computed', entry: entry.number }],
    plates: [],
    numbers: [],
    finished: true,
  });
  book.close();
}
