/** Declarations in words: for errors, for `kinds`, for the descriptions in the JSON Schema. */

import type { Format, ParameterDeclaration } from '../../stages/kind.ts';
import { dimensionOf } from '../../stages/units.ts';

/** What a parameter may be: `an integer from 1 to 400`, `a quantity of angle, such as 160 uas`. */
export function describeParameter(declaration: ParameterDeclaration): string {
  switch (declaration.type) {
    case 'integer':
      return `an integer${describeRange(declaration.from, declaration.to, '')}`;
    case 'number':
      return `a number${describeRange(declaration.from, declaration.to, '')}`;
    case 'quantity':
      return `${describeQuantity(declaration.unit)}${describeRange(declaration.from, declaration.to, declaration.unit)}`;
    case 'boolean':
      return 'true or false';
    case 'word':
      return oneOf(declaration.words);
    case 'text':
      return declaration.pattern === undefined ? 'text' : `text that matches ${declaration.pattern}`;
    case 'list':
      return `a list${describeLength(declaration.least, declaration.most)}, each ${describeParameter(declaration.of)}`;
    case 'group':
      return `a map with ${enumerate(Object.keys(declaration.fields), 'and')}`;
    case 'map':
      return `a map from names, each to ${describeParameter(declaration.of)}`;
    case 'either':
      return declaration.of.map(describeParameter).join(', or ');
  }
}

/** `a quantity of angle in uas`; a number where the unit is none. */
export function describeQuantity(unit: string): string {
  return unit === '' ? 'a number without unit' : `a quantity of ${dimensionOf(unit)} in ${unit}`;
}

export function describeRange(from: number | undefined, to: number | undefined, unit: string): string {
  const suffix = unit === '' ? '' : ` ${unit}`;
  if (from !== undefined && to !== undefined) return ` from ${shortest(from)} to ${shortest(to)}${suffix}`;
  if (from !== undefined) return ` of at least ${shortest(from)}${suffix}`;
  return to === undefined ? '' : ` of at most ${shortest(to)}${suffix}`;
}

/** 400, 0.01, 1e9, 2147483647: large and small numbers with an exponent where that is shorter. */
function shortest(value: number): string {
  const size = Math.abs(value);
  const plain = value === 0 || (size >= 1e-4 && size < 1e5);
  const [written, short] = [String(value), value.toExponential().replace('e+', 'e')];
  return plain || written.length < short.length ? written : short;
}

export function describeLength(least: number | undefined, most: number | undefined): string {
  if (least !== undefined && least === most) return ` of ${least}`;
  if (least !== undefined && most !== undefined) return ` of ${least} to ${most}`;
  if (least !== undefined) return ` of at least ${least}`;
  return most === undefined ? '' : ` of at most ${most}`;
}

export function formatsOf(format: Format | readonly Format[]): readonly Format[] {
  return typeof format === 'string' ? [format] : format;
}

export function oneOf(words: readonly string[]): string {
  return enumerate(words, 'or');
}

/** `a`, `b` or `c`, in backquotes. */
export function enumerate(words: readonly string[], conjunction: 'and' | 'or'): string {
  const quoted = words.map((word) => `\`${word}\``);
  if (quoted.length < 2) return quoted.join('') || 'nothing';
  return `${quoted.slice(0, -1).join(', ')} ${conjunction} ${quoted[quoted.length - 1]}`;
}
