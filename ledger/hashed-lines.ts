/** Lines of a ledger with their digests, read and hashed in a thread of its own while the caller works on those before.
 *  For long ledgers: starting the thread takes some 50 ms, hashing a gigabyte a second.
 *
 *  The caller does not return to its event loop. So both sides count blocks in shared memory: the thread waits while it
 *  is too far ahead, the caller while there is none. What goes from one to the other: line-thread.ts. */

import { closeSync, openSync } from 'node:fs';
import { MessageChannel, receiveMessageOnPort, Worker } from 'node:worker_threads';
import { sha256 } from './digest.ts';
import { linesOf } from './ledger-file.ts';
import { type HashedBlock, READY, TAKEN } from './line-thread.ts';
import { leafHash } from './merkle.ts';

/** Below this, a thread does not pay. */
const WORTH_A_THREAD = 1 << 26;
const PATIENCE_MILLISECONDS = 60_000;
const HASH_BYTES = 32;
const NO_HASH = Buffer.alloc(0);

export interface HashedLine {
  /** Without its line feed. */
  readonly bytes: Buffer;
  readonly offset: number;
  readonly whole: boolean;
  /** SHA-256 in hexadecimal. */
  readonly digest: string;
  /** The hash of the line as a leaf of the tree; empty unless leaves were asked for. */
  readonly leaf: Buffer;
}

/** The lines between two bytes of a file, in order, hashed. @param leaves  hash them for the tree as well */
export function* hashedLines(path: string, from: number, to: number, leaves = false): Generator<HashedLine> {
  if (to - from >= WORTH_A_THREAD) {
    yield* linesOfThread(path, from, to, leaves);
    return;
  }
  const descriptor = openSync(path, 'r');
  try {
    for (const { bytes, offset, whole } of linesOf(descriptor, from, to))
      yield { bytes, offset, whole, digest: sha256(bytes), leaf: leaves ? leafHash(bytes) : NO_HASH };
  } finally {
    closeSync(descriptor);
  }
}

function* linesOfThread(path: string, from: number, to: number, leaves: boolean): Generator<HashedLine> {
  const counts = new Int32Array(new SharedArrayBuffer(8));
  const { port1, port2 } = new MessageChannel();
  const thread = new URL(`line-thread${import.meta.url.slice(-3)}`, import.meta.url);
  const worker = new Worker(thread, {
    workerData: { path, from, to, leaves, counts, port: port2 },
    transferList: [port2],
  });
  worker.unref();
  let taken = 0;
  try {
    for (;;) {
      const block = nextBlock(port1, counts, taken);
      if (block === null) return;
      yield* linesOfBlock(block);
      taken += 1;
      Atomics.store(counts, TAKEN, taken);
      Atomics.notify(counts, TAKEN);
    }
  } finally {
    port1.close();
    worker.terminate();
  }
}

function nextBlock(
  port: Parameters<typeof receiveMessageOnPort>[0],
  counts: Int32Array,
  taken: number,
): HashedBlock | null {
  for (;;) {
    const received = receiveMessageOnPort(port)?.message as
      | HashedBlock
      | { error: unknown }
      | { end: true }
      | undefined;
    if (received === undefined) {
      if (Atomics.wait(counts, READY, taken, PATIENCE_MILLISECONDS) === 'timed-out')
        throw new Error('the thread that reads the ledger does not answer');
    } else if ('error' in received) throw received.error;
    else return 'end' in received ? null : received;
  }
}

function* linesOfBlock({ offset, bytes, ends, digests, leaves, whole }: HashedBlock): Generator<HashedLine> {
  const block = Buffer.from(bytes.buffer, bytes.byteOffset, bytes.length);
  const [ofDigests, ofLeaves] = [Buffer.from(digests.buffer), Buffer.from(leaves.buffer)];
  let start = 0;
  for (let i = 0; i < ends.length; i += 1) {
    const end = ends[i] as number;
    const at = HASH_BYTES * i;
    yield {
      bytes: block.subarray(start, end),
      offset: offset + start,
      whole: whole || i < ends.length - 1,
      digest: ofDigests.toString('hex', at, at + HASH_BYTES),
      leaf: ofLeaves.subarray(at, at + HASH_BYTES),
    };
    start = end + 1;
  }
}
