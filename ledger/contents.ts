/** The book's table of contents: entries, filtered, the latest page. */

import type { Book } from './book.ts';
import type { Value } from './index.ts';
import { badCall } from './problem.ts';
import { timeBound } from './time.ts';
import type { TracedEntry } from './trace.ts';

/** Entries on a page. */
export const PAGE = 20;

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
  /** How many of the latest; default 20. */
  readonly last?: number;
}

export interface ContentsDocument {
  readonly entries: readonly TracedEntry[];
}

/** The latest entries that pass a filter, oldest first, and how many pass in all.
 *  @throws LedgerProblem 'bad-call'. */
export function contents(
  book: Book,
  filter: ContentsFilter = {},
): { document: ContentsDocument; matching: number } {
  const last = filter.last ?? PAGE;
  if (!(Number.isSafeInteger(last) && last >= 1))
    throw badCall(`--last: expected a whole number from 1, got ${last}.`);
  const conditions = conditionsOf(filter);
  const where = conditions.length === 0 ? '' : `WHERE ${conditions.map(({ sql }) => sql).join(' AND ')}`;
  const values = conditions.flatMap((condition) => condition.values);
  const numbers = book.ask((index) =>
    index.all<{ number: number; digest: string }>(
      `SELECT number, digest FROM entries ${where} ORDER BY number DESC LIMIT ?`,
      ...values,
      last,
    ),
  );
  const matching = book.ask((index) =>
    index.get<{ count: number }>(`SELECT count(*) AS count FROM entries ${where}`, ...values),
  );
  const entries = numbers.reverse().map(({ number, digest }) => ({ ...book.entry(number), digest }));
  return { document: { entries }, matching: matching?.count ?? 0 };
}

interface Condition {
  readonly sql: string;
  readonly values: readonly Value[];
}

function conditionsOf(filter: ContentsFilter): Condition[] {
  const { recipe, stage, kind, type, since, until, digest } = filter;
  const conditions: Condition[] = [];
  const add = (sql: string, ...values: Value[]) => conditions.push({ sql, values });
  if (type !== undefined) add('type = ?', type);
  if (kind !== undefined) add('kind = ?', kind);
  if (stage !== undefined) add("type IN ('stage', 'failure') AND name = ?", stage);
  if (since !== undefined) add('time >= ?', timeBound(since));
  if (until !== undefined) {
    const bound = timeBound(until);
    add('substr(time, 1, ?) <= ?', bound.length, bound);
  }
  if (recipe !== undefined) {
    const runs = "SELECT number FROM entries WHERE type = 'run' AND name = ?";
    add(
      `(number IN (${runs}) OR number IN (SELECT target FROM links WHERE source IN (${runs})))`,
      recipe,
      recipe,
    );
  }
  if (digest !== undefined) {
    const [from, to] = [digest.toLowerCase(), `${digest.toLowerCase()}g`];
    if (!/^[0-9a-f]{6,64}$/.test(from))
      throw badCall(`--digest: expected 6 to 64 hexadecimal digits, got ${digest}.`);
    add(
      '(number IN (SELECT entry FROM files WHERE digest >= ? AND digest < ?) OR (digest >= ? AND digest < ?))',
      from,
      to,
      from,
      to,
    );
  }
  return conditions;
}
