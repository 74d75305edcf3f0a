/** The book's table of contents: entries, filtered, the latest page. */

import type { Book } from './book.ts';
import type { Index } from './index.ts';
import { beginsWith, LONGEST_VALUE, type Value, valuesOf } from './index-rows.ts';
import { namedByRuns } from './link-bundles.ts';
import { badCall } from './problem.ts';
import { timeBound } from './time.ts';
import type { TracedEntry } from './trace.ts';
import { withdrawalsOf, withdrawalsUpstream } from './withdrawal.ts';

/** Entries on a page. */
export const PAGE = 20;
/** Matching entries are counted up to so many: counting all would take longer than finding the page. */
export const MOST_COUNTED = 10_000;
/** Answers that are fetched at first. */
const FIRST_PIECE = 2_000;

export interface ContentsFilter {
  /** Runs of a recipe, and the entries that these runs name. */
  readonly recipe?: string;
  /** A stage's name. */
  readonly stage?: string;
  /** A stage's kind. */
  readonly kind?: string;
  readonly type?: string;
  /** An RFC 3339 time or a date, inclusive; of a date the whole day. UTC. */
  readonly since?: string;
  readonly until?: string;
  /** A digest, or its first six or more digits: entries that name the file, or have the digest. */
  readonly digest?: string;
  /** `components=30`, `fit.components=30`, `taper=15 uas`: the value of a parameter, by dotted path. */
  readonly parameter?: string;
  /** How many of the latest; default 20. */
  readonly last?: number;
}

export interface ContentsDocument {
  readonly entries: readonly TracedEntry[];
  /** Entries of the page that are withdrawn or depend on something withdrawn, with the numbers of the withdrawals;
   *  `itself` when one of these names the entry. */
  readonly withdrawn: readonly {
    readonly entry: number;
    readonly by: readonly number[];
    readonly itself: boolean;
  }[];
}

/** The latest entries that pass a filter, oldest first, and how many pass in all; of more than MOST_COUNTED it is only
 *  known that they are more. @throws LedgerProblem 'bad-call'. */
export function contents(
  book: Book,
  filter: ContentsFilter = {},
): { document: ContentsDocument; matching: number } {
  const last = filter.last ?? PAGE;
  if (!(Number.isSafeInteger(last) && last >= 1))
    throw badCall(`--last: expected a whole number from 1, got ${last}.`);
  const conditions = conditionsOf(filter);
  const wanted = parameterOf(filter);
  const page: TracedEntry[] = [];
  const { numbers, matching } = book.ask((index) =>
    find(index, filter.recipe, conditions, Math.max(last, PAGE)),
  );
  for (const number of numbers) {
    if (page.length === last) break;
    const entry = book.entry(number);
    // Two sets of parameters may have one number in the index.
    if (wanted === null || hasValue(entry, wanted)) page.push({ ...entry, digest: book.digestOf(number) });
  }
  const withdrawn = page
    .map(({ number }) => ({
      entry: number,
      by: withdrawalsUpstream(book, number),
      itself: withdrawalsOf(book, number).length > 0,
    }))
    .filter(({ by }) => by.length > 0);
  return { document: { entries: page.reverse(), withdrawn: withdrawn.reverse() }, matching };
}

interface Condition {
  readonly sql: string;
  readonly values: readonly Value[];
}

/** The latest numbers that pass, newest first, and how many there are. */
function find(
  index: Index,
  recipe: string | undefined,
  conditions: readonly Condition[],
  last: number,
): { numbers: number[]; matching: number } {
  const { where, values } = joined(conditions);
  const order = /(?<!\+)\btime\b/.test(where) ? 'time DESC, number DESC' : 'number DESC';
  const sorted = `SELECT number FROM entries ${where} ORDER BY ${order}`;
  if (recipe !== undefined)
    return ofRecipe(index, recipe, conditions.length === 0 ? null : { sorted, values }, last);
  const rows = index.all<{ number: number }>(`${sorted} LIMIT ?`, ...values, last);
  const matching =
    conditions.length === 0
      ? index.extent().entries
      : index.get<{ count: number }>(
          `SELECT count(*) AS count FROM (SELECT 1 FROM entries ${where} LIMIT ?)`,
          ...values,
          MOST_COUNTED + 1,
        )?.count;
  return { numbers: rows.map(({ number }) => number).sort((a, b) => b - a), matching: matching ?? 0 };
}

/** The runs of a recipe and what they name: those that pass a question, or all. */
function ofRecipe(
  index: Index,
  recipe: string,
  question: { readonly sorted: string; readonly values: readonly Value[] } | null,
  last: number,
): { numbers: number[]; matching: number } {
  const runs = index.all<{ number: number }>(
    'SELECT number FROM entries WHERE run IS NOT NULL AND name = ?',
    recipe,
  );
  if (runs.length === 0) return { numbers: [], matching: 0 };
  const isOfRecipe = namedByRuns(
    index,
    runs.map(({ number }) => number),
  );
  const numbers: number[] = [];
  let matching = 0;
  for (const number of question === null ? downFrom(index.extent().entries) : answers(index, question)) {
    if (!isOfRecipe(number)) continue;
    matching += 1;
    if (numbers.length < last) numbers.push(number);
    if (matching > MOST_COUNTED) break;
  }
  return { numbers: numbers.sort((a, b) => b - a), matching };
}

function* downFrom(number: number): Generator<number> {
  for (let n = number; n >= 1; n -= 1) yield n;
}

/** The numbers that a question finds, in pieces that grow: most readers stop early. */
function* answers(
  index: Index,
  { sorted, values }: { readonly sorted: string; readonly values: readonly Value[] },
): Generator<number> {
  for (let from = 0, piece = FIRST_PIECE; ; from += piece, piece *= 10) {
    const rows = index.all<{ number: number }>(`${sorted} LIMIT ? OFFSET ?`, ...values, piece, from);
    for (const { number } of rows) yield number;
    if (rows.length < piece) return;
  }
}

function joined(conditions: readonly Condition[]): { where: string; values: Value[] } {
  const where = conditions.length === 0 ? '' : `WHERE ${conditions.map(({ sql }) => sql).join(' AND ')}`;
  return { where, values: conditions.flatMap((condition) => condition.values) };
}

function conditionsOf(filter: ContentsFilter): Condition[] {
  const { stage, kind, type, since, until, digest } = filter;
  const conditions: Condition[] = [];
  const add = (sql: string, ...values: Value[]) => conditions.push({ sql, values });
  const wanted = parameterOf(filter);
  // A file or a value names the fewest entries: a plus keeps SQLite from starting with anything else.
  const plus = digest !== undefined || wanted !== null ? '+' : '';
  if (type !== undefined) add(`${plus}type = ?`, type);
  if (kind !== undefined) add(`${plus}kind = ?`, kind);
  if (stage !== undefined) add(`kind IS NOT NULL AND ${plus}name = ?`, stage);
  if (since !== undefined) add(`${plus}time >= ?`, timeBound(since));
  // Whatever continues the bound counts: a day has all its hours.
  if (until !== undefined) add(`${plus}time < ?`, `${timeBound(until)}\u007f`);
  if (digest !== undefined) {
    const digits = digest.toLowerCase();
    if (!/^[0-9a-f]{6,64}$/.test(digits))
      throw badCall(`--digest: expected 6 to 64 hexadecimal digits, got ${digest}.`);
    const named = beginsWith(digits);
    add(
      `number IN (SELECT entry FROM files WHERE ${named.sql}
         UNION SELECT number FROM entries WHERE substr(digest, 1, 16) BETWEEN ? AND ?)`,
      ...named.values,
      digits.slice(0, 16),
      digits.slice(0, 16).padEnd(16, 'f'),
    );
  }
  if (wanted !== null) {
    const { path, value, stage: of, rest } = wanted;
    const sets = 'SELECT settings FROM settings WHERE name = ? AND value = ?';
    const shown = value.slice(0, LONGEST_VALUE);
    // The first looks them up, the second keeps the stage's own among those of its short name.
    add(
      `${digest === undefined ? '' : '+'}settings IN (${sets} UNION ${sets}) AND (settings IN (${sets}) OR +name = ?)`,
      ...[path, shown, rest, shown],
      ...[path, shown, of],
    );
  }
  return conditions;
}

interface WantedValue {
  readonly path: string;
  readonly value: string;
  /** The same path with its first name taken for a stage's. */
  readonly stage: string;
  readonly rest: string;
}

function parameterOf({ parameter }: ContentsFilter): WantedValue | null {
  if (parameter === undefined) return null;
  const [, path = '', value = ''] = /^([^=]+)=(.*)$/s.exec(parameter.trim()) ?? [];
  if (path === '')
    throw badCall(
      `--parameter: expected a parameter and its value, such as components=30, got ${parameter}.`,
    );
  const dot = path.indexOf('.');
  const [stage, rest] = dot < 0 ? ['', ''] : [path.slice(0, dot), path.slice(dot + 1)];
  return { path: path.trim(), value: value.trim(), stage, rest: rest.trim() };
}

function hasValue(entry: TracedEntry | Parameters<typeof valuesOf>[0], wanted: WantedValue): boolean {
  return valuesOf(entry).some(
    ([name, value]) =>
      value === wanted.value &&
      (name === wanted.path || ('name' in entry && entry.name === wanted.stage && name === wanted.rest)),
  );
}
