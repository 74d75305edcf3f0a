/** `proofread RECIPE`: reads a recipe, says what is wrong, computes nothing. */

import { resolve } from 'node:path';
import type { StageKind } from '../../stages/kind.ts';
import { formatQuantity } from '../../stages/units.ts';
import type { CommonOptions, ExitStatus, Io } from '../command.ts';
import {
  type DeclaredStage,
  type PublishedNumberRequest,
  type Recipe,
  type RecipeProblem,
  RecipeProblems,
  readRecipe,
} from '../recipe/recipe.ts';

export interface ProofreadOptions extends CommonOptions {
  /** Directories from which input files may come, besides the recipe's own; from the working directory. */
  readonly root?: readonly string[];
  readonly let?: readonly string[];
  /** The program's kinds by default. */
  readonly kinds?: readonly StageKind[];
}

/** Prints what the recipe declares and `nothing wrong`, or every problem. Returns 2 when there are any. */
export async function proofreadCommand(path: string, options: ProofreadOptions, io: Io): Promise<ExitStatus> {
  const kinds = options.kinds ?? (await import('../../stages/kinds.ts')).stageKinds;
  const roots = options.root?.map((root) => resolve(io.cwd, root));
  try {
    const recipe = readRecipe({ path: resolve(io.cwd, path), shown: path, kinds, roots, lets: options.let });
    if (options.json) io.out(formatDocument(path, recipe, []));
    else if (!options.quiet) io.out(formatRecipe(recipe));
    return 0;
  } catch (error) {
    if (!(error instanceof RecipeProblems)) throw error;
    const count = error.problems.length;
    if (options.json) io.out(formatDocument(path, null, error.problems));
    else io.out(`${error.message}\n\n${count} ${count === 1 ? 'problem' : 'problems'}.\n`);
    return error.exitStatus;
  }
}

/** @param recipe null when it has problems */
function formatDocument(path: string, recipe: Recipe | null, problems: readonly RecipeProblem[]): string {
  const document = {
    recipe: path,
    name: recipe?.name ?? null,
    stages: recipe?.stages.map(({ name, kind }) => ({ stage: name, kind: kind.kind })) ?? [],
    publish: recipe?.publish ?? { figures: [], numbers: [] },
    problems,
  };
  return `${JSON.stringify(document, null, 2)}\n`;
}

function formatRecipe(recipe: Recipe): string {
  const { figures, numbers } = recipe.publish;
  const counts = [
    counted(recipe.stages.length, 'stage'),
    counted(figures.length, 'figure'),
    counted(numbers.length, 'number'),
  ];
  const lines = [
    `${recipe.name}: ${counts.join(', ')}; nothing wrong.`,
    '',
    ...aligned(recipe.stages.map((stage) => ['stage', stage.name, stage.kind.kind, originsOf(stage)])),
    ...aligned([
      ...figures.map(({ name, stage, output }) => ['figure', name, `${stage} ${output}`]),
      ...numbers.map((number) => ['number', number.name, formatNumber(number)]),
    ]),
  ];
  return `${lines.join('\n')}\n`;
}

function counted(count: number, what: string): string {
  return `${count} ${what}${count === 1 ? '' : 's'}`;
}

/** What a stage reads: stages and files, each once. */
function originsOf(stage: DeclaredStage): string {
  const references = Object.values(stage.inputs).flat();
  const names = references.map((reference) => ('file' in reference ? reference.file : reference.stage));
  return names.length === 0 ? '' : `from ${[...new Set(names)].join(', ')}`;
}

function formatNumber({ stage, output, value, tolerance, against }: PublishedNumberRequest): string {
  const within = tolerance === null ? '' : `, tolerance ${formatQuantity(tolerance.value, tolerance.unit)}`;
  const truth = against === null ? '' : `, against ${against.stage} ${against.output} ${against.value}`;
  return `${stage} ${output} ${value}${within}${truth}`;
}

/** Rows with their columns under one another. */
function aligned(rows: readonly (readonly string[])[]): string[] {
  const width = (i: number) => Math.max(...rows.map((row) => row[i]?.length ?? 0));
  return rows.map((row) => `  ${row.map((word, i) => word.padEnd(width(i))).join('  ')}`.trimEnd());
}
