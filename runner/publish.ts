/** Publishing: figures become plates, numbers are collected with their entries, and both are laid where the user finds
 *  them. Figures themselves stay as they are in the store. */

import { mkdirSync } from 'node:fs';
import { dirname, join } from 'node:path';
import type { Book } from '../ledger/book.ts';
import type { PlateDraft, PublishedNumber } from '../ledger/entry.ts';
import { findPlate } from '../ledger/find.ts';
import { plateNumbersOf } from '../ledger/plate-number.ts';
import { sourceOf } from '../stages/bytes.ts';
import type { NumberValue } from '../stages/data.ts';
import { readNumbers } from '../stages/formats/json.ts';
import { convert } from '../stages/units.ts';
import { type Job, type Outcome, upstreamOf } from './job.ts';
import { formatNumbersJson, formatNumbersTex } from './numbers-files.ts';
import type { Stamp } from './plates/stamp.ts';
import type { StampAhead, Stamped } from './plates/stamp-ahead.ts';
import { cannotWriteOutside } from './problem.ts';
import type { Recipe } from './recipe/recipe.ts';
import { writeWhole } from './write-whole.ts';

export interface Plate {
  readonly name: string;
  readonly plate: string;
  /** The plate's own entry. */
  readonly entry: number;
  readonly drawn: number;
  readonly digest: string;
  readonly path: string;
  readonly files: readonly {
    readonly format: 'svg' | 'png';
    readonly digest: string;
    readonly path: string;
  }[];
}

export interface PublishRequest {
  readonly recipe: Recipe;
  readonly jobs: readonly Job[];
  readonly outcomes: ReadonlyMap<string, Outcome>;
  readonly book: Book;
  /** The folder that receives the plates. */
  readonly folder: string;
  readonly ahead: StampAhead;
}

/** Makes a plate of every published figure whose stage ended well. A figure that already is a plate keeps it. */
export async function publishFigures(request: PublishRequest): Promise<Plate[]> {
  const plates: Plate[] = [];
  for (const figure of request.recipe.publish.figures) {
    const wanted = wantedPlate(request, figure);
    if (wanted !== null) plates.push(await makePlate(request, wanted));
  }
  return plates;
}

/** Starts on the plates of a stage that has ended, while others run. */
export function stampAheadOf(request: PublishRequest, stage: string): void {
  for (const figure of request.recipe.publish.figures) {
    const wanted = figure.stage === stage ? wantedPlate(request, figure) : null;
    if (wanted === null || findPlate(request.book, wanted) !== undefined) continue;
    request.ahead.begin(request.book.store.read(wanted.figure), stampOf(request, wanted));
  }
}

/** Null while its stage has not ended well. */
function wantedPlate(
  request: PublishRequest,
  figure: Recipe['publish']['figures'][number],
): PlateRequest | null {
  const outcome = request.outcomes.get(figure.stage);
  const drawn = outcome?.outputs[figure.output];
  if (outcome?.entry == null || drawn === undefined) return null;
  const numbers = plateNumbersOf(outcome.entry, request.book.digestOf(outcome.entry), outcome.outputs);
  const plate = numbers.get(figure.output) ?? '';
  const mark = markOf(figure.stage, request);
  return { ...figure, plate, drawn: outcome.entry, figure: drawn.digest, mark };
}

function stampOf({ recipe }: PublishRequest, { plate, name, mark }: PlateRequest): Stamp {
  return { plate, title: name, recipe: recipe.name, mark };
}

interface PlateRequest {
  readonly name: string;
  readonly output: string;
  readonly plate: string;
  readonly drawn: number;
  readonly figure: string;
  readonly mark: string | null;
}

async function makePlate(request: PublishRequest, wanted: PlateRequest): Promise<Plate> {
  const { book, recipe, folder } = request;
  const standing = findPlate(book, wanted);
  const draft = standing ?? (await stampedDraft(request, wanted));
  const entry = standing?.number ?? book.append(draft).entry.number;
  const files = (['svg', 'png'] as const).map((format) => {
    const { digest } = draft.stamped[format];
    const path = join(folder, recipe.name, `${wanted.name}.${format}`);
    layDown(path, book.store.read(digest));
    return { format, digest, path };
  });
  const { digest, path } = files[1] as (typeof files)[number];
  return { name: wanted.name, plate: wanted.plate, entry, drawn: wanted.drawn, digest, path, files };
}

async function stampedDraft(request: PublishRequest, wanted: PlateRequest): Promise<PlateDraft> {
  const { store } = request.book;
  const { name, plate, drawn, output, figure, mark } = wanted;
  const stamp = stampOf(request, wanted);
  const stamped = (await request.ahead.take(stamp)) ?? (await stampNow(store.read(figure), stamp));
  const files = { svg: store.keepBytes(stamped.svg), png: store.keepBytes(stamped.png) };
  return { type: 'plate', plate, name, drawn, output, figure, stamped: files, mark };
}

async function stampNow(figure: Uint8Array, stamp: Stamp): Promise<Stamped> {
  const { stampFigure } = await import('./plates/stamp.ts');
  return stampFigure(figure, stamp);
}

/** The first mark on the way from the data to this stage; a plate that depends on it carries it. */
function markOf(stage: string, request: PublishRequest): string | null {
  const job = request.jobs.find((each) => each.name === stage);
  const own = request.outcomes.get(stage)?.mark ?? null;
  if (own !== null || job === undefined) return own;
  for (const name of upstreamOf(job)) {
    const found = markOf(name, request);
    if (found !== null) return found;
  }
  return null;
}

export interface PublishedNumbers {
  readonly numbers: readonly PublishedNumber[];
  /** What the recipe publishes and the outputs do not hold, in sentences; a ring's numbers when there is no ring. */
  readonly absent: readonly string[];
}

/** Collects every published number whose stage ended well. */
export function publishNumbers(request: PublishRequest): PublishedNumbers {
  const numbers: PublishedNumber[] = [];
  const absent: string[] = [];
  for (const wanted of request.recipe.publish.numbers) {
    const found = findNumber(request, wanted);
    if (found === null) continue;
    if (found.number === undefined) {
      absent.push(
        `${wanted.name}: ${wanted.stage}.${wanted.output} holds no ${wanted.value}. ${found.remark}`,
      );
    } else {
      numbers.push(publishedNumber(request, wanted, found.number, found.entry));
    }
  }
  return { numbers, absent };
}

function publishedNumber(
  request: PublishRequest,
  wanted: Recipe['publish']['numbers'][number],
  number: NumberValue,
  entry: number,
): PublishedNumber {
  const { value, unit, low, high } = number;
  const truth = wanted.against === null ? null : findNumber(request, wanted.against);
  const against =
    truth?.number === undefined
      ? null
      : { value: convert(truth.number.value, truth.number.unit, unit), unit, entry: truth.entry };
  const tolerance = wanted.tolerance;
  return {
    name: wanted.name,
    value,
    low: low ?? null,
    high: high ?? null,
    unit,
    entry,
    output: wanted.output,
    key: wanted.value,
    against,
    tolerance: tolerance === null ? null : convert(tolerance.value, tolerance.unit, unit),
  };
}

function findNumber(request: PublishRequest, wanted: { stage: string; output: string; value: string }) {
  const outcome = request.outcomes.get(wanted.stage);
  const output = outcome?.outputs[wanted.output];
  if (outcome?.entry == null || output === undefined) return null;
  const place = `${wanted.stage}.${wanted.output}`;
  const numbers = readNumbers(sourceOf(request.book.store.read(output.digest), place));
  return { number: numbers.values[wanted.value], entry: outcome.entry, remark: numbers.remarks[0] ?? '' };
}

/** Lays numbers.json and numbers.tex beside the plates and returns their paths. */
export function layNumbers(
  request: PublishRequest,
  run: number,
  numbers: readonly PublishedNumber[],
): string[] {
  const folder = join(request.folder, request.recipe.name);
  const files = {
    'numbers.json': formatNumbersJson(numbers, { recipe: request.recipe.name, run }),
    'numbers.tex': formatNumbersTex(numbers, { recipe: request.recipe.name, run }),
  };
  return Object.entries(files).map(([name, text]) => {
    layDown(join(folder, name), Buffer.from(text));
    return join(folder, name);
  });
}

function layDown(path: string, bytes: Uint8Array): void {
  try {
    mkdirSync(dirname(path), { recursive: true });
    writeWhole(path, bytes);
  } catch (cause) {
    throw cannotWriteOutside(path, cause);
  }
}
