/** Which outputs a stage makes: those whose inputs are given and that its parameters choose. */

import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { expect, test } from 'vitest';
import { madeOutputs } from '../../runner/job.ts';
import { readRecipe } from '../../runner/recipe/recipe.ts';
import { figure } from '../../stages/figure/figure.ts';
import { stageKinds } from '../../stages/kinds.ts';
import { temporaryFolder } from './test-jobs.ts';

const given = { basis: [], samples: [], image: [] };

test('are all that the inputs allow, or those of them that are chosen', () => {
  expect(madeOutputs(figure, given, {})).toEqual(['image', 'profile', 'components', 'scree', 'posterior']);
  expect(madeOutputs(figure, given, { figures: ['profile', 'image'] })).toEqual(['image', 'profile']);
  // What the inputs do not allow is not made for having been chosen.
  expect(madeOutputs(figure, given, { figures: ['coverage', 'scree'] })).toEqual(['scree']);
});

test('are refused in a recipe where they are left out', () => {
  const own = readFileSync(new URL('../../recipes/lantern/lantern.yaml', import.meta.url), 'utf8');
  const path = join(temporaryFolder(), 'lantern.yaml');
  writeFileSync(path, own.replace('figures: [image, profile, posterior]', 'figures: [image, profile]'));
  expect(() => readRecipe({ path, shown: 'lantern.yaml', kinds: stageKinds })).toThrow(
    'expected an output that stage `pictures` makes, got "posterior", which its parameter `figures` leaves out. ' +
      'Name it in that parameter, or refer to another output.',
  );
});
