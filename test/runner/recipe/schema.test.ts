import { readdirSync, readFileSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { describe, expect, test } from 'vitest';
import { parse } from 'yaml';
import { z } from 'zod';
import { resolveFields } from '../../../runner/recipe/parameters.ts';
import { RecipeProblems, readRecipe } from '../../../runner/recipe/recipe.ts';
import { problemList } from '../../../runner/recipe/recipe-problems.ts';
import { formatRecipeSchema, recipeSchema } from '../../../runner/recipe/schema.ts';
import { sourceText } from '../../../runner/recipe/source-text.ts';
import type { ParameterDeclaration } from '../../../stages/kind.ts';
import { stageKinds } from '../../../stages/kinds.ts';
import { isUnit } from '../../../stages/units.ts';
import { sampleKinds } from './sample-kinds.ts';

const recipesFolder = fileURLToPath(new URL('../../../recipes/', import.meta.url));

/** Recipes that come with the program. */
function shippedRecipes(): string[] {
  const names = readdirSync(recipesFolder, { recursive: true, encoding: 'utf8' });
  return names.filter((name) => name.endsWith('.yaml')).sort();
}

/** Whether a general library finds the value valid under the schema. */
function isValid(schema: object, value: unknown): boolean {
  return z.fromJSONSchema(schema as Parameters<typeof z.fromJSONSchema>[0]).safeParse(value).success;
}

describe('the schema of recipes', () => {
  const sample = {
    recipe: 'sample',
    stages: {
      sky: { kind: 'observe', parameters: { stations: { AA: { sefd: '1 Jy' } } } },
      fit: {
        kind: 'fit',
        inputs: { data: { file: 'x.uvfits', keep: true }, extra: [{ stage: 'sky', output: 'data' }] },
        parameters: { field: '160 uas', components: 'by-data', terms: ['visibilities'] },
      },
    },
    publish: {
      figures: { ring: { stage: 'fit', output: 'picture' } },
      numbers: { d: { stage: 'fit', output: 'ring', value: 'diameter', tolerance: '0.01 uas' } },
    },
  };
  const schema = recipeSchema(sampleKinds);
  const changed = (path: string, value: unknown) => {
    const copy = structuredClone(sample) as unknown as Record<string, unknown>;
    const keys = path.split('.');
    const parent = keys.slice(0, -1).reduce((at, key) => at[key] as Record<string, unknown>, copy);
    if (value === undefined) delete parent[keys[keys.length - 1]];
    else parent[keys[keys.length - 1]] = value;
    return copy;
  };

  test('admits a good recipe', () => expect(isValid(schema, sample)).toBe(true));

  test.each([
    ['recipe', 'Not A Name'],
    ['recipe', undefined],
    ['purposes', 'x'],
    ['stages', undefined],
    ['stages.sky.kind', 'obsreve'],
    ['stages.sky.parameters.stations.AA', {}],
    ['stages.sky.parameters.noise', { seed: -1 }],
    ['stages.sky.parameters.noise', { sead: 1 }],
    ['stages.fit.parameters', undefined],
    ['stages.fit.parameters.field', 160],
    ['stages.fit.parameters.field', '160uas'],
    ['stages.fit.parameters.components', 500],
    ['stages.fit.parameters.components', 'by-date'],
    ['stages.fit.parameters.terms', []],
    ['stages.fit.inputs', undefined],
    ['stages.fit.inputs.data', 'x.uvfits'],
    ['stages.fit.inputs.data', [{ file: 'x.uvfits' }]],
    ['stages.fit.inputs.data', { file: 'x.uvfits', kept: true }],
    ['publish.figures.ring', { stage: 'fit' }],
    ['publish.numbers.d.value', undefined],
    ['publish.numbers.d.tolerance', -1],
  ])('refuses %s = %j', (path, value) => expect(isValid(schema, changed(path, value))).toBe(false));

  test('says type, unit, default and its reason in the description', () => {
    const kinds = (schema.$defs as Record<string, { properties: { parameters: { properties: object } } }>)[
      'kind-fit'
    ];
    expect(kinds.properties.parameters.properties).toMatchObject({
      field: {
        description: 'Field of view. A quantity of angle in uas from 1 to 1000 uas.',
        examples: ['1 uas'],
      },
      components: {
        description:
          'Components. An integer from 1 to 400, or `by-data` or `all`. Default: Enough for these tests.',
        default: 20,
      },
    });
  });

  test('stands beside the recipes as the kinds make it (npm run schema)', () => {
    const written = readFileSync(`${recipesFolder}recipe.schema.json`, 'utf8');
    expect(written === formatRecipeSchema(stageKinds)).toBe(true);
  });
});

describe('recipes that come with the program', () => {
  test.each(shippedRecipes())('%s is valid, for the schema and for the program', (name) => {
    const path = recipesFolder + name;
    const text = readFileSync(path, 'utf8');
    const broken = 'recipe: a\nstages: {}';
    expect(() => readRecipe({ path, bytes: new TextEncoder().encode(broken), kinds: stageKinds })).toThrow(
      RecipeProblems,
    );
    readRecipe({ path, kinds: stageKinds });
    expect(isValid(recipeSchema(stageKinds), parse(text))).toBe(true);
  });
});

describe('the declarations of every kind', () => {
  const all = [...stageKinds, ...sampleKinds];

  test.each(all.map((kind) => [kind.kind, kind] as const))('%s: defaults and units hold', (_, kind) => {
    for (const declaration of nested(kind.parameters)) {
      if (declaration.type === 'quantity') expect(isUnit(declaration.unit), declaration.unit).toBe(true);
    }
    const spot = { source: sourceText('defaults', ''), offset: 0 };
    const problems = problemList();
    resolveFields(kind.parameters, undefined, '', spot, problems);
    expect(problems.sorted().filter(({ code }) => code !== 'missing-parameter')).toEqual([]);
  });

  test.each(all.map((kind) => [kind.kind, kind] as const))('%s: `needs` name optional inputs', (_, kind) => {
    for (const { needs = [] } of Object.values(kind.outputs)) {
      for (const input of needs) expect(kind.inputs[input]?.optional).toBe(true);
    }
  });
});

function nested(fields: Readonly<Record<string, ParameterDeclaration>>): ParameterDeclaration[] {
  return Object.values(fields).flatMap((declaration) => [declaration, ...nested(fieldsBelow(declaration))]);
}

function fieldsBelow(declaration: ParameterDeclaration): Readonly<Record<string, ParameterDeclaration>> {
  if (declaration.type === 'group') return declaration.fields;
  if (declaration.type === 'list' || declaration.type === 'map') return { of: declaration.of };
  return declaration.type === 'either' ? Object.fromEntries(declaration.of.entries()) : {};
}
