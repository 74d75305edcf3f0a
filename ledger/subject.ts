/** What a person means: an entry's number, a plate number, `run 12`, a published number's name (in the last run, or
 *  `NAME in run 12`), a digest or the beginning of one, or a file. A file is known by its digest, then by the plate
 *  number that stands in it, so a figure that was saved again by another program is still found. */

import { readdirSync, readFileSync, statSync } from 'node:fs';
import { dirname, resolve } from 'node:path';
import type { Book } from './book.ts';
import { isDigest } from './digest.ts';
import { embeddedTexts } from './embedded-text.ts';
import type { PublishedNumber, RunEntry } from './entry.ts';
import type { FileRow, PlateRow } from './index.ts';
import { beginsWith, markOf, restOf } from './index-rows.ts';
import { nearMisses } from './near-miss.ts';
import {
  checkSymbols,
  findPlateNumbers,
  formatPlateNumber,
  type PlateNumber,
  parsePlateNumber,
  plateNumbersOf,
} from './plate-number.ts';
import { ambiguous, badCall, notFound } from './problem.ts';
import { referencesOf } from './references.ts';

/** Larger files are known by their digest only. */
const LARGEST_SEARCHED = 1 << 28;
const PREFIX_LEAST = 6;
/** Digests that are told apart when a beginning is not enough. */
const MOST_NAMED = 6;

/** `entries` are those with which a lineage begins: nearest to the subject. */
export type Subject = { readonly asked: string; readonly entries: readonly number[] } & (
  | { readonly type: 'entry'; readonly entry: number }
  | { readonly type: 'run'; readonly run: number; readonly entry: number }
  | { readonly type: 'plate'; readonly plate: string; readonly drawn: number; readonly output: string }
  | { readonly type: 'number'; readonly run: number; readonly number: PublishedNumber }
  | FileSubject
);

export interface FileSubject {
  readonly type: 'file';
  readonly digest: string;
  readonly bytes: number;
  /** What the file is to the entries that name it, nearest first. An `input` came from outside: nothing made it. */
  readonly roles: readonly { readonly entry: number; readonly role: string; readonly name: string }[];
}

/** The subject of a question.
 *  @param words  as they stand on the command line
 *  @param cwd    where a relative path begins
 *  @throws LedgerProblem 'not-found' with near misses, 'ambiguous', 'file-unreadable'. */
export function findSubject(book: Book, words: readonly string[], cwd = process.cwd()): Subject {
  const asked = words.join(' ').trim();
  if (asked === '')
    throw badCall('Expected what to look up: an entry, a plate number, a run, a digest, a file.');
  return (
    runSubject(book, asked) ??
    numberInRun(book, asked) ??
    entrySubject(book, asked) ??
    plateSubject(book, asked) ??
    (isDigest(asked) ? digestSubject(book, asked, asked) : null) ??
    fileSubject(book, asked, cwd) ??
    numberInLastRun(book, asked) ??
    prefixSubject(book, asked) ??
    unknown(book, asked, cwd)
  );
}

/** The run that is meant: `12`, `run 12`, `last`, `last-1`. @throws LedgerProblem 'bad-call', 'not-found'. */
export function findRunNamed(book: Book, text: string): RunEntry {
  const parts = /^(?:run\s*)?(?:(\d+)|last(?:-(\d+))?)$/i.exec(text.trim());
  if (parts === null) throw badCall(`${JSON.stringify(text)}: expected a run such as 12, last or last-1.`);
  const last = book.lastRun()?.run ?? 0;
  const wanted = parts[1] === undefined ? last - Number(parts[2] ?? 0) : Number(parts[1]);
  const run = book.findRun(wanted);
  if (run !== undefined) return run;
  if (last === 0) throw notFound('The book has no run yet', 'Run a recipe first.');
  throw notFound(`The book has runs 1 to ${last}, and no run ${parts[1] ?? text}`, 'Look at its contents.');
}

function runSubject(book: Book, asked: string): Subject | null {
  if (!/^run\s*(\d+|last(-\d+)?)$/i.test(asked)) return null;
  const { run, number } = findRunNamed(book, asked);
  return { asked, type: 'run', run, entry: number, entries: [number] };
}

function entrySubject(book: Book, asked: string): Subject | null {
  if (!/^\d+$/.test(asked)) return null;
  const number = Number(asked);
  const count = book.count();
  if (number >= 1 && number <= count) return { asked, type: 'entry', entry: number, entries: [number] };
  if (asked.length >= PREFIX_LEAST) return null;
  const has =
    count === 0 ? 'The book has no entry yet' : `The book has entries 1 to ${count}, and no entry ${asked}`;
  throw notFound(has, 'Look at its contents.');
}

// Published numbers

function numberInRun(book: Book, asked: string): Subject | null {
  const parts = /^(\S+) in (run\s*\S+)$/i.exec(asked);
  if (parts === null) return null;
  const run = findRunNamed(book, parts[2] ?? '');
  return publishedIn(run, parts[1] ?? '', asked) ?? noSuchNumber(run, parts[1] ?? '');
}

function numberInLastRun(book: Book, asked: string): Subject | null {
  const run = book.lastRun();
  return run === undefined ? null : publishedIn(run, asked, asked);
}

function publishedIn({ run, numbers }: RunEntry, name: string, asked: string): Subject | null {
  const number = numbers.find((published) => published.name === name);
  return number === undefined ? null : { asked, type: 'number', run, number, entries: [number.entry] };
}

function noSuchNumber({ run, numbers }: RunEntry, name: string): never {
  const names = numbers.map((number) => number.name);
  const has = names.length === 0 ? 'it published none' : `it published ${names.join(', ')}`;
  throw notFound(`Run ${run} has no published number ${name}`, `${has[0]?.toUpperCase()}${has.slice(1)}.`);
}

// Plates

function plateSubject(book: Book, asked: string): Subject | null {
  const plate = parsePlateNumber(asked);
  if (plate === null) return null;
  const found = plateInBook(book, plate, asked);
  if (found !== null) return found;
  throw notFound(`The book has no plate ${formatPlateNumber(plate)}`, whyNoPlate(book, plate));
}

function plateInBook(book: Book, plate: PlateNumber, asked: string): Subject | null {
  const text = formatPlateNumber(plate);
  const row = book.ask((index) =>
    index.get<PlateRow>('SELECT * FROM plates WHERE plate = ? ORDER BY entry DESC', text),
  );
  if (row !== undefined) {
    const { entry, drawn, output } = row;
    return { asked, type: 'plate', plate: text, drawn, output, entries: [entry] };
  }
  const [output] = figuresOf(book, plate.entry).find(([, number]) => number === text) ?? [];
  if (output === undefined) return null;
  return { asked, type: 'plate', plate: text, drawn: plate.entry, output, entries: [plate.entry] };
}

/** The figures of an entry and the plate numbers that they have, published or not. */
function figuresOf(book: Book, number: number): [output: string, plate: string][] {
  if (number > book.count()) return [];
  const entry = book.entry(number);
  return entry.type === 'stage' ? [...plateNumbersOf(number, book.digestOf(number), entry.outputs)] : [];
}

function whyNoPlate(book: Book, { entry }: PlateNumber): string {
  if (entry > book.count()) return `Its entries end at ${book.count()}: it may be a plate of another book.`;
  const plates = figuresOf(book, entry).map(([, plate]) => plate);
  if (plates.length > 0) return `Entry ${entry} drew ${plates.sort().join(', ')}.`;
  return `Entry ${entry} drew no figure; its six symbols would be ${checkSymbols(book.digestOf(entry))}.`;
}

// Digests

function digestSubject(book: Book, digest: string, asked: string): Subject {
  const found = withDigest(book, digest, asked);
  if (found !== null) return found;
  throw notFound(`Nothing in the book has the digest ${digest}`, 'It may be of another book.');
}

function prefixSubject(book: Book, asked: string): Subject | null {
  const prefix = asked.toLowerCase();
  if (!(prefix.length >= PREFIX_LEAST && /^[0-9a-f]{1,64}$/.test(prefix))) return null;
  const digests = digestsFrom(book, prefix);
  if (digests.length > 1)
    throw ambiguous(
      `The beginning ${asked}`,
      digests.map((digest) => digest.slice(0, 16)),
    );
  return digests[0] === undefined ? null : withDigest(book, digests[0], asked);
}

/** Some digests, of entries and of files, that begin with some digits, sorted. */
function digestsFrom(book: Book, digits: string): string[] {
  const { sql, values } = beginsWith(digits);
  // "g" follows every hexadecimal digit.
  const entries = book.ask((index) =>
    index.all<{ digest: string }>(
      'SELECT digest FROM entries WHERE substr(digest, 1, 16) >= ? AND substr(digest, 1, 16) < ? LIMIT ?',
      digits.slice(0, 16),
      `${digits.slice(0, 16)}g`,
      MOST_NAMED,
    ),
  );
  const files = book.ask((index) =>
    index.all<FileRow>(
      `SELECT role, name, max(entry) AS entry FROM files WHERE ${sql} GROUP BY mark, rest LIMIT ?`,
      ...values,
      MOST_NAMED,
    ),
  );
  const named = files.flatMap(({ entry }) => referencesOf(book.entry(entry)).files);
  const found = [...entries, ...named]
    .map(({ digest }) => digest)
    .filter((digest) => digest.startsWith(digits));
  return [...new Set(found)].sort().slice(0, MOST_NAMED);
}

/** The subject of a whole digest: an entry's, or a file's. */
function withDigest(book: Book, digest: string, asked: string): Subject | null {
  const entry = book.ask((index) =>
    index.get<{ number: number }>(
      'SELECT number FROM entries WHERE substr(digest, 1, 16) = substr(?1, 1, 16) AND digest = ?1',
      digest,
    ),
  );
  if (entry !== undefined) return { asked, type: 'entry', entry: entry.number, entries: [entry.number] };
  const rows = book.ask((index) =>
    index.all<FileRow>(
      'SELECT role, name, entry FROM files WHERE mark = ? AND rest = ? ORDER BY entry DESC',
      markOf(digest),
      restOf(digest),
    ),
  );
  const [first] = rows;
  const file =
    first === undefined
      ? undefined
      : referencesOf(book.entry(first.entry)).files.find((named) => named.digest === digest);
  if (file === undefined) return null;
  const makers = rows.filter(({ role }) => role !== 'input');
  // An output that is also an input of later stages comes from the stage that made it.
  const roles = [...makers, ...rows.filter(({ role }) => role === 'input')].map(({ entry, role, name }) => ({
    entry,
    role,
    name,
  }));
  const entries = makers[0] === undefined ? [] : [makers[0].entry];
  return { asked, type: 'file', digest, bytes: file.bytes, roles, entries };
}

// Files

function fileSubject(book: Book, asked: string, cwd: string): Subject | null {
  const path = resolve(cwd, asked);
  if (statSync(path, { throwIfNoEntry: false })?.isFile() !== true) return null;
  const { digest, bytes } = book.digestOfFile(path, { strict: true });
  const known = withDigest(book, digest, asked);
  if (known !== null) return known;
  const strangers: string[] = [];
  for (const plate of bytes > LARGEST_SEARCHED ? [] : platesIn(path)) {
    const found = plateInBook(book, plate, asked);
    if (found !== null) return found;
    strangers.push(formatPlateNumber(plate));
  }
  const carries =
    strangers.length === 0
      ? 'no plate number stands in it'
      : `the book has no plate ${strangers.slice(0, 3).join(', ')}, which stands in it`;
  throw notFound(
    `${asked}: nothing in the book has its digest ${digest}, and ${carries}`,
    'If a plate number can be read off the figure, give that.',
  );
}

function* platesIn(path: string): Generator<PlateNumber> {
  for (const text of embeddedTexts(readFileSync(path))) yield* findPlateNumbers(text);
}

function unknown(book: Book, asked: string, cwd: string): never {
  const names = book.lastRun()?.numbers.map(({ name }) => name) ?? [];
  const near = nearMisses(asked, [...names, ...filesNear(asked, cwd)]);
  const none = 'entry, plate number, run, published number or digest';
  const what = /[./\\]/.test(asked)
    ? `There is no file ${asked}, and it is no ${none} either`
    : `${asked} is no ${none}, and there is no such file`;
  if (near.length > 0) throw notFound(what, `Did you mean ${near.join(' or ')}?`);
  const has =
    names.length > 0 ? `The last run published ${names.join(', ')}.` : 'Look at the contents of the book.';
  throw notFound(what, has);
}

/** Files in the directory that a path names, spelled as the path is. */
function filesNear(asked: string, cwd: string): string[] {
  const directory = /^.*[/\\]/.exec(asked)?.[0] ?? '';
  try {
    return readdirSync(dirname(resolve(cwd, `${asked}`))).map((name) => directory + name);
  } catch {
    return [];
  }
}
