/** Whether an object read from a ledger has what its type must have. Types that this program does not know pass: a
 *  later one may have written them. */

import { isDigest } from './digest.ts';
import type { Draft, Entry } from './entry.ts';
import { referencesOf } from './references.ts';
import { isTime } from './time.ts';

const RECORD = {
  name: 'string',
  kind: 'string',
  key: 'string',
  code: 'object',
  inputs: 'object',
  parameters: 'object',
  platform: 'string',
} as const;

/** Fields without which an entry of a type could not be indexed, traced or shown. */
const FIELDS: Readonly<Record<Draft['type'], Readonly<Record<string, string>>>> = {
  stage: { ...RECORD, outputs: 'object', findings: 'object', warnings: 'object' },
  failure: { ...RECORD, error: 'object' },
  run: {
    run: 'number',
    recipe: 'object',
    stages: 'object',
    plates: 'object',
    numbers: 'object',
    overrides: 'object',
  },
  plate: {
    plate: 'string',
    name: 'string',
    drawn: 'number',
    output: 'string',
    figure: 'string',
    stamped: 'object',
  },
  rerun: { of: 'number', verdict: 'string', outputs: 'object', differences: 'object' },
  import: { origin: 'object', imported: 'object', record: 'object', files: 'object', entries: 'object' },
  withdrawal: { withdraws: 'number', reason: 'string' },
  countersignature: { signs: 'number', what: 'string', key: 'string', signature: 'string' },
};

const FIELD_LISTS = new Map(Object.entries(FIELDS).map(([type, fields]) => [type, Object.entries(fields)]));

/** What an object lacks to be an entry, as the end of a sentence; null when it lacks nothing. */
export function lackOf(value: unknown): string | null {
  return lackOfFields(value) ?? lackOfReferences(value as Entry);
}

/** The same, without a look at what the entry names. */
export function lackOfFields(value: unknown): string | null {
  if (typeof value !== 'object' || value === null || Array.isArray(value)) return 'expected an object';
  const { book, number, before, time, by, type } = value as { [key: string]: unknown };
  if (typeof book !== 'string') return 'expected the name of a book in "book"';
  if (!(Number.isSafeInteger(number) && (number as number) >= 1))
    return 'expected a number from 1 in "number"';
  if (!(typeof before === 'string' && isDigest(before))) return 'expected a digest in "before"';
  if (!(typeof time === 'string' && isTime(time)))
    return 'expected a time YYYY-MM-DDThh:mm:ss.sssZ in "time"';
  if (typeof (by as { name?: unknown } | null)?.name !== 'string') return 'expected a person in "by"';
  if (typeof type !== 'string') return 'expected a type in "type"';
  return lackOfType(value as Entry);
}

function lackOfType(entry: Entry): string | null {
  for (const [field, type] of FIELD_LISTS.get(entry.type) ?? []) {
    const found = (entry as unknown as Record<string, unknown>)[field];
    if (found === null || typeof found !== type) return `expected a field "${field}" in a ${entry.type}`;
  }
  return null;
}

function lackOfReferences(entry: Entry): string | null {
  if (!FIELD_LISTS.has(entry.type)) return null;
  try {
    const { files, entries } = referencesOf(entry);
    const whole =
      files.every(({ digest, bytes }) => isDigest(digest) && Number.isSafeInteger(bytes)) &&
      entries.every(({ number }) => Number.isSafeInteger(number));
    return whole ? null : `expected digests, sizes and numbers in a ${entry.type}`;
  } catch (error) {
    return `a ${entry.type} of another shape (${(error as Error).message})`;
  }
}
