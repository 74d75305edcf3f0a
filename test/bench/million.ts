/** How the book fares with a million entries: node test/bench/million.ts [--entries N] [--at DIR] [--keep]
 *
 *  Builds books of 1,000, of 100,000 and of N entries (many-runs.ts; a million take some 11 GB on the disk), asks each
 *  question as a person would, as a whole process, and prints a table in Markdown. Times are medians, beside a bare
 *  `node -e 0` measured in turn with them. With --at, books that lie there are used again, and stay with --keep. */

import {
  closeSync,
  existsSync,
  fsyncSync,
  mkdirSync,
  mkdtempSync,
  openSync,
  readFileSync,
  rmSync,
  writeSync,
} from 'node:fs';
import { cpus, loadavg, tmpdir, totalmem } from 'node:os';
import { join, resolve } from 'node:path';
import { fileURLToPath } from 'node:url';
import { parseArgs } from 'node:util';
import { openBook } from '../../ledger/book.ts';
import { canonicalJson } from '../../ledger/canonical.ts';
import type { Draft, Json } from '../../ledger/entry.ts';
import { stageDraft } from '../ledger/make-book.ts';
import { type Landmarks, writeLandmarks, writeManyRuns } from './many-runs.ts';
import { compareToBareStart, memoryOf, type Times, timeProcess, timesOf } from './measure.ts';

const QUESTION_SECONDS = 0.3;
const QUESTION_BYTES = 300e6;
const REBUILD_SECONDS = 60;
const AUDIT_SECONDS = 60;
/** An append to the largest book may take so much more than to the smallest. */
const GROWTH = 1.25;
const REPETITIONS = 9;
const APPENDS = 101;

const program = fileURLToPath(new URL('../../bin/platebook.js', import.meta.url));
const { values } = parseArgs({
  options: {
    entries: { type: 'string', default: '1000000' },
    at: { type: 'string' },
    keep: { type: 'boolean' },
  },
});
const entries = Number(values.entries);
const directory =
  values.at === undefined ? mkdtempSync(join(tmpdir(), 'platebook-million-')) : resolve(values.at);
mkdirSync(directory, { recursive: true });
const key = join(directory, 'key.pem');

interface Line {
  readonly what: string;
  readonly times: Times;
  /** Against what, and how many times that. */
  readonly ratio: string;
  readonly bytes: number | null;
  readonly target: string;
  readonly isMet: boolean;
}
const lines: Line[] = [];

/** A book of so many entries, made unless it is there. */
function bookOf(size: number): { at: string; landmarks: Landmarks } {
  const at = join(directory, `book-${size}`);
  if (existsSync(`${at}.json`)) return { at, landmarks: JSON.parse(readFileSync(`${at}.json`, 'utf8')) };
  const landmarks = writeManyRuns(at, size, key);
  writeLandmarks(`${at}.json`, landmarks);
  return { at, landmarks };
}

const command = (at: string, ...words: readonly string[]) => [program, ...words, '--book', at];

function ask(what: string, words: readonly string[]): void {
  const { own, bare } = compareToBareStart(words, REPETITIONS);
  const bytes = memoryOf(words);
  const isMet = own.median <= QUESTION_SECONDS && bytes <= QUESTION_BYTES;
  take({
    what,
    times: own,
    ratio: `${(own.median / bare.median).toFixed(1)} × bare start`,
    bytes,
    target: '0.3 s, 300 MB',
    isMet,
  });
}

function take(line: Line): void {
  lines.push(line);
  console.error(
    `${line.what}: ${line.times.median.toFixed(3)} s (least ${line.times.least.toFixed(3)}), ${line.ratio}`,
  );
}

function askQuestions({ at, landmarks }: ReturnType<typeof bookOf>): void {
  const { oldestPlate, newestPlate, libraryFile, release, recipe, components, day, runs } = landmarks;
  const contents = (...words: readonly string[]) => command(at, 'contents', ...words);
  ask('open: `contents --last 1`', contents('--last', '1'));
  ask('`contents`, the latest page', contents());
  ask('`contents --recipe`', contents('--recipe', recipe));
  ask('`contents --stage`', contents('--stage', 'fit'));
  ask('`contents --since --until`, a day', contents('--since', day, '--until', day));
  ask('`contents --parameter`', contents('--parameter', `fit.components=${components}`));
  ask('`contents --digest`, of a file', contents('--digest', release));
  ask(
    '`contents` with recipe, stage, date and parameter',
    contents(
      '--recipe',
      recipe,
      '--stage',
      'fit',
      '--until',
      day,
      '--parameter',
      `fit.components=${components}`,
    ),
  );
  ask('`trace`, plate of the oldest run', command(at, 'trace', oldestPlate));
  ask('`trace`, plate of the newest run', command(at, 'trace', newestPlate));
  ask(`\`reach\`, an input of ${thousands(libraryFile.runs)} runs`, command(at, 'reach', libraryFile.digest));
  ask('`reach`, the same, all of it as JSON', command(at, 'reach', libraryFile.digest, '--json'));
  ask('`reach`, an input of few runs', command(at, 'reach', release));
  ask('`diff`, the oldest and the newest run', command(at, 'diff', '1', String(runs)));
}

function rebuild(at: string): void {
  const remove = () => {
    for (const suffix of ['', '-wal', '-shm']) rmSync(join(at, `index.sqlite${suffix}`), { force: true });
  };
  const words = command(at, 'contents', '--last', '1');
  remove();
  const bytes = memoryOf(words);
  remove();
  const { seconds } = timeProcess(words);
  long('making the index anew', seconds, bytes, REBUILD_SECONDS);
}

function auditQuickly(at: string): void {
  const words = command(at, 'audit', '--quick');
  const { seconds, printed } = timeProcess(words);
  if (!/: sound$/m.test(printed)) throw new Error(`the book is not sound: ${printed}`);
  long('`audit --quick`', seconds, memoryOf(words), AUDIT_SECONDS);
}

function long(what: string, seconds: number, bytes: number, target: number): void {
  const ratio = `${Math.round((seconds / entries) * 1e6)} µs an entry`;
  take({ what, times: timesOf([seconds]), ratio, bytes, target: `${target} s`, isMet: seconds <= target });
}

/** Appends to all books and to a bare file in turn, so that all meet the same load. */
function append(sizes: readonly number[]): void {
  const books = sizes.map((size) => openBook(bookOf(size).at, { by: { name: 'A. Keeper' }, key }));
  const drafts = books.map((book) => stageDraft(book) as Draft);
  const bare = openSync(join(directory, 'bare'), 'a');
  const line = Buffer.from(`${canonicalJson(drafts[0] as unknown as Json)}\n`);
  const work = [
    () => {
      writeSync(bare, line);
      fsyncSync(bare);
    },
    ...books.map((book, i) => () => void book.append(drafts[i] as Draft)),
  ];
  const seconds: number[][] = work.map(() => []);
  for (let i = 0; i <= APPENDS; i += 1) {
    for (const [j, once] of work.entries()) {
      const start = performance.now();
      once();
      if (i > 0) seconds[j]?.push((performance.now() - start) / 1000);
    }
  }
  closeSync(bare);
  for (const book of books) book.close();
  const [bareTimes, ...times] = seconds.map(timesOf) as [Times, ...Times[]];
  for (const [i, size] of sizes.entries()) {
    const own = times[i] as Times;
    const isMet = own.median <= GROWTH * (times[0] as Times).median;
    const ratio = `${(own.median / bareTimes.median).toFixed(1)} × bare append and sync`;
    take({
      what: `append to ${thousands(size)} entries`,
      times: own,
      ratio,
      bytes: null,
      target: 'as to 1,000',
      isMet,
    });
  }
}

function thousands(n: number): string {
  return String(n).replace(/\B(?=(\d{3})+$)/g, ',');
}

function inSeconds(seconds: number): string {
  return seconds < 0.1 ? `${(seconds * 1000).toFixed(1)} ms` : `${seconds.toFixed(seconds < 10 ? 2 : 0)} s`;
}

function table(): string {
  const rows = lines.map(({ what, times, ratio, bytes, target, isMet }) =>
    [
      what,
      inSeconds(times.median),
      inSeconds(times.least),
      ratio,
      bytes === null ? '' : `${Math.round(bytes / 1e6)} MB`,
      target,
      isMet ? 'met' : '**missed**',
    ].join(' | '),
  );
  const head = ['what', 'median', 'least', 'ratio', 'memory', 'target', ''];
  return [head.join(' | '), head.map(() => '---').join(' | '), ...rows].map((row) => `| ${row} |`).join('\n');
}

function load(): string {
  return loadavg()
    .map((each) => each.toFixed(1))
    .join(', ');
}

const before = load();
const million = bookOf(entries);
rebuild(million.at);
askQuestions(million);
auditQuickly(million.at);
append([1000, 100_000, entries]);
const { runs, bytes } = million.landmarks;
console.log(table());
console.log(
  `\n${thousands(entries)} entries, ${thousands(runs)} runs of ten stages, ${(bytes / 1e9).toFixed(1)} GB; ` +
    `${cpus()[0]?.model.trim()}, ${cpus().length} cores, ${Math.round(totalmem() / 1e9)} GB; Node ${process.version}; ` +
    `${new Date().toISOString().slice(0, 10)}; load ${before} before, ${load()} after.`,
);
if (values.keep !== true) rmSync(directory, { recursive: true, force: true });
