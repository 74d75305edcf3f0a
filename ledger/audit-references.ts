/** The part of an audit that asks, entry by entry, whether what it names is there. What later entries must know of
 *  earlier ones is kept small: a digest for each entry, a name and a digest for each output. */

import { findObjections, type Known, type KnownEntry, type Objection } from './acceptance.ts';
import type { AuditedTree, LedgerLine } from './audit-ledger.ts';
import type { StoredFile } from './entry.ts';

const DIGEST_BYTES = 32;

export interface Recollection {
  /** Keeps what must be known of the next entry; null of a damaged one. */
  add(entry: KnownEntry | null): void;
  /** As Known.entry. */
  get(number: number): KnownEntry | null | undefined;
}

/** What does not hold about an entry; nothing is asked of one that is damaged itself. */
export function auditReferences(
  recollection: Recollection,
  { entry, number, digest }: LedgerLine,
  damaged: boolean,
  tree: AuditedTree,
  hasFile: (file: StoredFile) => boolean,
): Objection[] {
  if (damaged || entry === null) {
    recollection.add(null);
    return [];
  }
  const known: Known = {
    hasFile,
    book: entry.book,
    entry: (earlier) => (earlier < number ? recollection.get(earlier) : undefined),
    rootAt: (size) => (size < number ? tree.rootAt(size) : null),
  };
  const objections = findObjections(entry, known);
  recollection.add({ entry, digest });
  return objections;
}

/** An empty recollection. Memory: 40 bytes an entry, 36 an output. */
export function recollect(): Recollection {
  const digests = growing();
  const outputs = growing();
  const names: string[] = [];
  const ids = new Map<string, number>();
  /** By entry, the number of outputs before its own. */
  const starts: number[] = [0];
  const damaged = new Set<number>();
  const idOf = (name: string) => {
    const id = ids.get(name) ?? names.length;
    if (id === names.length) {
      names.push(name);
      ids.set(name, id);
    }
    return id;
  };
  let count = 0;
  let kept = 0;
  const WIDTH = DIGEST_BYTES + 4;
  return {
    add(entry) {
      count += 1;
      if (entry === null) damaged.add(count);
      digests.room(DIGEST_BYTES * count).write(entry?.digest ?? '', DIGEST_BYTES * (count - 1), 'hex');
      for (const [name, { digest }] of outputsOf(entry)) {
        const bytes = outputs.room(WIDTH * (kept + 1));
        bytes.writeUInt32LE(idOf(name), WIDTH * kept);
        bytes.write(digest, WIDTH * kept + 4, 'hex');
        kept += 1;
      }
      starts.push(kept);
    },
    get(number) {
      if (!(Number.isSafeInteger(number) && number >= 1 && number <= count)) return undefined;
      if (damaged.has(number)) return null;
      const hex = (bytes: Buffer, at: number) => bytes.toString('hex', at, at + DIGEST_BYTES);
      const found: Record<string, { digest: string }> = Object.create(null);
      const bytes = outputs.room(0);
      for (let i = starts[number - 1] as number; i < (starts[number] as number); i += 1)
        found[names[bytes.readUInt32LE(WIDTH * i)] as string] = { digest: hex(bytes, WIDTH * i + 4) };
      const digest = hex(digests.room(0), DIGEST_BYTES * (number - 1));
      return { digest, entry: { type: 'stage', outputs: found } };
    },
  };
}

function outputsOf(known: KnownEntry | null): [string, { readonly digest: string }][] {
  return known?.entry.type === 'stage' ? Object.entries(known.entry.outputs) : [];
}

/** Bytes with room for so many at least. */
function growing(): { room(bytes: number): Buffer } {
  let buffer = Buffer.alloc(1 << 12);
  return {
    room(bytes) {
      while (buffer.length < bytes) buffer = Buffer.concat([buffer, Buffer.alloc(buffer.length)]);
      return buffer;
    },
  };
}
