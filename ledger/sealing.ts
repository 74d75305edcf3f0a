/** Putting a new seal in place of the latest. */

import type { KeyObject } from 'node:crypto';
import { rmSync } from 'node:fs';
import { dirname } from 'node:path';
import type { Announce } from './book.ts';
import { syncDirectory } from './durable.ts';
import { keepSeal } from './kept-seals.ts';
import { firstVersionPath, type Seal, type SealFacts, signSeal, writeSeal } from './seal.ts';
import { addKey } from './seal-keys.ts';

/** Signs a seal and makes it the latest. Only within a turn. Two syncs, one more when a seal is kept.
 *  @param keep  the latest so far, where it is one to keep */
export function replaceSeal(
  directory: string,
  facts: SealFacts,
  key: KeyObject,
  announce: Announce,
  keep: Seal | null,
): Seal {
  addKey(directory, facts.book, key, announce);
  if (keep !== null) keepSeal(directory, keep, announce);
  const { book, bytes, entries, last, root, time } = facts;
  const seal = signSeal({ book, bytes, entries, last, root, time }, key);
  writeSeal(directory, seal);
  return seal;
}

/** Removes the unsigned seal of the first version, once a signed one stands. */
export function firstVersionIsPast(directory: string): void {
  rmSync(firstVersionPath(directory), { force: true });
  syncDirectory(dirname(firstVersionPath(directory)));
}
