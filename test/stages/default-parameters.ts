/** Parameters of a kind as its computation receives them when a recipe gives none. */

import { resolveFields } from '../../runner/recipe/parameters.ts';
import { problemList } from '../../runner/recipe/recipe-problems.ts';
import { sourceText } from '../../runner/recipe/source-text.ts';
import type { StageKind } from '../../stages/kind.ts';

export function defaultParameters(kind: StageKind): Record<string, unknown> {
  const problems = problemList();
  const spot = { source: sourceText('test', ''), offset: 0 };
  const resolved = resolveFields(kind.parameters, undefined, 'parameters', spot, problems);
  if (!resolved)
    throw new Error(`${kind.kind}: ${JSON.stringify(problems.sorted().map(({ found }) => found))}`);
  return resolved.value as Record<string, unknown>;
}
