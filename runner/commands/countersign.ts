/** `countersign WHAT`: a second person's signature under an entry, or under a seal: `countersign seal` signs the latest,
 *  `countersign FILE` the one in a file. */

import { readFileSync, statSync } from 'node:fs';
import { resolve } from 'node:path';
import { type Book, openBook } from '../../ledger/book.ts';
import { signEntry, signSealToo } from '../../ledger/countersignature.ts';
import type { CountersignatureDraft, CountersignatureEntry, Person } from '../../ledger/entry.ts';
import { noProof } from '../../ledger/problem.ts';
import { formatSeal, parseSeal, readSeal, type Seal } from '../../ledger/seal.ts';
import { readSigningKey, useSigningKey } from '../../ledger/signing-key.ts';
import { findSubject } from '../../ledger/subject.ts';
import type { CommonOptions, ExitStatus, Io } from '../command.ts';
import { keyFile, writer } from '../configuration.ts';
import { wrapText } from '../text-table.ts';
import { entryTitle, signedThing } from './entry-title.ts';
import { entryNamed } from './withdraw.ts';

/** A seal is some 600 bytes; a larger file is none. */
const LARGEST_SEAL = 1 << 16;

export interface CountersignOptions extends CommonOptions {
  /** The signer's key; the configured one by default. */
  readonly key?: string;
  readonly by?: string;
}

/** Enters a countersignature. @throws LedgerProblem when there is no such thing, the key cannot be used, or nothing can be
 *  written. */
export async function countersignCommand(
  words: readonly string[],
  options: CountersignOptions,
  io: Io,
): Promise<ExitStatus> {
  const by = await writer(io, options.by);
  const own = keyFile(io);
  const announce = (text: string) => io.err(`${text}\n`);
  const book = openBook(options.book, { by, key: own, announce });
  try {
    const key =
      options.key === undefined ? useSigningKey(own, announce) : readSigningKey(resolve(io.cwd, options.key));
    const seal = sealNamed(book, words, io);
    const draft =
      seal === null
        ? signEntry(book, entryNamed(findSubject(book, words, io.cwd)), by, key)
        : signSealToo(seal, formatSeal(seal), by, key);
    noteSamePerson(book, draft, by, io);
    const entry = book.append(draft).entry as CountersignatureEntry;
    const document = { entry: entry.number, signs: entry.signs, what: entry.what, key: entry.key };
    if (options.json) io.out(`${JSON.stringify(document, null, 2)}\n`);
    else if (!options.quiet) io.out(countersignText(entry, book, io.columns));
    return 0;
  } finally {
    book.close();
  }
}

/** The seal that is meant: the latest, or the one in a file; null when something else is meant. */
function sealNamed(book: Book, words: readonly string[], io: Io): Seal | null {
  const asked = words.join(' ').trim();
  if (asked === 'seal') {
    const seal = readSeal(book.directory);
    if (typeof seal === 'string' || seal.note === null)
      throw noProof('The book has no signed seal', 'Audit the book.');
    return seal;
  }
  const path = resolve(io.cwd, asked);
  const found = statSync(path, { throwIfNoEntry: false });
  return found?.isFile() === true && found.size <= LARGEST_SEAL ? parseSeal(readFileSync(path)) : null;
}

/** A countersignature is to be a second person's. Whether it is cannot be told from names, so it is only said. */
function noteSamePerson(book: Book, { signs }: CountersignatureDraft, by: Person, io: Io): void {
  if (book.entry(signs).by.name === by.name)
    io.err(
      `Note: ${by.name} wrote entry ${signs} too; a countersignature is worth more from a second person.\n`,
    );
}

function countersignText(entry: CountersignatureEntry, book: Book, columns: number): string {
  const width = Math.min(100, Math.max(80, columns));
  const of = entry.what.includes('\n') ? '' : `, ${entryTitle(book.entry(entry.signs))},`;
  const said = `${signedThing(entry)}${of} is signed by ${entry.by.name}, in entry ${entry.number}, with key ${entry.key}`;
  return `${wrapText(`${said[0]?.toUpperCase()}${said.slice(1)}`, width).join('\n')}\n`;
}
