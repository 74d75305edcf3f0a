/** References: `{ file: PATH }`, `{ file: PATH, keep: true }`, `{ stage: NAME, output: NAME }`. */

import type { Format, InputDeclaration, OutputDeclaration, StageKind } from '../../stages/kind.ts';
import { didYouMean } from '../../stages/near-miss.ts';
import { isChosen } from '../job.ts';
import { describeCell, quoted } from './cells.ts';
import { enumerate, formatsOf, oneOf } from './describe.ts';
import { type FileRules, findFile } from './files.ts';
import { readKeys, readMap, readText, type Subject } from './keys.ts';
import type { Resolved } from './parameters.ts';
import type { ProblemList } from './recipe-problems.ts';

export interface FileReference {
  /** As given. */
  readonly file: string;
  /** Absolute, links followed. */
  readonly path: string;
  /** Whether the store keeps a copy. */
  readonly keep: boolean;
}

export interface StageReference {
  readonly stage: string;
  readonly output: string;
}

export type Reference = FileReference | StageReference;

/** A reference to a stage with the places of its two names. */
export interface PlacedReference extends StageReference {
  readonly at: { readonly stage: Subject; readonly output: Subject };
}

/** References by input name. Without a declaration (the kind is unknown) files and forms are checked all the same. */
export type ReadInputs = ReadonlyMap<string, readonly (FileReference | PlacedReference)[]>;

export function readInputs(
  inputs: Subject | undefined,
  stage: Subject,
  kind: StageKind | undefined,
  rules: FileRules,
  problems: ProblemList,
): ReadInputs {
  const entries = inputs === undefined ? [] : (readMap(inputs, 'a map of inputs', problems) ?? []);
  const found = new Map<string, readonly (FileReference | PlacedReference)[]>();
  for (const { key, ...subject } of entries) {
    const declaration = declaredInput(kind, key);
    if (kind !== undefined && declaration === undefined) addUnknownInput(key, subject, kind, problems);
    found.set(key, readReferences(subject, declaration, rules, problems));
  }
  const path = `${stage.path}.inputs`;
  for (const [name, declaration] of Object.entries(kind?.inputs ?? {})) {
    if (declaration.optional || found.has(name)) continue;
    const expected = `a reference (${formatsOf(declaration.format).join(' or ')})`;
    const spot = inputs?.spot ?? stage.spot;
    const advice = `Add \`${name}\`: ${declaration.doc}`;
    problems.add({
      spot,
      code: 'missing-input',
      path: `${path}.${name}`,
      expected,
      found: 'nothing',
      advice,
    });
  }
  return found;
}

function declaredInput(kind: StageKind | undefined, name: string): InputDeclaration | undefined {
  return kind !== undefined && Object.hasOwn(kind.inputs, name) ? kind.inputs[name] : undefined;
}

function addUnknownInput(
  name: string,
  { path, spot }: Subject,
  kind: StageKind,
  problems: ProblemList,
): void {
  const names = Object.keys(kind.inputs);
  const expected = names.length === 0 ? `no input: \`${kind.kind}\` takes none` : enumerate(names, 'or');
  const advice = didYouMean(name, names).trim() || undefined;
  problems.add({ spot, code: 'unknown-input', path, expected, found: quoted(name), advice });
}

function readReferences(
  subject: Subject,
  declaration: InputDeclaration | undefined,
  rules: FileRules,
  problems: ProblemList,
): readonly (FileReference | PlacedReference)[] {
  const { cell, path } = subject;
  const many = declaration === undefined || declaration.many === true;
  if (cell.type !== 'list' || !many) {
    const reference = readReference(subject, rules, problems);
    return reference === undefined ? [] : [reference];
  }
  if (cell.items.length === 0) {
    const expected = 'at least one reference';
    problems.add({ spot: cell.spot, code: 'wrong-type', path, expected, found: describeCell(cell) });
  }
  const items = cell.items.map((item, i) => ({ cell: item, path: `${path}.${i}`, spot: item.spot }));
  return items
    .map((item) => readReference(item, rules, problems))
    .filter((reference) => reference !== undefined);
}

function readReference(
  subject: Subject,
  rules: FileRules,
  problems: ProblemList,
): FileReference | PlacedReference | undefined {
  const { cell, path } = subject;
  if (cell.type !== 'map') {
    const expected = '`{ file: PATH }` or `{ stage: NAME, output: NAME }`';
    problems.add({ spot: cell.spot, code: 'wrong-type', path, expected, found: describeCell(cell) });
    return undefined;
  }
  const isFile = cell.entries.some(({ key }) => key === 'file');
  return isFile
    ? readFileReference(subject, rules, problems)
    : readStageReference(subject, [], problems)?.reference;
}

function readFileReference(
  subject: Subject,
  rules: FileRules,
  problems: ProblemList,
): FileReference | undefined {
  const keys = readKeys(subject, ['file'], ['keep'], problems);
  const place = keys?.get('file');
  const keep = readKeep(keys?.get('keep'), problems);
  const file = place && readText(place, 'the path of a file', problems);
  if (place === undefined || file === undefined) return undefined;
  const path = findFile(file, rules);
  if (typeof path === 'string') return { file, path, keep };
  const found = `${quoted(file)}: ${path.found}`;
  problems.add({ spot: place.cell.spot, path: place.path, ...path, found });
  return undefined;
}

function readKeep(subject: Subject | undefined, problems: ProblemList): boolean {
  if (subject === undefined) return false;
  const { cell, path } = subject;
  if (cell.type === 'scalar' && typeof cell.value === 'boolean') return cell.value;
  problems.add({
    spot: cell.spot,
    code: 'wrong-type',
    path,
    expected: 'true or false',
    found: describeCell(cell),
  });
  return false;
}

/** `stage` and `output`, with further keys that the caller reads. */
export function readStageReference(
  subject: Subject,
  furtherRequired: readonly string[],
  problems: ProblemList,
  furtherOptional: readonly string[] = [],
):
  | { readonly reference: PlacedReference | undefined; readonly keys: ReadonlyMap<string, Subject> }
  | undefined {
  const keys = readKeys(subject, ['stage', 'output', ...furtherRequired], furtherOptional, problems);
  if (keys === undefined) return undefined;
  const [stageAt, outputAt] = [keys.get('stage'), keys.get('output')];
  const stage = stageAt && readText(stageAt, 'the name of a stage', problems);
  const output = outputAt && readText(outputAt, 'the name of an output', problems);
  if (stage === undefined || output === undefined) return { reference: undefined, keys };
  const at = { stage: stageAt as Subject, output: outputAt as Subject };
  return { reference: { stage, output, at }, keys };
}

/** What a reference needs to know of the stage that it names. */
export interface ReferredStage {
  /** Undefined when the kind is unknown, which is reported elsewhere. */
  readonly kind: StageKind | undefined;
  readonly inputs: ReadInputs;
  readonly parameters: Resolved | undefined;
}

/** The stage and its output exist, the output is made, and has one of the formats. */
export function checkReference(
  reference: PlacedReference,
  formats: readonly Format[],
  stages: ReadonlyMap<string, ReferredStage>,
  problems: ProblemList,
): void {
  const { stage, output, at } = reference;
  const referred = stages.get(stage);
  if (referred === undefined) {
    const names = [...stages.keys()];
    const expected = 'a stage of this recipe';
    const advice = didYouMean(stage, names).trim() || undefined;
    const { path, cell } = at.stage;
    problems.add({ spot: cell.spot, code: 'unknown-stage', path, expected, found: quoted(stage), advice });
    return;
  }
  const kind = referred.kind;
  if (kind === undefined) return;
  const { path, cell } = at.output;
  if (!Object.hasOwn(kind.outputs, output)) {
    const names = Object.keys(kind.outputs);
    const expected = `an output of \`${kind.kind}\`: ${oneOf(names)}`;
    const advice = didYouMean(output, names).trim() || undefined;
    problems.add({ spot: cell.spot, code: 'unknown-output', path, expected, found: quoted(output), advice });
    return;
  }
  checkOutput(reference, kind.outputs[output], formats, referred, problems);
}

function checkOutput(
  { stage, output, at }: PlacedReference,
  declaration: OutputDeclaration,
  formats: readonly Format[],
  referred: ReferredStage,
  problems: ProblemList,
): void {
  const { path, cell } = at.output;
  const spot = cell.spot;
  if (!formats.includes(declaration.format) && !formats.includes('file')) {
    const found = `${quoted(output)}, which is ${declaration.format}`;
    problems.add({
      spot,
      code: 'wrong-format',
      path,
      expected: `an output that is ${formats.join(' or ')}`,
      found,
    });
  }
  const absent = (declaration.needs ?? []).filter((input) => !referred.inputs.has(input));
  const parameters = (referred.parameters?.value ?? {}) as Readonly<Record<string, unknown>>;
  const isLeftOut = !isChosen(output, declaration, parameters);
  if (absent.length === 0 && !isLeftOut) return;
  const expected = `an output that stage \`${stage}\` makes`;
  const why = isLeftOut
    ? `its parameter \`${declaration.chosenBy}\` leaves out`
    : `needs the input ${enumerate(absent, 'and')}`;
  const advice = isLeftOut ? 'Name it in that parameter, or refer to another output.' : undefined;
  const found = `${quoted(output)}, which ${why}`;
  problems.add({ spot, code: 'output-not-made', path, expected, found, advice });
}
