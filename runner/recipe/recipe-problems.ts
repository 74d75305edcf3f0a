/** Everything that is wrong with a recipe, found at once and reported together:
 *
 *      file:line:column code path: expected X, got Y (type). Fix.
 *          the source line
 *          ^                                                                                                     */

import { advice, type RunnerCode, RunnerProblem } from '../problem.ts';
import type { Spot } from './source-text.ts';
import { placeOf } from './source-text.ts';

export interface RecipeProblem {
  /** The recipe's path as given, or the whole `--let`. */
  readonly file: string;
  /** From 1; null for a `--let`, and where there is no text. */
  readonly line: number | null;
  readonly column: number | null;
  readonly code: RunnerCode;
  /** Where in the recipe, such as `stages.fit.parameters.components`; '' for the whole. */
  readonly path: string;
  readonly expected: string;
  readonly found: string;
  readonly advice: string;
  readonly sourceLine: string | null;
}

/** Formatted problems in one message; longer lists are cut there, never in `problems`. */
const MOST_SHOWN = 100;
const LONGEST_LINE = 100;

export class RecipeProblems extends RunnerProblem {
  override readonly name = 'RecipeProblems';
  readonly problems: readonly RecipeProblem[];

  /** @param problems at least one, in the order in which they are reported */
  constructor(problems: readonly RecipeProblem[]) {
    const { code, file, line, column } = problems[0];
    super(code, formatProblems(problems), { file, line: line ?? undefined, column: column ?? undefined }, 2);
    this.problems = problems;
  }
}

export interface FoundProblem {
  readonly spot: Spot;
  readonly code: RunnerCode;
  readonly path: string;
  readonly expected: string;
  readonly found: string;
  /** The code's row of advice where absent. */
  readonly advice?: string;
}

/** Collects problems while a recipe is read. */
export interface ProblemList {
  add(problem: FoundProblem): void;
  readonly count: number;
  /** Problems by place: the recipe's from top to bottom, then those of each `--let`. */
  sorted(): readonly RecipeProblem[];
}

export function problemList(): ProblemList {
  const found: FoundProblem[] = [];
  return {
    add: (problem) => void found.push(problem),
    get count() {
      return found.length;
    },
    sorted() {
      return found
        .toSorted((a, b) => a.spot.source.order - b.spot.source.order || a.spot.offset - b.spot.offset)
        .map(({ spot, ...problem }) => ({
          file: spot.source.file,
          ...(placeOf(spot) ?? { line: null, column: null, sourceLine: null }),
          ...problem,
          advice: problem.advice ?? advice[problem.code],
        }));
    },
  };
}

/** All problems as text, a blank line between them. */
export function formatProblems(problems: readonly RecipeProblem[]): string {
  const shown = problems.slice(0, MOST_SHOWN).map(formatProblem);
  if (problems.length > MOST_SHOWN) shown.push(`… and ${problems.length - MOST_SHOWN} more.`);
  return shown.join('\n\n');
}

function formatProblem(problem: RecipeProblem): string {
  const { file, line, column, code, path, expected, found, sourceLine } = problem;
  const place = line === null ? file : `${file}:${line}:${column}`;
  const subject = path === '' ? code : `${code} ${path}`;
  const separator = line === null ? ': ' : ' ';
  const text = `${place}${separator}${subject}: expected ${expected}, got ${found}. ${problem.advice}`;
  return sourceLine === null || column === null ? text : `${text}\n${formatSourceLine(sourceLine, column)}`;
}

/** The line with a caret below; of a long line the part around the column. */
function formatSourceLine(sourceLine: string, column: number): string {
  const from = column > LONGEST_LINE ? column - LONGEST_LINE / 2 : 0;
  const shown = sourceLine.slice(from, from + LONGEST_LINE);
  const before = sourceLine.slice(from, column - 1).replace(/[^\t]/g, ' ');
  return `    ${printable(shown)}\n    ${before}^`;
}

/** Text that moves no cursor and changes no direction of writing: such characters become U+FFFD, one for one. */
export function printable(text: string): string {
  return text.replace(/(?!\t)[\p{Cc}\p{Cf}\u2028\u2029]/gu, (character) => '\ufffd'.repeat(character.length));
}
