/** The stages of a recipe, each against its kind, then all together: references and loops. */

import type { Json } from '../../ledger/entry.ts';
import type { StageKind } from '../../stages/kind.ts';
import { didYouMean } from '../../stages/near-miss.ts';
import { quoted } from './cells.ts';
import { enumerate, formatsOf } from './describe.ts';
import type { FileRules } from './files.ts';
import { checkName, readKeys, readMap, readText, type Subject } from './keys.ts';
import { findLoops } from './loops.ts';
import { type Resolved, resolveFields } from './parameters.ts';
import type { ProblemList } from './recipe-problems.ts';
import {
  checkReference,
  type PlacedReference,
  type ReadInputs,
  type Reference,
  readInputs,
} from './references.ts';
import type { Spot } from './source-text.ts';

export interface DeclaredStage {
  readonly name: string;
  readonly kind: StageKind;
  /** By input name, in the order of the recipe. */
  readonly inputs: Readonly<Record<string, readonly Reference[]>>;
  /** What the computation receives: defaults filled in, a quantity as a number in the declared unit. */
  readonly parameters: Readonly<Record<string, unknown>>;
  /** What the entry records: the same, but a quantity as { value, unit }. */
  readonly recorded: Readonly<Record<string, Json>>;
}

/** A stage as far as it could be read. */
export interface ReadStage {
  readonly name: string;
  readonly subject: Subject;
  readonly kind: StageKind | undefined;
  readonly inputs: ReadInputs;
  readonly parameters: Resolved | undefined;
}

const MOST_STAGES = 1000;

export function readStages(
  subject: Subject,
  kinds: readonly StageKind[],
  rules: FileRules,
  problems: ProblemList,
): ReadonlyMap<string, ReadStage> {
  const entries = readMap(subject, 'a map of stages', problems) ?? [];
  const { spot, path } = subject;
  if (subject.cell.type === 'map' && !(entries.length >= 1 && entries.length <= MOST_STAGES)) {
    const expected = `1 to ${MOST_STAGES} stages`;
    problems.add({ spot, code: 'out-of-range', path, expected, found: String(entries.length) });
    return new Map();
  }
  const stages = new Map<string, ReadStage>();
  for (const { key, ...entry } of entries) stages.set(key, readStage(key, entry, kinds, rules, problems));
  for (const stage of stages.values()) checkInputs(stage, stages, problems);
  addLoops(stages, problems);
  return stages;
}

function readStage(
  name: string,
  subject: Subject,
  kinds: readonly StageKind[],
  rules: FileRules,
  problems: ProblemList,
): ReadStage {
  checkName(name, subject.path, subject.spot, problems);
  const keys = readKeys(subject, ['kind'], ['inputs', 'parameters'], problems);
  if (keys === undefined) return { name, subject, kind: undefined, inputs: new Map(), parameters: undefined };
  const kind = readKind(keys.get('kind'), kinds, problems);
  const inputs = readInputs(keys.get('inputs'), subject, kind, rules, problems);
  const parameters = kind && readParameters(keys.get('parameters'), subject, kind, problems);
  return { name, subject, kind, inputs, parameters };
}

function readKind(
  subject: Subject | undefined,
  kinds: readonly StageKind[],
  problems: ProblemList,
): StageKind | undefined {
  const name = subject && readText(subject, 'the name of a kind', problems);
  if (subject === undefined || name === undefined) return undefined;
  const kind = kinds.find((candidate) => candidate.kind === name);
  if (kind !== undefined) return kind;
  const names = kinds.map((candidate) => candidate.kind);
  const { cell, path } = subject;
  const advice = didYouMean(name, names).trim() || undefined;
  const expected = enumerate(names, 'or');
  problems.add({ spot: cell.spot, code: 'unknown-kind', path, expected, found: quoted(name), advice });
  return undefined;
}

function readParameters(
  subject: Subject | undefined,
  stage: Subject,
  kind: StageKind,
  problems: ProblemList,
): Resolved | undefined {
  const path = `${stage.path}.parameters`;
  if (subject !== undefined && readMap(subject, 'a map of parameters', problems) === undefined)
    return undefined;
  const cell = subject?.cell.type === 'map' ? subject.cell : undefined;
  return resolveFields(kind.parameters, cell, path, subject?.spot ?? stage.spot, problems);
}

function checkInputs(stage: ReadStage, stages: ReadonlyMap<string, ReadStage>, problems: ProblemList): void {
  for (const [name, references] of stage.inputs) {
    const declared = stage.kind !== undefined && Object.hasOwn(stage.kind.inputs, name);
    const formats = declared ? formatsOf((stage.kind as StageKind).inputs[name].format) : (['file'] as const);
    for (const reference of references) {
      if ('at' in reference) checkReference(reference, formats, stages, problems);
    }
  }
}

function addLoops(stages: ReadonlyMap<string, ReadStage>, problems: ProblemList): void {
  const needs = new Map([...stages].map(([name, stage]) => [name, needsOf(stage)]));
  for (const { stages: loop, spot } of findLoops(needs)) {
    const path = `stages.${loop[0]}`;
    const expected = 'stages that need only what other stages can make before';
    problems.add({ spot, code: 'loop', path, expected, found: `\`${loop.join(' needs ')}\`` });
  }
}

function needsOf(stage: ReadStage): ReadonlyMap<string, Spot> {
  const placed = [...stage.inputs.values()].flat().filter((reference) => 'at' in reference);
  return new Map(placed.map((reference) => [reference.stage, reference.at.stage.cell.spot]));
}

/** A stage without the places, once no problem was found. */
export function declaredStage(stage: ReadStage): DeclaredStage {
  const { name, kind, inputs, parameters } = stage;
  return {
    name,
    kind: kind as StageKind,
    inputs: Object.fromEntries(
      [...inputs].map(([input, references]) => [input, references.map(withoutPlace)]),
    ),
    parameters: parameters?.value as Record<string, unknown>,
    recorded: parameters?.recorded as Record<string, Json>,
  };
}

function withoutPlace(reference: Exclude<Reference, { stage: string }> | PlacedReference): Reference {
  return 'at' in reference ? { stage: reference.stage, output: reference.output } : reference;
}
