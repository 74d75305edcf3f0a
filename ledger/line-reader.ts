/** Reading many lines of a ledger. Nine tenths of a stage's line are the record of its code, and that is the same in all
 *  stages that one version of the program has computed. So a reader remembers the records that it has met, by their
 *  bytes: where the same bytes stand again, they are neither parsed nor judged a second time.
 *
 *  Why nothing can hide behind that: the bytes `,"code":{` begin a field wherever they stand in JSON, because a quote
 *  within a text is written `\"`. What stands in a field's place is canonical or not by itself. So a line is canonical
 *  if the record's bytes are, and the line with `{}` in their place is; its value is that of the shorter line with the
 *  record in place of the `{}`. Where that is no field `code` of the entry itself, the line is read as a whole. */

import { canonicalJson } from './canonical.ts';
import type { Entry, Json } from './entry.ts';

const FIELD = Buffer.from(',"code":{"digest":"');
const FIELD_NAME_BYTES = ',"code":'.length;
/** Bytes from the beginning of the record to its digest. */
const DIGEST_AT = FIELD.length - FIELD_NAME_BYTES;
const DIGEST_DIGITS = 64;
/** The field stands behind `before`, `book` and `by` only. */
const FARTHEST = 2000;
const EMPTY = Buffer.from('{}');
/** Records are some 15 kB; a program has one for each kind of stage. */
const MOST_REMEMBERED = 100;

interface Remembered {
  readonly bytes: Buffer;
  readonly value: Json;
}

/** Returns a reader like the one given, which remembers records of code. Entries that it returns share them.
 *  @param parse  reads a line; @throws what it throws */
export function rememberingReader(parse: (bytes: Buffer) => Entry): (bytes: Buffer) => Entry {
  const known = new Map<string, Remembered>();
  let scratch = Buffer.allocUnsafe(1 << 14);

  const readShort = (bytes: Buffer, at: number, { bytes: record, value }: Remembered): Entry | null => {
    if (scratch.length < bytes.length) scratch = Buffer.allocUnsafe(2 * bytes.length);
    let length = bytes.copy(scratch, 0, 0, at);
    length += EMPTY.copy(scratch, length);
    length += bytes.copy(scratch, length, at + record.length);
    const entry = parse(scratch.subarray(0, length));
    const open = entry as { code?: unknown };
    if (!isEmptyObject(open.code)) return null;
    open.code = value;
    return entry;
  };

  return (bytes) => {
    const at = bytes.subarray(0, FARTHEST).indexOf(FIELD) + FIELD_NAME_BYTES;
    if (at < FIELD_NAME_BYTES) return parse(bytes);
    const name = bytes.toString('latin1', at + DIGEST_AT, at + DIGEST_AT + DIGEST_DIGITS);
    const remembered = known.get(name);
    if (remembered !== undefined && isAt(remembered.bytes, bytes, at)) {
      const entry = readShort(bytes, at, remembered);
      if (entry !== null) return entry;
    }
    const entry = parse(bytes);
    remember(known, name, entry, bytes, at);
    return entry;
  };
}

function isAt(part: Buffer, whole: Buffer, at: number): boolean {
  return at + part.length <= whole.length && part.compare(whole, at, at + part.length) === 0;
}

function remember(
  known: Map<string, Remembered>,
  name: string,
  entry: Entry,
  line: Buffer,
  at: number,
): void {
  const { code } = entry as { code?: Json };
  if (typeof code !== 'object' || code === null) return;
  const bytes = Buffer.from(canonicalJson(code));
  if (!isAt(bytes, line, at)) return;
  known.delete(name);
  known.set(name, { bytes, value: code });
  const [oldest] = known.keys();
  if (known.size > MOST_REMEMBERED && oldest !== undefined) known.delete(oldest);
}

function isEmptyObject(value: unknown): boolean {
  return (
    typeof value === 'object' && value !== null && !Array.isArray(value) && Object.keys(value).length === 0
  );
}
