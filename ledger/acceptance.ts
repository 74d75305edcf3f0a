/** What must hold between an entry and what it names. The book refuses a draft for which it does not; an audit holds
 *  every entry to the same. */

import { objectionsToSignature } from './countersignature.ts';
import type { Draft, Entry, PlateDraft, StageEntry, StoredFile, WithdrawalDraft } from './entry.ts';
import { checkSymbols, parsePlateNumber, type plateNumbersOf } from './plate-number.ts';
import { type NamedEntry, referencesOf } from './references.ts';

export interface Known {
  /** Whether the store has the file, with that size. */
  hasFile(file: StoredFile): boolean;
  /** What is known of an entry before the one in question; null when that entry is damaged, and nothing is held against
   *  it; undefined when there is none. */
  entry(number: number): KnownEntry | null | undefined;
  readonly book: string;
  /** The root of the tree over the first `size` entries, base64; null when there are not so many before. */
  rootAt(size: number): string | null;
}

export interface KnownEntry {
  readonly digest: string;
  /** Of a stage, only its outputs matter. */
  readonly entry:
    | { readonly type: 'stage'; readonly outputs: Readonly<Record<string, { readonly digest: string }>> }
    | Exclude<Entry, StageEntry>;
}

/** Something that does not hold. */
export interface Objection {
  /** A sentence without a full stop. */
  readonly what: string;
  /** The file of the store that is not there, where it is that. */
  readonly digest?: string;
}

/** Longer reasons than this are a document of their own. */
const LONGEST_REASON = 4000;

/** Sentences without a full stop, one for each thing that does not hold; none when the entry is in order. */
export function objectionsTo(draft: Draft, known: Known): string[] {
  return findObjections(draft, known).map(({ what }) => what);
}

/** Each thing that does not hold; none when the entry is in order. */
export function findObjections(draft: Draft, known: Known): Objection[] {
  const { files, entries } = referencesOf(draft);
  const missing = files
    .filter((file) => file.stored && !known.hasFile(file))
    .map(({ digest, bytes, ...file }) => ({
      what: `the store has no ${describe(file)} of ${bytes} bytes with digest ${digest}`,
      digest,
    }));
  const objections: string[] = [];
  for (const named of entries) objections.push(...objectionsToNamed(named, known));
  if (draft.type === 'stage') objections.push(...objectionsToFigures(draft.outputs));
  if (draft.type === 'plate') objections.push(...objectionsToPlate(draft, known));
  if (draft.type === 'withdrawal') objections.push(...objectionsToReason(draft));
  if (draft.type === 'countersignature') objections.push(...objectionsToSignature(draft, known));
  return [...missing, ...objections.map((what) => ({ what }))];
}

function objectionsToNamed({ number, as, output, digest }: NamedEntry, known: Known): string[] {
  const found = known.entry(number);
  if (found === undefined) return [`${as} names entry ${number}, which does not stand before it`];
  if (found === null || output === undefined) return [];
  const outputs = found.entry.type === 'stage' ? found.entry.outputs : {};
  const has = Object.hasOwn(outputs, output) ? outputs[output]?.digest : undefined;
  if (has === undefined)
    return [`${as} names output ${output} of entry ${number}, which has none of that name`];
  if (digest === undefined || has === digest) return [];
  return [`${as} has digest ${digest}, but output ${output} of entry ${number} has ${has}`];
}

function objectionsToFigures(outputs: Parameters<typeof plateNumbersOf>[2]): string[] {
  const figures = Object.values(outputs).filter(({ format }) => format === 'svg').length;
  return figures > 26 ? [`it drew ${figures} figures, and plate numbers have letters for 26`] : [];
}

function objectionsToPlate({ plate, drawn }: PlateDraft, known: Known): string[] {
  const drawing = known.entry(drawn);
  if (drawing === undefined || drawing === null) return [];
  const parts = parsePlateNumber(plate);
  const check = checkSymbols(drawing.digest);
  if (parts !== null && parts.entry === drawn && parts.check === check) return [];
  return [`${plate} is no plate number of entry ${drawn}, whose symbols are ${check}`];
}

function objectionsToReason({ reason }: WithdrawalDraft): string[] {
  const isText =
    reason.trim() !== '' && reason.length <= LONGEST_REASON && !/\p{Cc}/u.test(reason.replaceAll('\n', ' '));
  return isText
    ? []
    : [`expected a reason of 1 to ${LONGEST_REASON} characters, got ${JSON.stringify(reason.slice(0, 40))}`];
}

function describe({ role, name }: { role: string; name: string }): string {
  return name === '' ? role : `${role} ${name}`;
}
