/** Maps with fixed keys, and the scalars in them, that the recipe's own grammar asks for. */

import { didYouMean } from '../../stages/near-miss.ts';
import { type Cell, type CellEntry, describeCell, quoted } from './cells.ts';
import { enumerate } from './describe.ts';
import type { ProblemList } from './recipe-problems.ts';
import type { Spot } from './source-text.ts';

/** A value and where it stands in the recipe. */
export interface Subject {
  readonly cell: Cell;
  readonly path: string;
  /** The key before the value: where what is missing in it is reported. */
  readonly spot: Spot;
}

/** Names of recipes, stages and what is published. */
export const NAME = /^[a-z][a-z0-9-]{0,39}$/;

/** What stands below each known key. Unknown and missing keys, and anything that is no map, are problems; undefined
 *  only for the last. */
export function readKeys(
  subject: Subject,
  required: readonly string[],
  optional: readonly string[],
  problems: ProblemList,
): ReadonlyMap<string, Subject> | undefined {
  const entries = readMap(subject, `a map with ${enumerate([...required, ...optional], 'and')}`, problems);
  if (entries === undefined) return undefined;
  const known = [...required, ...optional];
  const found = new Map<string, Subject>();
  for (const { key, cell, path, spot } of entries) {
    found.set(key, { cell, path, spot });
    if (known.includes(key)) continue;
    const advice = didYouMean(key, known).trim() || undefined;
    problems.add({
      spot,
      code: 'unknown-key',
      path,
      expected: enumerate(known, 'or'),
      found: quoted(key),
      advice,
    });
  }
  for (const key of required) {
    if (found.has(key)) continue;
    const { path, spot } = subject;
    const advice = `Add \`${key}\`.`;
    problems.add({
      spot,
      code: 'missing-key',
      path: below(path, key),
      expected: `\`${key}\``,
      found: 'nothing',
      advice,
    });
  }
  return found;
}

/** The entries of a map, with their paths. */
export function readMap(
  { cell, path }: Subject,
  expected: string,
  problems: ProblemList,
): readonly (Subject & { readonly key: string })[] | undefined {
  if (cell.type !== 'map') {
    problems.add({ spot: cell.spot, code: 'wrong-type', path, expected, found: describeCell(cell) });
    return undefined;
  }
  return cell.entries.map((entry: CellEntry) => ({
    key: entry.key,
    cell: entry.value,
    path: below(path, entry.key),
    spot: entry.spot,
  }));
}

/** Text on one line, or several where `lines` says so. */
export function readText({ cell, path }: Subject, expected: string, problems: ProblemList, lines?: 'lines') {
  const text = cell.type === 'scalar' && typeof cell.value === 'string' ? cell.value : undefined;
  if (text === undefined || text.trim() === '') {
    problems.add({ spot: cell.spot, code: 'wrong-type', path, expected, found: describeCell(cell) });
    return undefined;
  }
  if (/[\p{Cc}\p{Cf}]/u.test(lines === undefined ? text : text.replace(/[\n\t]/g, ''))) {
    const found = describeCell(cell);
    problems.add({ spot: cell.spot, code: 'control-character', path, expected: 'printable text', found });
    return undefined;
  }
  return text;
}

/** Whether a name keeps the rule for names; a problem otherwise. */
export function checkName(name: string, path: string, spot: Spot, problems: ProblemList): boolean {
  if (NAME.test(name)) return true;
  problems.add({
    spot,
    code: 'bad-name',
    path,
    expected: 'at most 40 lower-case letters, digits and dashes, a letter first',
    found: quoted(name),
    advice: suggestedName(name),
  });
  return false;
}

function suggestedName(name: string): string | undefined {
  const plain = name
    .toLowerCase()
    .replace(/[^a-z0-9]+/g, '-')
    .replace(/^[^a-z]+|-+$/g, '')
    .slice(0, 40);
  return plain === '' ? undefined : `Write \`${plain}\`.`;
}

export function below(path: string, key: string): string {
  const shown = /^[\p{L}\p{N}_.+-]{1,60}$/u.test(key) ? key : quoted(key);
  return path === '' ? shown : `${path}.${shown}`;
}
