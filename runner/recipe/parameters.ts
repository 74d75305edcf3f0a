/** Parameters of a stage, from the cells of a recipe and the declaration of the kind: checked, defaults filled in. */

import type { Json } from '../../ledger/entry.ts';
import type { ParameterDeclaration } from '../../stages/kind.ts';
import { didYouMean } from '../../stages/near-miss.ts';
import { InputProblem } from '../../stages/problem.ts';
import { convert, dimensionOf, parseQuantity, type Quantity } from '../../stages/units.ts';
import type { RunnerCode } from '../problem.ts';
import { type Cell, cellOf, describeCell, quoted } from './cells.ts';
import { describeLength, describeParameter, enumerate } from './describe.ts';
import { below } from './keys.ts';
import { type ProblemList, problemList } from './recipe-problems.ts';
import type { Spot } from './source-text.ts';

/** A value as the stage receives it, and as the entry records it: there a quantity is { value, unit }. */
export interface Resolved {
  readonly value: unknown;
  readonly recorded: Json;
}

type Of<T extends ParameterDeclaration['type']> = Extract<ParameterDeclaration, { readonly type: T }>;

/** One value against its declaration; undefined, and problems in the list, when it does not fit. */
export function resolveParameter(
  declaration: ParameterDeclaration,
  cell: Cell,
  path: string,
  problems: ProblemList,
): Resolved | undefined {
  const refuse = refusal(declaration, cell, path, problems);
  switch (declaration.type) {
    case 'integer':
    case 'number':
      return resolveNumber(declaration, cell, refuse);
    case 'quantity':
      return resolveQuantity(declaration, cell, refuse);
    case 'boolean':
      return cell.type === 'scalar' && typeof cell.value === 'boolean'
        ? same(cell.value)
        : refuse('wrong-type');
    case 'word':
      return resolveWord(declaration, cell, refuse);
    case 'text':
      return resolveText(declaration, cell, refuse);
    case 'list':
      return resolveList(declaration, cell, path, problems);
    case 'group':
      if (cell.type !== 'map') return refuse('wrong-type');
      return resolveFields(declaration.fields, cell, path, cell.spot, problems);
    case 'map':
      return resolveMap(declaration, cell, path, problems);
    case 'either':
      return resolveEither(declaration, cell, path, problems);
  }
}

/** Fields with fixed names: the parameters of a stage, or a group. @param cell undefined when nothing is written */
export function resolveFields(
  fields: Readonly<Record<string, ParameterDeclaration>>,
  cell: (Cell & { readonly type: 'map' }) | undefined,
  path: string,
  spot: Spot,
  problems: ProblemList,
): Resolved | undefined {
  const written = new Map(cell?.entries.map((entry) => [entry.key, entry]));
  const before = problems.count;
  for (const { key, spot } of written.values()) {
    if (Object.hasOwn(fields, key)) continue;
    const names = Object.keys(fields);
    problems.add({
      spot,
      code: 'unknown-parameter',
      path: below(path, key),
      expected: names.length === 0 ? 'no parameter' : enumerate(names, 'or'),
      found: quoted(key),
      advice: didYouMean(key, names).trim() || undefined,
    });
  }
  const resolved = new Map<string, Resolved>();
  for (const [name, declaration] of Object.entries(fields)) {
    const value = written.get(name)?.value ?? defaultCell(declaration, spot);
    if (value === undefined && declaration.optional) continue;
    const field =
      value === undefined
        ? resolveMissing(declaration, below(path, name), spot, problems)
        : resolveParameter(declaration, value, below(path, name), problems);
    if (field !== undefined) resolved.set(name, field);
  }
  return problems.count > before ? undefined : together(resolved);
}

/** The default of a declaration as a cell; undefined where it has none. */
export function defaultCell(declaration: ParameterDeclaration, spot: Spot): Cell | undefined {
  return declaration.default === undefined ? undefined : cellOf(declaration.default, spot);
}

/** A group without a default of its own is what its fields' defaults make it; anything else is missing. */
function resolveMissing(
  declaration: ParameterDeclaration,
  path: string,
  spot: Spot,
  problems: ProblemList,
): Resolved | undefined {
  if (declaration.type === 'group') {
    const resolved = resolveFields(declaration.fields, undefined, path, spot, problemList());
    if (resolved !== undefined) return resolved;
  }
  const expected = describeParameter(declaration);
  problems.add({
    spot,
    code: 'missing-parameter',
    path,
    expected,
    found: 'nothing',
    advice: addAdvice(path),
  });
  return undefined;
}

function addAdvice(path: string): string {
  return `Add \`${path.slice(path.lastIndexOf('.') + 1)}\`.`;
}

type Refuse = (
  code: RunnerCode,
  details?: { expected?: string; found?: string; advice?: string },
) => undefined;

function refusal(declaration: ParameterDeclaration, cell: Cell, path: string, problems: ProblemList): Refuse {
  return (code, details = {}) => {
    const { expected = describeParameter(declaration), found = describeCell(cell), advice } = details;
    problems.add({ spot: cell.spot, code, path, expected, found, advice });
    return undefined;
  };
}

function resolveNumber(
  declaration: Of<'integer' | 'number'>,
  cell: Cell,
  refuse: Refuse,
): Resolved | undefined {
  if (cell.type !== 'scalar' || typeof cell.value !== 'number') {
    return refuse('wrong-type', { advice: adviceOnNumber(cell) });
  }
  const { type, from = -Infinity, to = Infinity } = declaration;
  if (type === 'integer' && Number.isFinite(cell.value)) {
    if (!Number.isInteger(cell.value)) return refuse('wrong-type');
    if (!Number.isSafeInteger(cell.value))
      return refuse('out-of-range', { advice: 'Stay below 2 to the power of 53.' });
  }
  if (!(Number.isFinite(cell.value) && cell.value >= from && cell.value <= to)) return refuse('out-of-range');
  return same(cell.value + 0);
}

function adviceOnNumber(cell: Cell): string | undefined {
  if (cell.type !== 'scalar' || typeof cell.value !== 'string') return undefined;
  if (cell.value.trim() !== '' && !Number.isNaN(Number(cell.value))) return 'Remove the quotes.';
  return /^[+-]?[\d.]+(?:[eE][+-]?\d+)? *[A-Za-z%]/.test(cell.value)
    ? 'Write the number without a unit.'
    : undefined;
}

function resolveQuantity(declaration: Of<'quantity'>, cell: Cell, refuse: Refuse): Resolved | undefined {
  const { unit, from = -Infinity, to = Infinity } = declaration;
  const quantity = readQuantity(unit, cell, refuse);
  if (quantity === undefined) return undefined;
  if (dimensionOf(quantity.unit) !== dimensionOf(unit)) {
    const standing = `${describeCell(cell).replace(/ \(text\)$/, '')} (${dimensionOf(quantity.unit)})`;
    return refuse('wrong-dimension', { found: standing });
  }
  const value = convert(quantity.value, quantity.unit, unit);
  if (!(Number.isFinite(value) && value >= from && value <= to)) return refuse('out-of-range');
  return { value, recorded: { value, unit } };
}

function readQuantity(unit: string, cell: Cell, refuse: Refuse): Quantity | undefined {
  if (cell.type === 'scalar' && typeof cell.value === 'number') {
    if (unit === '') return { value: cell.value, unit };
    if (!Number.isFinite(cell.value)) return refuse('out-of-range');
    return refuse('bad-quantity', { advice: `Write the unit: \`${cell.written} ${unit}\`.` });
  }
  if (cell.type !== 'scalar' || typeof cell.value !== 'string') return refuse('wrong-type');
  try {
    return parseQuantity(cell.value);
  } catch (error) {
    if (!(error instanceof InputProblem)) throw error;
    const found = error.code === 'bad-unit' ? `${quoted(cell.value)}: ${error.found}` : quoted(cell.value);
    return refuse(error.code === 'bad-unit' ? 'bad-unit' : 'bad-quantity', { found, advice: error.advice });
  }
}

function resolveWord(declaration: Of<'word'>, cell: Cell, refuse: Refuse): Resolved | undefined {
  if (cell.type !== 'scalar' || typeof cell.value !== 'string') return refuse('wrong-type');
  if (declaration.words.includes(cell.value)) return same(cell.value);
  return refuse('unknown-word', { advice: didYouMean(cell.value, declaration.words).trim() || undefined });
}

function resolveText(declaration: Of<'text'>, cell: Cell, refuse: Refuse): Resolved | undefined {
  if (cell.type !== 'scalar' || typeof cell.value !== 'string') {
    const quotable = cell.type === 'scalar' && cell.value !== null;
    return refuse('wrong-type', {
      advice: quotable ? `Put it into quotes: \`"${cell.written}"\`.` : undefined,
    });
  }
  if (/[\p{Cc}\p{Cf}]/u.test(cell.value.replace(/[\n\t]/g, ''))) {
    return refuse('control-character', { expected: 'printable text' });
  }
  const { pattern } = declaration;
  if (pattern !== undefined && !new RegExp(pattern, 'u').test(cell.value)) return refuse('wrong-type');
  return same(cell.value);
}

function resolveList(
  declaration: Of<'list'>,
  cell: Cell,
  path: string,
  problems: ProblemList,
): Resolved | undefined {
  const refuse = refusal(declaration, cell, path, problems);
  if (cell.type !== 'list') return refuse('wrong-type', { advice: 'Write a list: `[first, second]`.' });
  const { least, most } = declaration;
  if (!(cell.items.length >= (least ?? 0) && cell.items.length <= (most ?? Infinity))) {
    return refuse('out-of-range', { expected: `a list${describeLength(least, most)}` });
  }
  const items = cell.items.map((item, i) => resolveParameter(declaration.of, item, `${path}.${i}`, problems));
  if (!items.every((item) => item !== undefined)) return undefined;
  return { value: items.map(({ value }) => value), recorded: items.map(({ recorded }) => recorded) };
}

/** Names in the order of their letters, whatever the order in the recipe: one spelling of one value. */
function resolveMap(
  declaration: Of<'map'>,
  cell: Cell,
  path: string,
  problems: ProblemList,
): Resolved | undefined {
  if (cell.type !== 'map') return refusal(declaration, cell, path, problems)('wrong-type');
  const before = problems.count;
  const resolved = new Map<string, Resolved>();
  for (const { key, value } of cell.entries.toSorted((a, b) => (a.key < b.key ? -1 : 1))) {
    const item = resolveParameter(declaration.of, value, below(path, key), problems);
    if (item !== undefined) resolved.set(key, item);
  }
  return problems.count > before ? undefined : together(resolved);
}

/** The first alternative that admits the value. Where none does, a map or a list that only one could be is judged by
 *  that one; of a scalar all are named, with the code and the advice of the first that it comes near to. */
function resolveEither(
  declaration: Of<'either'>,
  cell: Cell,
  path: string,
  problems: ProblemList,
): Resolved | undefined {
  const trials = problemList();
  for (const alternative of declaration.of) {
    const resolved = resolveParameter(alternative, cell, path, trials);
    if (resolved !== undefined) return resolved;
  }
  const alike = declaration.of.filter((alternative) => shapeOf(alternative) === cell.type);
  if (cell.type !== 'scalar' && alike.length === 1) return resolveParameter(alike[0], cell, path, problems);
  const near = trials.sorted().find(({ code }) => code !== 'wrong-type');
  return refusal(declaration, cell, path, problems)(near?.code ?? 'wrong-type', { advice: near?.advice });
}

function shapeOf(declaration: ParameterDeclaration): Cell['type'] | undefined {
  if (declaration.type === 'either') return undefined;
  if (declaration.type === 'list') return 'list';
  return declaration.type === 'group' || declaration.type === 'map' ? 'map' : 'scalar';
}

function together(resolved: ReadonlyMap<string, Resolved>): Resolved {
  const entries = [...resolved];
  return {
    value: Object.fromEntries(entries.map(([name, { value }]) => [name, value])),
    recorded: Object.fromEntries(entries.map(([name, { recorded }]) => [name, recorded])),
  };
}

function same(value: string | number | boolean): Resolved {
  return { value, recorded: value };
}
