/** The thread in which figures are stamped while stages still run: see stamp-ahead.ts. */

import { parentPort } from 'node:worker_threads';
import { type Stamp, stampFigure } from './stamp.ts';

parentPort?.on('message', async ({ id, figure, stamp }: { id: number; figure: Uint8Array; stamp: Stamp }) => {
  try {
    parentPort?.postMessage({ id, stamped: await stampFigure(figure, stamp) });
  } catch {
    // The figure is stamped again by who wants it, and the error said there.
    parentPort?.postMessage({ id, stamped: null });
  }
});
