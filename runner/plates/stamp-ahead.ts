/** Stamps figures in threads of their own as soon as they are drawn, while other stages run: to draw the pixels of a plate
 *  takes a third of a second. The bytes are those of stamp.ts; nothing depends on what is done ahead. */

import { join } from 'node:path';
import { Worker } from 'node:worker_threads';
import { sourceExtension, sourceRoot } from '../program.ts';
import type { Stamp } from './stamp.ts';

export interface Stamped {
  readonly svg: Uint8Array;
  readonly png: Uint8Array;
}

export interface StampAhead {
  /** Starts the threads: a figure is being drawn. */
  expect(): void;
  begin(figure: Uint8Array, stamp: Stamp): void;
  /** What was begun with the same stamp, when it is done; null when nothing was, or it did not work. */
  take(stamp: Stamp): Promise<Stamped | null>;
  close(): Promise<void>;
}

/** A stage may draw several figures at once, and the last ones find both cores idle. */
const THREADS = 2;

export function makeStampAhead(): StampAhead {
  const begun = new Map<string, Promise<Stamped | null>>();
  let threads: Thread[] = [];
  const start = () => {
    if (threads.length === 0) threads = Array.from({ length: THREADS }, startThread);
  };
  return {
    expect: start,
    begin(figure, stamp) {
      start();
      begun.set(JSON.stringify(stamp), threads[begun.size % THREADS].stamp(figure, stamp));
    },
    take: async (stamp) => (await begun.get(JSON.stringify(stamp))) ?? null,
    async close() {
      await Promise.all(threads.map((thread) => thread.close()));
    },
  };
}

interface Thread {
  stamp(figure: Uint8Array, stamp: Stamp): Promise<Stamped | null>;
  close(): Promise<unknown>;
}

function startThread(): Thread {
  const waiting = new Map<number, (stamped: Stamped | null) => void>();
  let count = 0;
  const worker = new Worker(join(sourceRoot, 'runner', 'plates', `stamp-worker${sourceExtension}`));
  const giveUp = () => {
    for (const settle of waiting.values()) settle(null);
    waiting.clear();
  };
  worker.on('message', ({ id, stamped }: { id: number; stamped: Stamped | null }) => {
    waiting.get(id)?.(stamped);
    waiting.delete(id);
  });
  worker.on('error', giveUp);
  worker.on('exit', giveUp);
  return {
    stamp(figure, stamp) {
      const id = count++;
      worker.postMessage({ id, figure, stamp });
      return new Promise((settle) => waiting.set(id, settle));
    },
    close: () => worker.terminate(),
  };
}
