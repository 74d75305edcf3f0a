/** A kind as an entry records it, for a stage that runs with recorded code: the declaration in that code is never loaded
 *  outside the stage's own process. */

import type { Json, StageEntry } from '../../ledger/entry.ts';
import type { Format, StageKind } from '../../stages/kind.ts';
import { codeNotRestored } from './problem.ts';

/** The parts of a declaration that executing needs: name, version, and the outputs that were made. */
export function recordedKind({ kind, code, outputs }: StageEntry): StageKind {
  return {
    kind,
    version: code.version,
    doc: '',
    source: '',
    inputs: {},
    parameters: {},
    outputs: Object.fromEntries(
      Object.entries(outputs).map(([name, { format }]) => [name, { format: format as Format, doc: '' }]),
    ),
    load: () =>
      Promise.reject(codeNotRestored(kind, 'a stage that runs in its own process', 'a call from outside')),
  };
}

/** Recorded parameters as the recorded computation takes them: a quantity is recorded in the unit that its kind declared
 *  then, so the number alone is what it received. */
export function plainRecorded(value: Json): unknown {
  if (Array.isArray(value)) return value.map(plainRecorded);
  if (typeof value !== 'object' || value === null) return value;
  const fields = value as { readonly [key: string]: Json };
  const isQuantity =
    Object.keys(fields).length === 2 && typeof fields.value === 'number' && typeof fields.unit === 'string';
  if (isQuantity) return fields.value;
  return Object.fromEntries(Object.entries(fields).map(([name, field]) => [name, plainRecorded(field)]));
}
