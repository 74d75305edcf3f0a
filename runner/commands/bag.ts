/** `bag WHAT --to DIR` writes an RFC 8493 bag that anyone can check without Platebook; `bag DIR --into BOOK` takes a
 *  bag's entries over into another book. */

import { resolve } from 'node:path';
import { openBook } from '../../ledger/book.ts';
import { gather } from '../bag/gather.ts';
import { importBag } from '../bag/import-bag.ts';
import { makeBag } from '../bag/make-bag.ts';
import { openBag } from '../bag/open-bag.ts';
import { badBagCall } from '../bag/problem.ts';
import type { CommonOptions, ExitStatus, Io } from '../command.ts';
import { keyFile, writer } from '../configuration.ts';
import { counted, roundSize } from '../text-table.ts';

export interface BagOptions extends CommonOptions {
  readonly to?: string;
  readonly into?: string;
  readonly inputs: string;
  /** `FILE=URL`, a file as the recipe names it and where it can be fetched. */
  readonly location: readonly string[];
  readonly by?: string;
}

export async function bagCommand(words: readonly string[], options: BagOptions, io: Io): Promise<ExitStatus> {
  if ((options.to === undefined) === (options.into === undefined)) {
    throw badBagCall(
      'bag: expected --to with a directory for the bag, or --into with a book, got both or none. Give one of them.',
    );
  }
  return options.to === undefined ? takeOver(words, options, io) : write(words, options.to, options, io);
}

function write(words: readonly string[], to: string, options: BagOptions, io: Io): ExitStatus {
  const inputs = options.inputs;
  if (inputs !== 'kept' && inputs !== 'reference') {
    throw badBagCall(
      `--inputs: expected kept or reference, got ${JSON.stringify(inputs)}. Write one of the two.`,
    );
  }
  const locations = new Map(options.location.map(readLocation));
  const book = openBook(options.book, { announce: (text) => io.err(`${text}\n`) });
  try {
    const gathered = gather(book, words, io.cwd);
    const made = makeBag({ book, gathered, to: resolve(io.cwd, to), inputs, locations, cwd: io.cwd });
    if (options.json) io.out(`${JSON.stringify(made, null, 2)}\n`);
    else if (!options.quiet) {
      io.out(
        `${gathered.title} is in the bag ${to}: ${counted(gathered.entries.length, 'entry', 'entries')}, ` +
          `${counted(made.files, 'file', 'files')}, ${roundSize(made.bytes)}. ${to}/README.txt says how to check it.\n`,
      );
    }
    return 0;
  } finally {
    book.close();
  }
}

function readLocation(text: string): [file: string, url: string] {
  const at = text.lastIndexOf('=http');
  const url = text.slice(at + 1);
  // fetch.txt ends a URL at white space (RFC 8493, section 2.2.3).
  if (at > 0 && URL.canParse(url) && !/\s/.test(url)) return [text.slice(0, at), url];
  throw badBagCall(
    `--location: expected FILE=URL with an http or https URL, got ${JSON.stringify(text)}. Write it so.`,
  );
}

async function takeOver(words: readonly string[], options: BagOptions, io: Io): Promise<ExitStatus> {
  const [directory, ...more] = words;
  if (directory === undefined || more.length > 0) {
    throw badBagCall(`bag --into: expected one bag, got ${words.join(' ')}. Name one directory.`);
  }
  const bag = openBag(resolve(io.cwd, directory));
  const into = resolve(io.cwd, options.into ?? '');
  const book = openBook(into, {
    by: await writer(io, options.by),
    create: true,
    key: keyFile(io),
    announce: (text) => io.err(`${text}\n`),
  });
  try {
    const imported = importBag(bag, book);
    const document = { path: bag.directory, ...bag.size, book: bag.book, ...imported };
    if (options.json) io.out(`${JSON.stringify(document, null, 2)}\n`);
    else if (!options.quiet) {
      const stood = imported.standing.length === 0 ? '' : `; ${imported.standing.length} stood there already`;
      io.out(
        `${counted(imported.entries.length, 'entry', 'entries')} of the book ${bag.book} taken over into ${options.into}${stood}.\n`,
      );
    }
    return 0;
  } finally {
    book.close();
  }
}
