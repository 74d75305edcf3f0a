/** A bag as something to execute again: its entries, and a temporary book whose store has its inputs and takes what is
 *  computed. The book goes afterwards. */

import { lstatSync, mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { type Book, openBook } from '../../ledger/book.ts';
import type { StageEntry } from '../../ledger/entry.ts';
import { type RerunSubject, stageEntry, stagesOfRun, withUpstream } from '../commands/rerun-subject.ts';
import { type Bag, openBag } from './open-bag.ts';
import { badBag } from './problem.ts';

export interface BagBook {
  readonly bag: Bag;
  /** Temporary; it has no entries of the bag. */
  readonly book: Book;
  readonly subject: RerunSubject;
  readonly read: Bag['read'];
}

/** Whether a directory is meant as a bag; whether it is one is `openBag`'s to say. */
export function isBag(directory: string): boolean {
  const lies = (path: string) => lstatSync(path, { throwIfNoEntry: false }) !== undefined;
  return lies(join(directory, 'bagit.txt')) || lies(join(directory, 'manifest-sha256.txt'));
}

/** Checks a bag, hands it over with a temporary book, and removes the book.
 *  @throws RunnerProblem 'no-bag', 'bad-bag' */
export async function withBagBook<T>(directory: string, use: (bagged: BagBook) => Promise<T>): Promise<T> {
  const bag = openBag(directory);
  const subject = subjectIn(bag);
  const folder = mkdtempSync(join(tmpdir(), 'platebook-bag-'));
  try {
    const book = openBook(join(folder, 'book'), {
      by: { name: 'unnamed' },
      name: bag.book,
      create: true,
      key: join(folder, 'key.pem'),
    });
    try {
      for (const stage of subject.stages) keepInputs(stage, bag, book);
      return await use({ bag, book, subject, read: bag.read });
    } finally {
      book.close();
    }
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}

function subjectIn({ entries, subject }: Bag): RerunSubject {
  const entryOf = (number: number) => entries.get(number)?.entry;
  const of = entryOf(subject);
  const runs = [...entries.values()].flatMap(({ entry }) => (entry.type === 'run' ? [entry] : []));
  if (of?.type === 'run') return { of, run: of, stages: stagesOfRun(of, entryOf) };
  if (of?.type !== 'stage' && of?.type !== 'plate') {
    throw badBag(
      'bag-info.txt',
      'a Platebook-Entry that is a run, a plate or a stage',
      of?.type ?? 'nothing',
    );
  }
  const stage = of.type === 'stage' ? of : stageEntry(of.drawn, entryOf);
  return { of, run: runs[0] ?? null, stages: withUpstream(stage, entryOf) };
}

/** Files from outside that the bag holds; those that it does not are looked for where the recipe names them. */
function keepInputs(stage: StageEntry, bag: Bag, book: Book): void {
  for (const input of Object.values(stage.inputs).flat()) {
    if ('file' in input.origin && bag.has(input)) book.store.keepBytes(bag.read(input.digest));
  }
}
