/** The book's table of contents: entries, filtered, the latest page. */

import type { Book } from './book.ts';
import type { Index } from './index.ts';
import { beginsWith, LONGEST_VALUE, type Value, valuesOf } from './index-rows.ts';
import { targetsReader } from './link-bundles.ts';
import { badCall } from './problem.ts';
import { timeBound } from './time.ts';
import type { TracedEntry } from './trace.ts';
import { withdrawalsOf, withdrawalsUpstream } from './withdrawal.ts';

/** Entries on a page. */
export const PAGE = 20;
/** Matching entries are counted up to so many: counting all would take longer than finding the page. */
export const MOST_COUNTED = 10_000;

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
  if (recipe !== undefined) {
    const found = ofRecipe(index, recipe, conditions);
    return { numbers: found, matching: found.length };
  }
  const { where, values } = joined(conditions);
  const order = /\btime\b/.test(where) ? 'time DESC, number DESC' : 'number DESC';
  const rows = index.all<{ number: number }>(
    `SELECT number FROM entries ${where} ORDER BY ${order} LIMIT ?`,
    ...values,
    last,
  );
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

/** The runs of a recipe and what they name, newest first, as far as they are counted. What older runs name is older
 *  than the older run, so going back from the newest run finds the latest first. */
function ofRecipe(index: Index, recipe: string, conditions: readonly Condition[]): number[] {
  const found = new Set<number>();
  const { where, values } = joined([
    { sql: 'number IN (SELECT value FROM json_each(?))', values: [] },
    ...conditions,
  ]);
  const runs = index.all<{ number: number }>(
    'SELECT number FROM entries WHERE run IS NOT NULL AND name = ? ORDER BY number DESC LIMIT ?',
    recipe,
    MOST_COUNTED + 1,
  );
  const targets = targetsReader(index);
  for (const { number: run } of runs) {
    if (found.size > MOST_COUNTED) break;
    const named = JSON.stringify([run, ...targets(run)]);
    for (const { number } of index.all<{ number: number }>(
      `SELECT number FROM entries ${where}`,
      named,
      ...values,
    ))
      found.add(number);
  }
  return [...found].sort((a, b) => b - a);
}

function joined(conditions: readonly Condition[]): { where: string; values: Value[] } {
  const where = conditions.length === 0 ? '' : `WHERE ${conditions.map(({ sql }) => sql).join(' AND ')}`;
  return { where, values: conditions.flatMap((condition) => condition.values) };
}

function conditionsOf(filter: ContentsFilter): Condition[] {
  const { stage, kind, type, since, until, digest } = filter;
  const conditions: Condition[] = [];
  const add = (sql: string, ...values: Value[]) => conditions.push({ sql, values });
  if (type !== undefined) add('type = ?', type);
  if (kind !== undefined) add('kind = ?', kind);
  if (stage !== undefined) add('kind IS NOT NULL AND name = ?', stage);
  if (since !== undefined) add('time >= ?', timeBound(since));
  // Whatever continues the bound counts: a day has all its hours.
  if (until !== undefined) add('time < ?', `${timeBound(until)}\u007f`);
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
  const wanted = parameterOf(filter);
  if (wanted !== null) {
    const { path, value, stage: of, rest } = wanted;
    const sets = 'SELECT settings FROM settings WHERE name = ? AND value = ?';
    const shown = value.slice(0, LONGEST_VALUE);
    add(
      `settings IS NOT NULL AND (settings IN (${sets}) OR (name = ? AND settings IN (${sets})))`,
      path,
      shown,
      of,
      rest,
      shown,
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
