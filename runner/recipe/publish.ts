/** What a recipe publishes: figures, and numbers with their tolerance and truth. */

import { didYouMean } from '../../stages/near-miss.ts';
import { InputProblem } from '../../stages/problem.ts';
import { parseQuantity } from '../../stages/units.ts';
import { type Cell, describeCell, quoted } from './cells.ts';
import { enumerate } from './describe.ts';
import { checkName, readKeys, readMap, readText, type Subject } from './keys.ts';
import type { ProblemList } from './recipe-problems.ts';
import {
  checkReference,
  type PlacedReference,
  type ReferredStage,
  readStageReference,
} from './references.ts';

export interface PublishedFigure {
  readonly name: string;
  readonly stage: string;
  readonly output: string;
}

export interface Tolerance {
  readonly value: number;
  readonly unit: string;
}

export interface PublishedNumberRequest {
  readonly name: string;
  readonly stage: string;
  readonly output: string;
  /** The number's name in that output. */
  readonly value: string;
  readonly tolerance: Tolerance | null;
  /** The truth of synthetic data. */
  readonly against: { readonly stage: string; readonly output: string; readonly value: string } | null;
}

export interface Publish {
  readonly figures: readonly PublishedFigure[];
  readonly numbers: readonly PublishedNumberRequest[];
}

type Stages = ReadonlyMap<string, ReferredStage>;

/** @param subject undefined when the recipe publishes nothing */
export function readPublish(subject: Subject | undefined, stages: Stages, problems: ProblemList): Publish {
  const keys = subject && readKeys(subject, [], ['figures', 'numbers'], problems);
  return {
    figures: readNamed(keys?.get('figures'), 'figures', readFigure, stages, problems),
    numbers: readNamed(keys?.get('numbers'), 'numbers', readNumber, stages, problems),
  };
}

function readNamed<T>(
  subject: Subject | undefined,
  what: string,
  read: (name: string, subject: Subject, stages: Stages, problems: ProblemList) => T | undefined,
  stages: Stages,
  problems: ProblemList,
): T[] {
  const entries = subject === undefined ? [] : (readMap(subject, `a map of ${what}`, problems) ?? []);
  const items: T[] = [];
  for (const { key, ...entry } of entries) {
    checkName(key, entry.path, entry.spot, problems);
    const item = read(key, entry, stages, problems);
    if (item !== undefined) items.push(item);
  }
  return items;
}

function readFigure(name: string, subject: Subject, stages: Stages, problems: ProblemList) {
  const reference = readStageReference(subject, [], problems)?.reference;
  if (reference === undefined) return undefined;
  checkReference(reference, ['svg'], stages, problems);
  return { name, stage: reference.stage, output: reference.output };
}

function readNumber(
  name: string,
  subject: Subject,
  stages: Stages,
  problems: ProblemList,
): PublishedNumberRequest | undefined {
  const read = readStageReference(subject, ['value'], problems, ['tolerance', 'against']);
  const number = readPlacedNumber(read, stages, problems);
  const tolerance = readTolerance(read?.keys.get('tolerance'), problems);
  const against = read?.keys.get('against');
  const truth =
    against && readPlacedNumber(readStageReference(against, ['value'], problems), stages, problems);
  return number && { name, ...number, tolerance, against: truth ?? null };
}

/** Stage, output and the number's name in it. */
function readPlacedNumber(
  read: ReturnType<typeof readStageReference>,
  stages: Stages,
  problems: ProblemList,
) {
  const at = read?.keys.get('value');
  const value = at && readText(at, "the number's name in that output", problems);
  const reference: PlacedReference | undefined = read?.reference;
  if (reference === undefined) return undefined;
  checkReference(reference, ['numbers'], stages, problems);
  if (value !== undefined && at !== undefined) checkNumber(value, at, reference, stages, problems);
  return value === undefined ? undefined : { stage: reference.stage, output: reference.output, value };
}

/** The output can hold a number of that name, as far as its declaration says. */
function checkNumber(
  value: string,
  { cell, path }: Subject,
  { stage, output }: PlacedReference,
  stages: Stages,
  problems: ProblemList,
): void {
  const names = stages.get(stage)?.kind?.outputs[output]?.numbers;
  if (names === undefined || names.includes(value)) return;
  const advice = didYouMean(value, names).trim() || undefined;
  const expected = enumerate(names, 'or');
  problems.add({ spot: cell.spot, code: 'unknown-number', path, expected, found: quoted(value), advice });
}

function readTolerance(subject: Subject | undefined, problems: ProblemList): Tolerance | null {
  if (subject === undefined) return null;
  const { cell, path } = subject;
  const spot = cell.spot;
  const expected = 'a number and a unit, such as `0.01 uas`';
  try {
    const tolerance = toleranceOf(cell);
    if (tolerance === undefined) {
      problems.add({ spot, code: 'wrong-type', path, expected, found: describeCell(cell) });
      return null;
    }
    if (tolerance.value >= 0 && tolerance.value < Infinity) return tolerance;
    const found = describeCell(cell);
    problems.add({ spot, code: 'out-of-range', path, expected: 'a tolerance of at least 0', found });
  } catch (error) {
    if (!(error instanceof InputProblem)) throw error;
    const isUnit = error.code === 'bad-unit';
    const found = isUnit ? `${describeCell(cell)}: ${error.found}` : describeCell(cell);
    problems.add({
      spot,
      code: isUnit ? 'bad-unit' : 'bad-quantity',
      path,
      expected,
      found,
      advice: error.advice,
    });
  }
  return null;
}

/** A number alone is the tolerance of a number without unit. */
function toleranceOf(cell: Cell): Tolerance | undefined {
  if (cell.type !== 'scalar') return undefined;
  if (typeof cell.value === 'number') return { value: cell.value, unit: '' };
  return typeof cell.value === 'string' ? parseQuantity(cell.value) : undefined;
}
