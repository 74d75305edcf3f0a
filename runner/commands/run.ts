/** `run RECIPE`: executes a recipe and enters it in the book. */

import { realpathSync } from 'node:fs';
import { basename, dirname, isAbsolute, join, normalize, relative, resolve } from 'node:path';
import { type Book, openBook } from '../../ledger/book.ts';
import type { RunEntry, StoredFile } from '../../ledger/entry.ts';
import { withdrawalsOfNumber } from '../../ledger/withdrawal.ts';
import { stageKinds } from '../../stages/kinds.ts';
import type { CommonOptions, ExitStatus, Io } from '../command.ts';
import { keyFile, writer } from '../configuration.ts';
import { execute } from '../execute.ts';
import { isGood, type Job, type Outcome } from '../job.ts';
import { makeStampAhead } from '../plates/stamp-ahead.ts';
import { kindsFolder, stageEngine } from '../program.ts';
import { makeProgress } from '../progress.ts';
import {
  layNumbers,
  type Plate,
  type PublishedNumbers,
  type PublishRequest,
  publishFigures,
  publishNumbers,
  stampAheadOf,
} from '../publish.ts';
import { type DeclaredStage, type Recipe, readRecipe } from '../recipe/recipe.ts';
import { runText } from '../run-text.ts';

export interface RunOptions extends CommonOptions {
  readonly cores: number;
  readonly let: readonly string[];
  readonly root: readonly string[];
  readonly afresh: boolean;
  readonly strict: boolean;
  readonly plates: string;
  readonly by?: string;
  readonly signal: AbortSignal;
}

/** What a finished run is told by, on the terminal and as JSON. */
export interface RunSummary {
  readonly run: RunEntry;
  readonly recipe: Recipe;
  readonly outcomes: readonly Outcome[];
  readonly plates: readonly Plate[];
  readonly numbers: PublishedNumbers;
  /** Of each number, the entries of the withdrawals that it depends on: made while the run went on. */
  readonly withdrawn: readonly (readonly number[])[];
  readonly files: readonly string[];
}

export async function runCommand(recipePath: string, options: RunOptions, io: Io): Promise<ExitStatus> {
  const roots = options.root.map((root) => resolve(io.cwd, root));
  const path = resolve(io.cwd, recipePath);
  const recipe = readRecipe({ path, shown: recipePath, kinds: stageKinds, roots, lets: options.let });
  const book = openBook(options.book, {
    by: await writer(io, options.by),
    create: true,
    key: keyFile(io),
    announce: (text) => io.err(`${text}\n`),
  });
  try {
    const summary = await runRecipe(recipe, recipePath, book, options, io);
    if (options.json) io.out(`${JSON.stringify(runDocument(summary, book), null, 2)}\n`);
    else if (!options.quiet) io.out(runText(summary, options, io));
    return summary.run.finished ? 0 : 1;
  } finally {
    book.close();
  }
}

async function runRecipe(
  recipe: Recipe,
  recipePath: string,
  book: Book,
  options: RunOptions,
  io: Io,
): Promise<RunSummary> {
  const recipeFile = book.store.keepBytes(recipe.bytes);
  const jobs = recipe.stages.map((stage) => jobOf(stage, dirname(resolve(io.cwd, recipePath))));
  const progress = await makeProgress(io, jobs, options.quiet || options.json);
  const byName = new Map<string, Outcome>();
  const ahead = makeStampAhead();
  const request = { recipe, jobs, outcomes: byName, book, folder: options.plates, ahead };
  const drawing = new Set(recipe.publish.figures.map((figure) => figure.stage));
  try {
    const outcomes = await execute(jobs, {
      book,
      cores: options.cores,
      carry: !options.afresh,
      enter: true,
      strict: options.strict,
      engine: stageEngine(io.env),
      kindsFolder,
      signal: options.signal,
      reporter: {
        ...progress,
        started(job) {
          progress.started(job);
          if (drawing.has(job.name)) ahead.expect();
        },
        ended(outcome) {
          progress.ended(outcome);
          byName.set(outcome.name, outcome);
          if (outcome.state === 'computed') stampAheadOf(request, outcome.name);
        },
      },
    }).finally(() => progress.close());
    return await publishRun(request, outcomes, recipePath, recipeFile, io);
  } finally {
    await ahead.close();
  }
}

async function publishRun(
  request: PublishRequest,
  outcomes: readonly Outcome[],
  recipePath: string,
  recipeFile: StoredFile,
  io: Io,
): Promise<RunSummary> {
  const { recipe, book } = request;
  const plates = await publishFigures(request);
  const numbers = publishNumbers(request);
  const run = enterRun(
    { recipe, recipePath: recordedPath(recipePath, io.cwd), recipeFile, outcomes, plates, numbers },
    book,
  );
  const files = numbers.numbers.length === 0 ? [] : layNumbers(request, run.run, numbers.numbers);
  const withdrawn = numbers.numbers.map(({ entry }) => withdrawalsOfNumber(book, run.number, entry));
  return { run, recipe, outcomes, plates, numbers, withdrawn, files };
}

/** A stage of a recipe as the executor takes it. @param folder  the recipe's own */
function jobOf(stage: DeclaredStage, folder: string): Job {
  const inputs = Object.fromEntries(
    Object.entries(stage.inputs).map(([name, references]) => [
      name,
      references.map((reference) =>
        'file' in reference
          ? {
              from: 'file' as const,
              given: recordedPath(reference.file, folder),
              path: reference.path,
              keep: reference.keep,
              expected: null,
            }
          : { from: 'stage' as const, ...reference },
      ),
    ]),
  );
  return {
    name: stage.name,
    kind: stage.kind,
    inputs,
    parameters: stage.parameters,
    recorded: stage.recorded,
  };
}

interface RunFacts {
  readonly recipe: Recipe;
  readonly recipePath: string;
  readonly recipeFile: StoredFile;
  readonly outcomes: readonly Outcome[];
  readonly plates: readonly Plate[];
  readonly numbers: PublishedNumbers;
}

function enterRun(facts: RunFacts, book: Book): RunEntry {
  const { recipe, recipeFile, outcomes, plates, numbers } = facts;
  const { entry } = book.append({
    type: 'run',
    recipe: { ...recipeFile, name: recipe.name, path: facts.recipePath },
    overrides: recipe.overrides,
    stages: outcomes.map(({ name, kind, state, entry }) => ({ stage: name, kind, state, entry })),
    plates: plates.map(({ name, plate, entry }) => ({ name, plate, entry })),
    numbers: numbers.numbers,
    finished: outcomes.every((outcome) => isGood(outcome) && outcome.stop === null),
  });
  return entry as RunEntry;
}

/** A path as given, where it says nothing about a home: an absolute one becomes relative to the folder from which it
 *  counts, or its name alone when it lies outside of that folder; so does one that climbs out of more than its
 *  neighbourhood. */
function recordedPath(given: string, folder: string): string {
  const inside = isAbsolute(given) ? relative(realpathSync(folder), realpathSync(given)) : normalize(given);
  const climbs = inside.startsWith('..');
  return climbs && (isAbsolute(given) || inside.startsWith(join('..', '..'))) ? basename(given) : inside;
}

/** The document of design section 7. */
function runDocument(summary: RunSummary, book: Book) {
  const { run, recipe, outcomes, plates, numbers, withdrawn } = summary;
  return {
    run: run.run,
    entry: run.number,
    recipe: recipe.name,
    finished: run.finished,
    stages: outcomes.map((outcome) => ({
      stage: outcome.name,
      kind: outcome.kind,
      state: outcome.state,
      entry: outcome.entry,
      seconds: outcome.seconds,
      outputs: Object.fromEntries(
        Object.entries(outcome.outputs).map(([name, { digest, bytes }]) => [
          name,
          { digest, bytes, path: book.store.path(digest) },
        ]),
      ),
      findings: outcome.findings,
      warnings: outcome.warnings,
      stop: outcome.stop,
      error: outcome.error,
    })),
    plates,
    numbers: numbers.numbers.map(({ name, value, low, high, unit, entry, against }, i) => ({
      name,
      value,
      low,
      high,
      unit,
      entry,
      against,
      withdrawn: withdrawn[i],
    })),
    absent: numbers.absent,
  };
}
