/** Stamps figures in a thread of its own as soon as they are drawn, while other stages run: to draw the pixels of a plate
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
  /** Starts the thread: a figure is being drawn. */
  expect(): void;
  begin(figure: Uint8Array, stamp: Stamp): void;
  /** What was begun with the same stamp, when it is done; null when nothing was, or it did not work. */
  take(stamp: Stamp): Promise<Stamped | null>;
  close(): Promise<void>;
}

export function makeStampAhead(): StampAhead {
  const begun = new Map<string, Promise<Stamped | null>>();
  const waiting = new Map<number, (stamped: Stamped | null) => void>();
  let worker: Worker | null = null;
  const giveUp = () => {
    for (const settle of waiting.values()) settle(null);
    waiting.clear();
  };
  const start = () => {
    worker = new Worker(join(sourceRoot, 'runner', 'plates', `stamp-worker${sourceExtension}`));
    worker.on('message', ({ id, stamped }: { id: number; stamped: Stamped | null }) => {
      waiting.get(id)?.(stamped);
      waiting.delete(id);
    });
    worker.on('error', giveUp);
    worker.on('exit', giveUp);
    return worker;
  };
  return {
    expect: () => void (worker ?? start()),
    begin(figure, stamp) {
      const id = begun.size;
      const done = new Promise<Stamped | null>((settle) => waiting.set(id, settle));
      begun.set(JSON.stringify(stamp), done);
      (worker ?? start()).postMessage({ id, figure, stamp });
    },
    take: async (stamp) => (await begun.get(JSON.stringify(stamp))) ?? null,
    async close() {
      await worker?.terminate();
    },
  };
}
