/** `--let STAGE.PARAMETER=VALUE`: one parameter of a recipe set anew for one run, before anything is checked. Dots
 *  reach into groups and maps: `--let observation.noise.seed=3`. */

import type { ParameterDeclaration, StageKind } from '../../stages/kind.ts';
import { didYouMean } from '../../stages/near-miss.ts';
import { type Cell, type CellEntry, describeCell, quoted } from './cells.ts';
import { defaultCell } from './parameters.ts';
import { readCells } from './read-cells.ts';
import { type ProblemList, printable } from './recipe-problems.ts';
import type { SourceText, Spot } from './source-text.ts';

export interface Override {
  readonly stage: string;
  /** Dotted where it reaches into a group. */
  readonly parameter: string;
  /** VALUE as given. */
  readonly text: string;
}

interface PlacedOverride extends Override {
  readonly value: Cell;
  readonly spot: Spot;
}

/** Reads the words after `--let`; what is no override is a problem. */
export function readOverrides(lets: readonly string[], problems: ProblemList): readonly PlacedOverride[] {
  return lets
    .map((given, i) => readOverride(given, i + 1, problems))
    .filter((override) => override !== undefined);
}

function readOverride(given: string, order: number, problems: ProblemList): PlacedOverride | undefined {
  const [, stage, parameter, text] = /^([^.=\s]+)\.([^=\s]+)=(.*)$/s.exec(given) ?? [];
  const source: SourceText = { file: `--let ${printable(given)}`, text: text ?? '', lines: null, order };
  const spot = { source, offset: 0 };
  if (parameter === undefined || parameter.split('.').includes('')) {
    const expected = '`STAGE.PARAMETER=VALUE`';
    problems.add({ spot, code: 'bad-override', path: '', expected, found: quoted(given) });
    return undefined;
  }
  const value = readCells(source, problems);
  return value && { stage, parameter, text, value, spot };
}

/** The recipe with the overrides in it. A recipe that is no map of stages stays as it is; that is reported later. */
export function applyOverrides(
  recipe: Cell,
  overrides: readonly PlacedOverride[],
  kinds: readonly StageKind[],
  problems: ProblemList,
): Cell {
  let changed = recipe;
  for (const override of overrides) {
    const stages = entryOf(changed, 'stages');
    const stage = stages && entryOf(stages.value, override.stage);
    if (stages?.value.type !== 'map') continue;
    if (stage === undefined) addUnknownStage(override, stages.value.entries, problems);
    else {
      const set = setParameter(stage.value, override, kinds, problems);
      changed = replaced(changed, { ...stages, value: replaced(stages.value, { ...stage, value: set }) });
    }
  }
  return changed;
}

function addUnknownStage(
  override: PlacedOverride,
  entries: readonly CellEntry[],
  problems: ProblemList,
): void {
  const names = entries.map(({ key }) => key);
  problems.add({
    spot: override.spot,
    code: 'unknown-stage',
    path: `stages.${override.stage}`,
    expected: 'a stage of this recipe',
    found: quoted(override.stage),
    advice: didYouMean(override.stage, names).trim() || undefined,
  });
}

function setParameter(
  stage: Cell,
  override: PlacedOverride,
  kinds: readonly StageKind[],
  problems: ProblemList,
): Cell {
  const written = entryOf(stage, 'kind')?.value;
  const kind = kinds.find(({ kind }) => written?.type === 'scalar' && written.value === kind);
  const { spot } = override;
  const parameters = entryOf(stage, 'parameters') ?? { key: 'parameters', spot, value: emptyMap(spot) };
  const names = override.parameter.split('.');
  const path = `stages.${override.stage}.parameters`;
  const fields = (name: string) => fieldOf(kind?.parameters, name);
  return replaced(stage, {
    ...parameters,
    value: setIn(parameters.value, names, fields, override, path, problems),
  });
}

type FieldOf = (name: string) => ParameterDeclaration | undefined;

function setIn(
  parent: Cell,
  [name, ...further]: readonly string[],
  fields: FieldOf,
  override: PlacedOverride,
  path: string,
  problems: ProblemList,
): Cell {
  const { spot, value } = override;
  if (parent.type !== 'map') {
    const expected = `a map to set \`${name}\` in`;
    problems.add({ spot, code: 'wrong-type', path, expected, found: describeCell(parent) });
    return parent;
  }
  if (further.length === 0) return replaced(parent, { key: name, spot, value });
  const declaration = fields(name);
  const below: FieldOf = (key) => fieldsBelow(declaration, key);
  const standing =
    entryOf(parent, name)?.value ?? (declaration && defaultCell(declaration, spot)) ?? emptyMap(spot);
  const changed = setIn(standing, further, below, override, `${path}.${name}`, problems);
  return replaced(parent, { key: name, spot: entryOf(parent, name)?.spot ?? spot, value: changed });
}

function fieldsBelow(
  declaration: ParameterDeclaration | undefined,
  key: string,
): ParameterDeclaration | undefined {
  if (declaration?.type === 'map') return declaration.of;
  return declaration?.type === 'group' ? fieldOf(declaration.fields, key) : undefined;
}

function fieldOf(
  fields: Readonly<Record<string, ParameterDeclaration>> | undefined,
  name: string,
): ParameterDeclaration | undefined {
  return fields !== undefined && Object.hasOwn(fields, name) ? fields[name] : undefined;
}

function entryOf(cell: Cell, key: string): CellEntry | undefined {
  return cell.type === 'map' ? cell.entries.find((entry) => entry.key === key) : undefined;
}

/** The map with this entry in the place of the one with its key, or at the end. */
function replaced(cell: Cell, entry: CellEntry): Cell {
  if (cell.type !== 'map') return cell;
  const has = cell.entries.some(({ key }) => key === entry.key);
  const entries = has
    ? cell.entries.map((old) => (old.key === entry.key ? entry : old))
    : [...cell.entries, entry];
  return { ...cell, entries };
}

function emptyMap(spot: Spot): Cell {
  return { type: 'map', spot, entries: [] };
}
