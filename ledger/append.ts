/** Entering: one draft becomes the ledger's next line. See book.ts for the order of writing. */

import { closeSync, fsyncSync, ftruncateSync, openSync } from 'node:fs';
import { objectionsTo } from './acceptance.ts';
import type { Announce } from './book.ts';
import { canonicalJson } from './canonical.ts';
import { sha256 } from './digest.ts';
import { writeAll } from './durable.ts';
import type { Draft, Entry, Json, Person } from './entry.ts';
import { lackOf } from './entry-shape.ts';
import type { IndexKeeper } from './index-keeper.ts';
import { ledgerPath } from './ledger-file.ts';
import { badDraft, cannotWrite, ledgerDamaged, nobodyWrites } from './problem.ts';
import { digestOfEntry, readEntry } from './reading.ts';
import { recover, standingOf } from './recovery.ts';
import { readSeal, type Seal, sealPath, writeSeal } from './seal.ts';
import type { Store } from './store.ts';
import { formatTime } from './time.ts';
import type { Turns } from './turns.ts';

export interface Writer {
  readonly directory: string;
  readonly turns: Turns;
  readonly keeper: IndexKeeper;
  readonly store: Store;
  readonly by: Person | undefined;
  readonly now: () => Date;
  readonly announce: Announce;
}

/** Enters a draft; what Book.append promises. */
export function appendEntry(writer: Writer, draft: Draft): { entry: Entry; digest: string } {
  const { by, directory, turns } = writer;
  if (by === undefined) throw nobodyWrites();
  return turns.take(() => {
    const seal = sealedState(writer);
    const entry = fillIn(writer, by, draft, seal);
    requireAcceptable(writer, entry, seal);
    const text = canonicalJson(entry as unknown as Json, draft.type);
    const digest = sha256(text);
    const line = Buffer.from(`${text}\n`);
    writeLine(directory, seal, line, digest);
    level(writer.keeper);
    return { entry, digest };
  });
}

/** The seal that the ledger's end agrees with, after what an interrupted writer left has been put right. */
function sealedState({ directory, announce }: Writer): Seal {
  const standing = standingOf(directory);
  if (standing.state === 'damaged') throw ledgerDamaged(ledgerPath(directory), undefined, standing.what);
  return standing.state === 'unsealed' ? recover(directory, standing, announce) : standing.seal;
}

function requireAcceptable({ directory, keeper, store }: Writer, entry: Entry, seal: Seal): void {
  const lacks = lackOf(entry);
  if (lacks !== null) throw badDraft(entry.type, lacks);
  const [objection] = objectionsTo(entry, {
    hasFile: (file) => store.has(file),
    entry: (number) =>
      Number.isSafeInteger(number) && number >= 1 && number <= seal.entries
        ? { entry: readEntry(directory, keeper, number), digest: digestOfEntry(keeper, number) }
        : undefined,
  });
  if (objection !== undefined) throw badDraft(entry.type, objection);
}

function fillIn({ keeper, now }: Writer, by: Person, draft: Draft, seal: Seal): Entry {
  const common = {
    book: seal.book,
    number: seal.entries + 1,
    before: seal.last,
    time: formatTime(now()),
    by,
  };
  if (draft.type !== 'run') return { ...draft, ...common };
  const last = keeper.ask((index) =>
    index.get<{ run: number | null }>('SELECT max(run) AS run FROM entries'),
  );
  return { ...draft, ...common, run: (last?.run ?? 0) + 1 };
}

/** Writes the line and its seal, or neither. */
function writeLine(directory: string, seal: Seal, line: Buffer, digest: string): void {
  const path = ledgerPath(directory);
  const grown: Seal = {
    book: seal.book,
    bytes: seal.bytes + line.length,
    entries: seal.entries + 1,
    last: digest,
  };
  let descriptor: number | undefined;
  try {
    descriptor = openSync(path, 'a');
    writeAll(descriptor, line);
    fsyncSync(descriptor);
    writeSeal(directory, grown);
  } catch (cause) {
    // A seal that was replaced before its directory failed to sync counts: taking the line back would be damage.
    if (descriptor !== undefined && !isSealed(directory, grown)) ftruncateSync(descriptor, seal.bytes);
    throw cannotWrite(descriptor === undefined ? path : sealPath(directory), cause);
  } finally {
    if (descriptor !== undefined) closeSync(descriptor);
  }
}

function isSealed(directory: string, grown: Seal): boolean {
  const seal = readSeal(directory);
  return typeof seal !== 'string' && seal.entries >= grown.entries;
}

/** Brings the index up while the turn lasts. It may fail: the entry stands, and the next question brings it up. */
function level(keeper: IndexKeeper): void {
  try {
    keeper.ask(() => {});
  } catch {}
}
