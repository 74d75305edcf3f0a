/** What must hold between an entry and what it names. The book refuses a draft for which it does not; an audit holds
 *  every entry to the same. */

import type { Draft, Entry, PlateDraft, StoredFile } from './entry.ts';
import { checkSymbols, parsePlateNumber, type plateNumbersOf } from './plate-number.ts';
import { type NamedEntry, referencesOf } from './references.ts';

export interface Known {
  /** Whether the store has the file, with that size. */
  hasFile(file: StoredFile): boolean;
  /** An entry before the one in question. */
  entry(number: number): { readonly entry: Entry; readonly digest: string } | undefined;
}

/** Sentences without a full stop, one for each thing that does not hold; none when the entry is in order. */
export function objectionsTo(draft: Draft, known: Known): string[] {
  const { files, entries } = referencesOf(draft);
  const objections: string[] = [];
  for (const file of files) {
    if (file.stored && !known.hasFile(file)) {
      objections.push(`the store has no ${describe(file)} of ${file.bytes} bytes with digest ${file.digest}`);
    }
  }
  for (const named of entries) objections.push(...objectionsToNamed(named, known));
  if (draft.type === 'stage') objections.push(...objectionsToFigures(draft.outputs));
  if (draft.type === 'plate') objections.push(...objectionsToPlate(draft, known));
  return objections;
}

function objectionsToNamed({ number, as, output, digest }: NamedEntry, known: Known): string[] {
  const found = known.entry(number)?.entry;
  if (found === undefined) return [`${as} names entry ${number}, which does not stand before it`];
  if (output === undefined) return [];
  const outputs: Readonly<Record<string, StoredFile>> = found.type === 'stage' ? found.outputs : {};
  if (!Object.hasOwn(outputs, output))
    return [`${as} names output ${output} of entry ${number}, which has none of that name`];
  if (digest === undefined || outputs[output]?.digest === digest) return [];
  return [
    `${as} has digest ${digest}, but output ${output} of entry ${number} has ${outputs[output]?.digest}`,
  ];
}

function objectionsToFigures(outputs: Parameters<typeof plateNumbersOf>[2]): string[] {
  const figures = Object.values(outputs).filter(({ format }) => format === 'svg').length;
  return figures > 26 ? [`it drew ${figures} figures, and plate numbers have letters for 26`] : [];
}

function objectionsToPlate({ plate, drawn }: PlateDraft, known: Known): string[] {
  const drawing = known.entry(drawn);
  if (drawing === undefined) return [];
  const parts = parsePlateNumber(plate);
  const check = checkSymbols(drawing.digest);
  if (parts !== null && parts.entry === drawn && parts.check === check) return [];
  return [`${plate} is no plate number of entry ${drawn}, whose symbols are ${check}`];
}

function describe({ role, name }: { role: string; name: string }): string {
  return name === '' ? role : `${role} ${name}`;
}
