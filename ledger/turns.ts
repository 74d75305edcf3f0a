/** Turns between processes that write to one book: the operating system's lock on an empty database file. It ends with
 *  the process that holds it, however that ends, so a crash leaves nothing to clean up. Readers take no turn. */

import { join } from 'node:path';
import { DatabaseSync } from 'node:sqlite';
import { cannotWrite, noTurn } from './problem.ts';

/** A turn lasts milliseconds. Whoever waits longer than this waits for something that hangs. */
const PATIENCE_SECONDS = 60;
const PAUSE_MILLISECONDS = 1;
const SQLITE_BUSY = 5;

export interface Turns {
  /** Waits for the turn, works, gives it back. Not to be nested.
   *  @throws LedgerProblem 'cannot-write' when the turn does not come, or the directory cannot be written. */
  take<T>(work: () => T): T;
  /** Works at once when nobody has the turn; otherwise, or where the directory cannot be written, does nothing. */
  takeIfFree(work: () => void): void;
  close(): void;
}

/** The turns of the book in a directory. The file is opened at the first turn. */
export function openTurns(directory: string): Turns {
  const path = join(directory, 'turns.sqlite');
  let lock: DatabaseSync | null = null;

  /** Whether the turn was had. BEGIN IMMEDIATE takes the lock and writes nothing. */
  function begin(): boolean {
    lock ??= new DatabaseSync(path, { timeout: 0 });
    try {
      lock.exec('BEGIN IMMEDIATE');
      return true;
    } catch (error) {
      if ((error as { errcode?: number }).errcode === SQLITE_BUSY) return false;
      throw error;
    }
  }

  return {
    take(work) {
      const patience = Date.now() + PATIENCE_SECONDS * 1000;
      while (!guard(path, begin)) {
        if (Date.now() > patience) throw noTurn(path, PATIENCE_SECONDS);
        pause();
      }
      try {
        return work();
      } finally {
        lock?.exec('ROLLBACK');
      }
    },
    takeIfFree(work) {
      try {
        if (!begin()) return;
      } catch {
        return;
      }
      try {
        work();
      } finally {
        lock?.exec('ROLLBACK');
      }
    },
    close() {
      lock?.close();
      lock = null;
    },
  };
}

function guard(path: string, begin: () => boolean): boolean {
  try {
    return begin();
  } catch (cause) {
    throw cannotWrite(path, cause);
  }
}

function pause(): void {
  Atomics.wait(new Int32Array(new SharedArrayBuffer(4)), 0, 0, PAUSE_MILLISECONDS);
}
