/** A recipe: a YAML document that declares stages and what is published from them.
 *
 *      recipe: lantern-ring
 *      purpose: Ring of the Lantern nucleus, spring session, upper band.
 *      stages:
 *        NAME:
 *          kind: KIND
 *          inputs: { NAME: { file: PATH, keep: true }, NAME: { stage: NAME, output: NAME } }
 *          parameters: { … }
 *      publish:
 *        figures: { NAME: { stage: NAME, output: NAME } }
 *        numbers: { NAME: { stage: NAME, output: NAME, value: NAME, tolerance: 0.01 uas, against: { … } } }
 *
 *  YAML 1.2, core schema, one document. Read and checked here as a whole: either a Recipe comes out, or everything that
 *  is wrong with it. Where the YAML itself is broken, only that is told: what follows would be guesses. */

import { readFileSync, statSync } from 'node:fs';
import { dirname, resolve } from 'node:path';
import type { StageKind } from '../../stages/kind.ts';
import type { RunnerCode } from '../problem.ts';
import type { Cell } from './cells.ts';
import { describeFile, type FileRules, fileRules } from './files.ts';
import { checkName, readKeys, readText } from './keys.ts';
import { applyOverrides, type Override, readOverrides } from './overrides.ts';
import { type Publish, readPublish } from './publish.ts';
import { readCells } from './read-cells.ts';
import { type ProblemList, problemList, RecipeProblems } from './recipe-problems.ts';
import { decodeUtf8, type SourceText, sourceText } from './source-text.ts';
import { type DeclaredStage, declaredStage, readStages } from './stages.ts';

export type { Override } from './overrides.ts';
export type { Publish, PublishedFigure, PublishedNumberRequest, Tolerance } from './publish.ts';
export { type RecipeProblem, RecipeProblems } from './recipe-problems.ts';
export type { FileReference, Reference, StageReference } from './references.ts';
export type { DeclaredStage } from './stages.ts';

export interface Recipe {
  readonly name: string;
  /** '' where the recipe states none. */
  readonly purpose: string;
  /** As requested. */
  readonly path: string;
  readonly bytes: Uint8Array;
  /** In the order of the file. */
  readonly stages: readonly DeclaredStage[];
  readonly publish: Publish;
  readonly overrides: readonly Override[];
}

export interface RecipeRequest {
  readonly path: string;
  /** How messages name the recipe; the path by default. */
  readonly shown?: string;
  /** The recipe's content where it is not to be read from `path`; files count from the directory of `path` anyway. */
  readonly bytes?: Uint8Array;
  readonly kinds: readonly StageKind[];
  /** Directories from which input files may come, besides the recipe's own. */
  readonly roots?: readonly string[];
  /** `STAGE.PARAMETER=VALUE`, in order. */
  readonly lets?: readonly string[];
}

const MOST_BYTES = 1_000_000;

/** Reads and checks a recipe; the files that it names are looked up, not read.
 *  @throws RecipeProblems with all that is wrong. Cost: a second for the largest. */
export function readRecipe(request: RecipeRequest): Recipe {
  const shown = request.shown ?? request.path;
  const problems = problemList();
  const bytes = request.bytes ?? readBytes(request.path, shown);
  const overrides = readOverrides(request.lets ?? [], problems);
  const written = readCells(textOf(bytes, shown), problems);
  if (written === undefined) throw new RecipeProblems(problems.sorted());
  const root = applyOverrides(written, overrides, request.kinds, problems);
  const rules = fileRules(dirname(resolve(request.path)), request.roots ?? []);
  const recipe = readRoot(root, request.kinds, rules, problems);
  if (problems.count > 0) throw new RecipeProblems(problems.sorted());
  return {
    ...recipe,
    path: request.path,
    bytes,
    overrides: overrides.map(({ stage, parameter, text }) => ({ stage, parameter, text })),
  };
}

function readBytes(path: string, shown: string): Uint8Array {
  try {
    const stats = statSync(path);
    if (!stats.isFile()) throw fileProblem(shown, 'no-recipe', 'a recipe at this path', describeFile(stats));
    if (stats.size > MOST_BYTES) throw tooLarge(shown, stats.size);
    return readFileSync(path);
  } catch (error) {
    if (error instanceof RecipeProblems) throw error;
    const code = (error as NodeJS.ErrnoException).code;
    if (code === undefined) throw error;
    const found = code === 'EACCES' ? 'a file that may not be read' : `nothing that can be read (${code})`;
    throw fileProblem(shown, 'no-recipe', 'a recipe at this path', found);
  }
}

function textOf(bytes: Uint8Array, shown: string): SourceText {
  if (bytes.length > MOST_BYTES) throw tooLarge(shown, bytes.length);
  const text = decodeUtf8(bytes);
  if (typeof text === 'string') return sourceText(shown, text);
  const hex = bytes[text.badByte].toString(16).padStart(2, '0');
  const before = new TextDecoder().decode(bytes.subarray(0, text.badByte));
  const problems = problemList();
  problems.add({
    spot: { source: sourceText(shown, before), offset: before.length },
    code: 'not-text',
    path: '',
    expected: 'UTF-8',
    found: `the byte 0x${hex} at offset ${text.badByte}`,
  });
  throw new RecipeProblems(problems.sorted());
}

function tooLarge(shown: string, size: number): RecipeProblems {
  return fileProblem(shown, 'too-large', `at most ${MOST_BYTES} bytes`, `${size}`);
}

/** A problem of the file as a whole. */
function fileProblem(shown: string, code: RunnerCode, expected: string, found: string): RecipeProblems {
  const problems = problemList();
  const source: SourceText = { file: shown, text: '', lines: null, order: 0 };
  problems.add({ spot: { source, offset: 0 }, code, path: '', expected, found });
  return new RecipeProblems(problems.sorted());
}

/** The recipe as far as it holds; meaningful only when no problem was added. */
function readRoot(root: Cell, kinds: readonly StageKind[], rules: FileRules, problems: ProblemList) {
  const subject = { cell: root, path: '', spot: root.spot };
  const keys = readKeys(subject, ['recipe', 'stages'], ['purpose', 'publish'], problems);
  const nameAt = keys?.get('recipe');
  const name = nameAt && readText(nameAt, 'a name', problems);
  if (nameAt !== undefined && name !== undefined) checkName(name, 'recipe', nameAt.cell.spot, problems);
  const purposeAt = keys?.get('purpose');
  const purpose = purposeAt && readText(purposeAt, 'a sentence', problems, 'lines');
  const stagesAt = keys?.get('stages');
  const stages = stagesAt === undefined ? new Map() : readStages(stagesAt, kinds, rules, problems);
  const publish = readPublish(keys?.get('publish'), stages, problems);
  return {
    name: name ?? '',
    purpose: purpose?.trimEnd() ?? '',
    stages: problems.count > 0 ? [] : [...stages.values()].map(declaredStage),
    publish,
  };
}
