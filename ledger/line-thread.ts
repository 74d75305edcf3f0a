/** The thread behind hashed-lines.ts: reads lines, hashes them, and hands them over in blocks. */

import { hash } from 'node:crypto';
import type { MessagePort } from 'node:worker_threads';
import { workerData } from 'node:worker_threads';
import { linesOf, withFile } from './ledger-file.ts';
import { leafHash } from './merkle.ts';

/** Places in the shared counts: blocks that were handed over, and blocks that the caller is done with. */
export const READY = 0;
export const TAKEN = 1;

/** Whole lines of about so many bytes go together. */
const BLOCK = 1 << 21;
const MOST_AHEAD = 4;
const HASH_BYTES = 32;

export interface HashedBlock {
  /** Of its first byte, in the file. */
  readonly offset: number;
  readonly bytes: Uint8Array;
  /** Of each line, where its line feed stands. */
  readonly ends: Uint32Array;
  /** 32 bytes for each line. */
  readonly digests: Uint8Array;
  /** The same, or none. */
  readonly leaves: Uint8Array;
  /** False when no line feed closes the last line. */
  readonly whole: boolean;
}

interface Task {
  readonly path: string;
  readonly from: number;
  readonly to: number;
  readonly leaves: boolean;
  readonly counts: Int32Array;
  readonly port: MessagePort;
}

interface Gathering {
  offset: number;
  bytes: number;
  whole: boolean;
  readonly lines: Buffer[];
}

if (isTask(workerData)) work(workerData);

function isTask(data: unknown): data is Task {
  return typeof data === 'object' && data !== null && 'counts' in data && 'port' in data;
}

function work({ path, from, to, leaves, counts, port }: Task): void {
  let sent = 0;
  const send = (message: HashedBlock | { error: unknown } | { end: true }, transfer: ArrayBuffer[] = []) => {
    port.postMessage(message, transfer);
    sent += 1;
    Atomics.store(counts, READY, sent);
    Atomics.notify(counts, READY);
  };
  const handOver = (gathered: Gathering) => {
    for (
      let taken = Atomics.load(counts, TAKEN);
      sent - taken >= MOST_AHEAD;
      taken = Atomics.load(counts, TAKEN)
    )
      Atomics.wait(counts, TAKEN, taken);
    const block = blockOf(gathered, leaves);
    send(
      block,
      [block.bytes, block.ends, block.digests, block.leaves].map(({ buffer }) => buffer as ArrayBuffer),
    );
  };
  try {
    withFile(path, (descriptor) => {
      let gathered: Gathering = { offset: from, bytes: 0, whole: true, lines: [] };
      for (const { bytes, whole } of linesOf(descriptor, from, to)) {
        gathered.lines.push(bytes);
        gathered.bytes += bytes.length + 1;
        gathered.whole = whole;
        if (gathered.bytes < BLOCK) continue;
        handOver(gathered);
        gathered = { offset: gathered.offset + gathered.bytes, bytes: 0, whole: true, lines: [] };
      }
      if (gathered.lines.length > 0) handOver(gathered);
    });
    send({ end: true });
  } catch (error) {
    send({ error });
  }
}

function blockOf({ offset, bytes, whole, lines }: Gathering, leaves: boolean): HashedBlock {
  const block = new Uint8Array(bytes);
  const ends = new Uint32Array(lines.length);
  const digests = new Uint8Array(HASH_BYTES * lines.length);
  const leafHashes = new Uint8Array(leaves ? HASH_BYTES * lines.length : 0);
  let at = 0;
  for (const [i, line] of lines.entries()) {
    block.set(line, at);
    at += line.length;
    ends[i] = at;
    at += 1;
    digests.set(hash('sha256', line, 'buffer'), HASH_BYTES * i);
    if (leaves) leafHashes.set(leafHash(line), HASH_BYTES * i);
  }
  return { offset, bytes: block, ends, digests, leaves: leafHashes, whole };
}
