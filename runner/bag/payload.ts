/** The payload of a bag: which files it holds, where each lies, and where its bytes come from. Everything follows from
 *  the entries; nothing is read here.
 *
 *      data/entries/N.json            an entry's line; its SHA-256 is the entry's digest
 *      data/proofs/N.json             the proof that it is under a seal
 *      data/recipe/NAME.yaml
 *      data/outputs/N-STAGE/NAME.fits
 *      data/plates/N-NAME.png
 *      data/logs/N-STAGE.jsonl
 *      data/inputs/DIGEST-NAME        files from outside
 *      data/code/stages/…             the import closures of the kinds, package.json, the lock file
 *
 *  Names made by people are made safe (paths.ts), so that `sha256sum -c` reads the manifest; entries have them as they
 *  are. */

import type { Entry, PlateEntry, RecordedInput, RunEntry, StageEntry } from '../../ledger/entry.ts';
import { planCode } from './code-files.ts';
import type { Gathered } from './gather.ts';
import { extensionOf, mediaTypeOf } from './media-types.ts';
import { entryPath } from './open-bag.ts';
import { safeName } from './paths.ts';
import { proofPath } from './proofs.ts';

export type FileRole =
  | 'entry'
  | 'proof'
  | 'recipe'
  | 'output'
  | 'plate'
  | 'log'
  | 'input'
  | 'code'
  | 'checker'
  | 'description';

export interface PayloadFile {
  readonly path: string;
  readonly role: FileRole;
  /** The entry that it belongs to first; null for code. */
  readonly entry: number | null;
  /** Name of the output, the input or the file. */
  readonly name: string;
  readonly digest: string;
  readonly bytes: number;
  readonly mediaType: string;
  /** One sentence without full stop. */
  readonly about: string;
  readonly from:
    | { readonly text: string }
    | { readonly digest: string }
    | { readonly file: string }
    | { readonly url: string };
}

/** A file from outside that the bag names and does not hold. */
export interface AbsentInput {
  readonly digest: string;
  readonly bytes: number;
  readonly given: string;
}

export interface Payload {
  readonly files: readonly PayloadFile[];
  readonly absent: readonly AbsentInput[];
  /** Stages whose code the book did not keep. */
  readonly withoutCode: readonly string[];
}

export interface PayloadRequest {
  readonly gathered: Gathered;
  /** Size of a file in the store; null when it is not there. */
  readonly sizeOf: (digest: string) => number | null;
  /** Where a file from outside can be had; null when it is only named. */
  readonly locate: (input: RecordedInput, given: string) => PayloadFile['from'] | null;
  readonly texts: readonly {
    readonly path: string;
    readonly role: FileRole;
    readonly entry: number | null;
    readonly text: string;
    readonly about: string;
  }[];
  readonly digestOf: (text: string) => { readonly digest: string; readonly bytes: number };
}

/** Plans the payload, in the order of the entries. Files that two entries share stand once where their name is the same. */
export function planPayload(request: PayloadRequest): Payload {
  const { gathered, sizeOf } = request;
  const files = new Map<string, PayloadFile>();
  const absent = new Map<string, AbsentInput>();
  const add = (file: PayloadFile) => {
    if (!files.has(file.path)) files.set(file.path, file);
  };
  for (const text of request.texts) {
    const { path, role, entry, about } = text;
    const name = path.slice(path.lastIndexOf('/') + 1);
    add({
      path,
      role,
      entry,
      name,
      ...request.digestOf(text.text),
      mediaType: mediaTypeOf(path),
      about,
      from: { text: text.text },
    });
  }
  for (const { entry } of gathered.entries) {
    for (const file of filesOfEntry(entry)) add(file);
    if (entry.type === 'stage') planInputs(entry, request, add, absent);
  }
  const stages = gathered.entries.flatMap(({ entry }) => (entry.type === 'stage' ? [entry] : []));
  const code = planCode(stages, sizeOf);
  for (const file of code.files) add(file);
  return { files: [...files.values()], absent: [...absent.values()], withoutCode: code.without };
}

/** The lines and proofs of the entries, as texts of the payload. */
export function entryTexts(
  gathered: Gathered,
  proofOf: (entry: number) => string | null,
): PayloadRequest['texts'] {
  return gathered.entries.flatMap(({ entry, line }) => {
    const number = entry.number;
    const own = {
      path: entryPath(number),
      role: 'entry' as const,
      entry: number,
      text: line,
      about: `Entry ${number} (${entry.type})`,
    };
    const proof = proofOf(number);
    if (proof === null) return [own];
    const about = `Proof that entry ${number} is under a seal of the book`;
    return [own, { path: proofPath(number), role: 'proof' as const, entry: number, text: proof, about }];
  });
}

function filesOfEntry(entry: Entry): PayloadFile[] {
  switch (entry.type) {
    case 'stage':
      return filesOfStage(entry);
    case 'plate':
      return filesOfPlate(entry);
    case 'run':
      return [recipeOf(entry)];
    default:
      return [];
  }
}

function filesOfStage(stage: StageEntry): PayloadFile[] {
  const place = `${stage.number}-${safeName(stage.name)}`;
  const outputs = Object.entries(stage.outputs).map(([name, { digest, bytes, format }]): PayloadFile => {
    const path = `data/outputs/${place}/${safeName(name)}${extensionOf(format)}`;
    const about = `Output ${name} of stage ${stage.name} (kind ${stage.kind}), entry ${stage.number}`;
    return {
      path,
      role: 'output',
      entry: stage.number,
      name,
      digest,
      bytes,
      mediaType: mediaTypeOf(path),
      about,
      from: { digest },
    };
  });
  if (stage.log === null) return outputs;
  const { digest, bytes } = stage.log;
  const path = `data/logs/${place}.jsonl`;
  const about = `What stage ${stage.name} said, entry ${stage.number}`;
  const log: PayloadFile = {
    path,
    role: 'log',
    entry: stage.number,
    name: 'log',
    digest,
    bytes,
    mediaType: mediaTypeOf(path),
    about,
    from: { digest },
  };
  return [...outputs, log];
}

function filesOfPlate({ number, name, plate, stamped }: PlateEntry): PayloadFile[] {
  return (['png', 'svg'] as const).map((format) => {
    const { digest, bytes } = stamped[format];
    const path = `data/plates/${number}-${safeName(name)}.${format}`;
    return {
      path,
      role: 'plate',
      entry: number,
      name: format,
      digest,
      bytes,
      mediaType: mediaTypeOf(path),
      about: `Plate ${plate}, ${name}`,
      from: { digest },
    };
  });
}

function recipeOf({ number, run, recipe }: RunEntry): PayloadFile {
  const { digest, bytes, name } = recipe;
  const path = `data/recipe/${safeName(name)}.yaml`;
  return {
    path,
    role: 'recipe',
    entry: number,
    name,
    digest,
    bytes,
    mediaType: mediaTypeOf(path),
    about: `Recipe ${name} of run ${run}`,
    from: { digest },
  };
}

function planInputs(
  stage: StageEntry,
  request: PayloadRequest,
  add: (file: PayloadFile) => void,
  absent: Map<string, AbsentInput>,
): void {
  for (const [name, list] of Object.entries(stage.inputs)) {
    for (const input of list) {
      if (!('file' in input.origin)) continue;
      const given = input.origin.file;
      const { digest, bytes } = input;
      const from = request.locate(input, given);
      if (from === null) {
        absent.set(digest, { digest, bytes, given });
        continue;
      }
      const base = given.slice(Math.max(given.lastIndexOf('/'), given.lastIndexOf('\\')) + 1);
      const path = `data/inputs/${digest.slice(0, 16)}-${safeName(base)}`;
      const about = `Input ${name} of stage ${stage.name}, the file ${given}`;
      add({
        path,
        role: 'input',
        entry: stage.number,
        name,
        digest,
        bytes,
        mediaType: mediaTypeOf(path),
        about,
        from,
      });
    }
  }
}
