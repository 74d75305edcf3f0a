/** Putting a new seal in place of the latest. */

import type { KeyObject } from 'node:crypto';
import { rmSync } from 'node:fs';
import { dirname } from 'node:path';
import type { Announce } from './book.ts';
import { syncDirectory, syncFile } from './durable.ts';
import { keepSeal } from './kept-seals.ts';
import { ledgerPath } from './ledger-file.ts';
import { firstVersionPath, type Seal, type SealFacts, sealPath, signSeal, writeSeal } from './seal.ts';
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

/** Makes last what a writer that died may have written and not synced, before anything is built upon it: the ledger's
 *  bytes, and the names of keys and seals. Only within a turn. Two syncs. */
export function settle(directory: string): void {
  syncFile(ledgerPath(directory));
  syncDirectory(dirname(sealPath(directory)));
}

/** Puts a signed seal in place of one of the first version. The old one counts until there are keys (seal.ts), so the
 *  keys come after the seal that they have signed, and a crash between any two steps leaves one of both seals. */
export function replaceFirstSeal(
  directory: string,
  facts: SealFacts,
  key: KeyObject,
  announce: Announce,
): Seal {
  const { book, bytes, entries, last, root, time } = facts;
  const seal = signSeal({ book, bytes, entries, last, root, time }, key);
  writeSeal(directory, seal);
  addKey(directory, book, key, announce);
  rmSync(firstVersionPath(directory), { force: true });
  syncDirectory(dirname(firstVersionPath(directory)));
  return seal;
}
