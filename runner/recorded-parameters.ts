/** From the parameters that an entry records back to what a computation receives: quantities, recorded with their
 *  unit, become numbers in the unit that the kind declares today. */

import type { Json } from '../ledger/entry.ts';
import type { ParameterDeclaration } from '../stages/kind.ts';
import { convert } from '../stages/units.ts';

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
