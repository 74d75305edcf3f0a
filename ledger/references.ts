/** What an entry names: files of the store, files outside, and earlier entries. One list, used when an entry is
 *  accepted, indexed, traced and audited. */

import type {
  Draft,
  FailureDraft,
  ImportDraft,
  PlateDraft,
  RerunDraft,
  RunDraft,
  StageDraft,
  StageRecord,
  StoredFile,
} from './entry.ts';

export type Role = 'output' | 'input' | 'log' | 'recipe' | 'figure' | 'stamped' | 'imported';

export interface NamedFile extends StoredFile {
  readonly role: Role;
  /** The name of the input or output, `svg` or `png` of a stamped figure, role and name of an imported file; empty for
   *  logs and recipes. */
  readonly name: string;
  /** Whether it must be in the store. Inputs from outside need not be. */
  readonly stored: boolean;
}

export interface NamedEntry {
  readonly number: number;
  /** How the entry depends on it, for messages. */
  readonly as: string;
  /** The output of that entry which is meant, with the digest it must have. */
  readonly output?: string;
  readonly digest?: string;
}

export interface References {
  readonly files: readonly NamedFile[];
  readonly entries: readonly NamedEntry[];
}

/** Everything that a draft or an entry names, in the order of the record. Unknown types name nothing. */
export function referencesOf(draft: Draft): References {
  switch (draft.type) {
    case 'stage':
      return ofStage(draft);
    case 'failure':
      return ofRecord(draft);
    case 'run':
      return ofRun(draft);
    case 'plate':
      return ofPlate(draft);
    case 'rerun':
      return ofRerun(draft);
    case 'import':
      return ofImport(draft);
    case 'withdrawal':
      return { files: [], entries: [{ number: draft.withdraws, as: 'what is withdrawn' }] };
    case 'countersignature':
      return { files: [], entries: [{ number: draft.signs, as: 'what is signed' }] };
    default:
      return { files: [], entries: [] };
  }
}

function ofStage(draft: StageDraft): References {
  const { files, entries } = ofRecord(draft);
  const outputs = Object.entries(draft.outputs).map(
    ([name, file]): NamedFile => ({
      digest: file.digest,
      bytes: file.bytes,
      role: 'output',
      name,
      stored: true,
    }),
  );
  return { files: [...outputs, ...files], entries };
}

function ofRecord(draft: StageRecord | FailureDraft): References {
  const files: NamedFile[] = [];
  const entries: NamedEntry[] = [];
  for (const [name, inputs] of Object.entries(draft.inputs)) {
    for (const { digest, bytes, origin } of inputs) {
      const inside = 'entry' in origin;
      files.push({ digest, bytes, role: 'input', name, stored: inside });
      if (inside) entries.push({ number: origin.entry, as: `input ${name}`, output: origin.output, digest });
    }
  }
  if (draft.log !== null) files.push({ ...draft.log, role: 'log', name: '', stored: true });
  return { files, entries };
}

function ofRun({ recipe, stages, plates, numbers }: RunDraft): References {
  const entries: NamedEntry[] = [];
  for (const { stage, entry } of stages)
    if (entry !== null) entries.push({ number: entry, as: `stage ${stage}` });
  for (const { name, entry } of plates) entries.push({ number: entry, as: `plate ${name}` });
  for (const { name, entry, output, against } of numbers) {
    entries.push({ number: entry, as: `published number ${name}`, output });
    if (against !== null) entries.push({ number: against.entry, as: `the truth of ${name}` });
  }
  const file: NamedFile = {
    digest: recipe.digest,
    bytes: recipe.bytes,
    role: 'recipe',
    name: '',
    stored: true,
  };
  return { files: [file], entries };
}

function ofPlate({ drawn, output, figure, stamped }: PlateDraft): References {
  return {
    files: [
      { ...stamped.svg, role: 'stamped', name: 'svg', stored: true },
      { ...stamped.png, role: 'stamped', name: 'png', stored: true },
    ],
    entries: [{ number: drawn, as: 'the drawing', output, digest: figure }],
  };
}

// What a rerun computed need not be kept: its digests are the finding, not a promise of files.
function ofRerun({ of }: RerunDraft): References {
  return { files: [], entries: [{ number: of, as: 'what was executed again' }] };
}

function ofImport({ record, proof, files, entries }: ImportDraft): References {
  const imported = (file: StoredFile, name: string): NamedFile => ({
    digest: file.digest,
    bytes: file.bytes,
    role: 'imported',
    name,
    stored: true,
  });
  return {
    files: [
      imported(record, 'record'),
      ...(proof === null ? [] : [imported(proof, 'proof')]),
      ...files.map((file) => imported(file, `${file.role} ${file.name}`.trim())),
    ],
    entries: entries.map(({ number, entry }) => ({ number: entry, as: `entry ${number} of the other book` })),
  };
}
