/** From the parameters that an entry records back to what a computation receives: quantities, recorded with their
 *  unit, become numbers in the unit that the kind declares today. */

import type { Json } from '../ledger/entry.ts';
import type { ParameterDeclaration } from '../stages/kind.ts';
import { convert } from '../stages/units.ts';
import { resolveFields } from './recipe/parameters.ts';
import { problemList } from './recipe/recipe-problems.ts';
import { sourceText } from './recipe/source-text.ts';

/** The same, with the defaults of parameters that the kind has had only since, which are named. */
export function filledParameters(
  declarations: Readonly<Record<string, ParameterDeclaration>>,
  recorded: Readonly<Record<string, Json>>,
): { readonly parameters: Record<string, unknown>; readonly added: readonly string[] } {
  const added: string[] = [];
  const fill = (fields: typeof declarations, given: typeof recorded, path: string) => {
    const plain = plainParameters(fields, given);
    for (const [name, declaration] of Object.entries(fields)) {
      const value = given[name];
      if (value === undefined) {
        const filled = defaultOf(name, declaration);
        if (filled === undefined) continue;
        plain[name] = filled;
        added.push(`${path}${name}`);
      } else if (declaration.type === 'group' && isRecord(value)) {
        plain[name] = fill(declaration.fields, value, `${path}${name}.`);
      }
    }
    return plain;
  };
  return { parameters: fill(declarations, recorded, ''), added };
}

/** Undefined for a parameter that may be left out, or has no default. */
function defaultOf(name: string, declaration: ParameterDeclaration): unknown {
  if (declaration.optional) return undefined;
  const nowhere = { source: sourceText('', ''), offset: 0 };
  const resolved = resolveFields({ [name]: declaration }, undefined, '', nowhere, problemList());
  return (resolved?.value as Record<string, unknown> | undefined)?.[name];
}

/** Parameters as `compute` takes them. Parameters that the kind no longer declares are passed as they stand. */
export function plainParameters(
  declarations: Readonly<Record<string, ParameterDeclaration>>,
  recorded: Readonly<Record<string, Json>>,
): Record<string, unknown> {
  return Object.fromEntries(
    Object.entries(recorded).map(([name, value]) => [name, plainValue(declarations[name], value)]),
  );
}

function plainValue(declaration: ParameterDeclaration | undefined, value: Json): unknown {
  switch (declaration?.type) {
    case 'quantity':
      return isQuantity(value) ? convert(value.value, value.unit, declaration.unit) : value;
    case 'list':
      return Array.isArray(value) ? value.map((item) => plainValue(declaration.of, item)) : value;
    case 'group':
      return isRecord(value) ? plainParameters(declaration.fields, value) : value;
    case 'map':
      return isRecord(value) ? mapValues(value, (item) => plainValue(declaration.of, item)) : value;
    case 'either':
      return plainValue(alternativeFor(declaration.of, value), value);
    default:
      return value;
  }
}

/** Among alternatives only the shape of the recorded value can tell a quantity, a list or a map from the rest. */
function alternativeFor(
  alternatives: readonly ParameterDeclaration[],
  value: Json,
): ParameterDeclaration | undefined {
  if (isQuantity(value)) return alternatives.find((each) => each.type === 'quantity');
  if (Array.isArray(value)) return alternatives.find((each) => each.type === 'list');
  if (isRecord(value)) return alternatives.find((each) => each.type === 'group' || each.type === 'map');
  return undefined;
}

function isQuantity(value: Json): value is { readonly value: number; readonly unit: string } {
  return (
    isRecord(value) &&
    Object.keys(value).length === 2 &&
    typeof value.value === 'number' &&
    typeof value.unit === 'string'
  );
}

function isRecord(value: Json): value is { readonly [key: string]: Json } {
  return typeof value === 'object' && value !== null && !Array.isArray(value);
}

function mapValues(record: { readonly [key: string]: Json }, each: (value: Json) => unknown) {
  return Object.fromEntries(Object.entries(record).map(([name, value]) => [name, each(value)]));
}
