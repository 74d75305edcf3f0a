import { describe, expect, it } from 'vitest';
import { readRecipe } from '../../runner/recipe/recipe.ts';
import { plainParameters } from '../../runner/recorded-parameters.ts';
import { stageKinds } from '../../stages/kinds.ts';

describe('recorded parameters', () => {
  it('become what the computation received, for every stage of every recipe', () => {
    for (const name of ['lantern', 'small']) {
      const recipe = readRecipe({ path: `recipes/lantern/${name}.yaml`, kinds: stageKinds });
      for (const { kind, parameters, recorded } of recipe.stages) {
        expect(plainParameters(kind.parameters, recorded)).toEqual(parameters);
      }
    }
  });

  it('are converted to the unit that the kind declares today', () => {
    const declared = { field: { type: 'quantity', unit: 'uas', doc: '' } } as const;
    expect(plainParameters(declared, { field: { value: 0.16, unit: 'mas' } })).toEqual({ field: 160 });
  });
});
