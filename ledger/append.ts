/** Entering: one draft becomes the ledger's next line. See book.ts for the order of writing. */

import type { KeyObject } from 'node:crypto';
import { closeSync, fsyncSync, ftruncateSync, openSync } from 'node:fs';
import { objectionsTo } from './acceptance.ts';
import type { Announce } from './book.ts';
import { canonicalJson } from './canonical.ts';
import { sha256 } from './digest.ts';
import { writeAll } from './durable.ts';
import type { Draft, Entry, Json, Person } from './entry.ts';
import { lackOf } from './entry-shape.ts';
import { LAST_RUN } from './index.ts';
import type { IndexKeeper } from './index-keeper.ts';
import { ledgerPath } from './ledger-file.ts';
import { asProblem, badDraft, cannotWrite, ledgerDamaged, nobodyWrites } from './problem.ts';
import { digestOfEntry, readEntry } from './reading.ts';
import { recover, type Sealed, standingOf, takeUp } from './recovery.ts';
import { readSeal, type Seal, type SealFacts, sealPath } from './seal.ts';
import { replaceSeal, settle } from './sealing.ts';
import type { Store } from './store.ts';
import { formatTime } from './time.ts';
import { askTree, type GrowingTree, growTree, rootOf, treeUnder } from './tree.ts';
import type { Turns } from './turns.ts';

export interface Writer {
  readonly directory: string;
  readonly turns: Turns;
  readonly keeper: IndexKeeper;
  readonly store: Store;
  readonly by: Person | undefined;
  readonly now: () => Date;
  readonly announce: Announce;
  /** The key that signs; read, or made, when it is first needed. */
  readonly key: () => KeyObject;
  /** Whether this writer has said that the clock is behind. */
  clockSaid?: boolean;
  /** What this writer itself sealed last: it need not be verified or read again. */
  own: { readonly note: string | null; readonly tree: GrowingTree } | null;
}

/** Enters a draft; what Book.append promises. */
export function appendEntry(writer: Writer, draft: Draft): { entry: Entry; digest: string } {
  const { by, turns } = writer;
  if (by === undefined) throw nobodyWrites();
  try {
    return turns.take(() => enter(writer, by, draft));
  } catch (error) {
    throw asProblem(error, writer.directory, true);
  }
}

function enter(writer: Writer, by: Person, draft: Draft): { entry: Entry; digest: string } {
  const sealed = sealedState(writer);
  const entry = fillIn(writer, by, draft, sealed.seal);
  warnOfClock(writer, entry, sealed.seal);
  requireAcceptable(writer, entry, sealed.seal);
  const text = canonicalJson(entry as unknown as Json, draft.type);
  const digest = sha256(text);
  writeLine(writer, sealed, Buffer.from(`${text}\n`), digest, entry.time);
  level(writer.keeper);
  return { entry, digest };
}

/** The seal that the ledger's end agrees with, after what an interrupted writer left has been put right. */
function sealedState({ directory, announce, own, key, now }: Writer): Sealed {
  const standing = standingOf(directory, own?.note ?? null);
  if (standing.state === 'damaged') throw ledgerDamaged(ledgerPath(directory), undefined, standing.what);
  if (own === null) settle(directory);
  if (standing.state === 'sealed' && standing.seal.note !== null) return standing;
  const sealing = { key: key(), time: formatTime(now()) };
  const sealed = standing.state === 'sealed' ? standing : recover(directory, standing, announce, sealing);
  return sealed.seal.note === null ? takeUp(directory, sealed, announce, sealing) : sealed;
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
    book: seal.book,
    rootAt: (size) => rootUnder(directory, seal, size),
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
  const last = keeper.ask((index) => index.get<{ run: number }>(LAST_RUN));
  return { ...draft, ...common, run: (last?.run ?? 0) + 1 };
}

/** The order of entries is that of their numbers; a clock that was set back changes nothing in it, but is said. */
function warnOfClock(writer: Writer, { number, time }: Entry, { entries, time: sealed }: Seal): void {
  if (writer.clockSaid || entries === 0 || sealed === null || !(time < sealed)) return;
  writer.clockSaid = true;
  writer.announce(
    `The clock says ${time}, which is before entry ${entries} of ${sealed}: entry ${number} is dated by it all the ` +
      'same, and the numbers give the order. Set the clock.',
    'clock',
  );
}

/** The root of the first `size` entries, base64; null when there are not so many. */
function rootUnder(directory: string, seal: Seal, size: number): string | null {
  if (!(Number.isSafeInteger(size) && size >= 0 && size <= seal.entries)) return null;
  const whole = (tree: { rootAt(size: number): Buffer }) =>
    [tree.rootAt(size), tree.rootAt(seal.entries)] as const;
  const isRight = ([, root]: readonly [Buffer, Buffer]) => root.toString('base64') === seal.root;
  return askTree(directory, seal, whole, isRight)[0].toString('base64');
}

/** Writes the line and its seal, or neither. */
function writeLine(
  writer: Writer,
  { seal, lastType }: Sealed,
  line: Buffer,
  digest: string,
  time: string,
): void {
  const { directory, announce, own } = writer;
  const path = ledgerPath(directory);
  const key = writer.key();
  const before = own !== null && own.note === seal.note ? own.tree : treeUnder(directory, seal);
  const tree = growTree(directory, before, line.subarray(0, -1));
  const grown: SealFacts = {
    book: seal.book,
    bytes: seal.bytes + line.length,
    entries: seal.entries + 1,
    last: digest,
    root: rootOf(tree),
    time,
  };
  let descriptor: number | undefined;
  try {
    descriptor = openSync(path, 'a');
    writeAll(descriptor, line);
    fsyncSync(descriptor);
    const { note } = replaceSeal(directory, grown, key, announce, lastType === 'run' ? seal : null);
    writer.own = { note, tree };
  } catch (cause) {
    // A seal that was replaced before its directory failed to sync counts: taking the line back would be damage.
    if (descriptor !== undefined && !isSealed(directory, grown)) ftruncateSync(descriptor, seal.bytes);
    throw cannotWrite(descriptor === undefined ? path : sealPath(directory), cause);
  } finally {
    if (descriptor !== undefined) closeSync(descriptor);
  }
}

function isSealed(directory: string, grown: SealFacts): boolean {
  const seal = readSeal(directory);
  return typeof seal !== 'string' && seal.entries >= grown.entries;
}

/** Brings the index up while the turn lasts. It may fail: the entry stands, and the next question brings it up. */
function level(keeper: IndexKeeper): void {
  try {
    keeper.ask(() => {});
  } catch {}
}
