import { describe, expect, it } from 'vitest';
import { readRecipe } from '../../runner/recipe/recipe.ts';
import { filledParameters, plainParameters } from '../../runner/recorded-parameters.ts';
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

  it('have the defaults of what the kind has had only since, which is named', () => {
    const declared = {
      field: { type: 'quantity', unit: 'uas', default: '160 uas', doc: '' },
      taper: { type: 'quantity', unit: 'uas', optional: true, doc: '' },
      priors: {
        type: 'group',
        doc: '',
        fields: {
          usual: { type: 'number', default: 0.1, doc: '' },
          worst: { type: 'number', default: 0.5, doc: '' },
        },
      },
      sampler: { type: 'group', doc: '', fields: { chains: { type: 'integer', default: 4, doc: '' } } },
    } as const;
    expect(filledParameters(declared, { priors: { usual: 0.2 } })).toEqual({
      parameters: { field: 160, priors: { usual: 0.2, worst: 0.5 }, sampler: { chains: 4 } },
      added: ['field', 'priors.worst', 'sampler'],
    });
  });
});
