/** Recipes that are wrong, and the whole text of what is said about each. The kinds are invented. */

import { describe, expect, test } from 'vitest';
import { RecipeProblems, readRecipe } from '../../../runner/recipe/recipe.ts';
import { sampleKinds } from './sample-kinds.ts';

function messageOf(recipe: string | Uint8Array, lets: string[] = []): string {
  const bytes = typeof recipe === 'string' ? new TextEncoder().encode(recipe) : recipe;
  try {
    readRecipe({ path: '/nowhere/bad.yaml', shown: 'bad.yaml', bytes, kinds: sampleKinds, lets });
  } catch (error) {
    if (error instanceof RecipeProblems) return error.message;
    throw error;
  }
  return 'nothing wrong';
}

const lines = (...text: string[]) => text.join('\n');

/** A recipe with a stage `fit` on data of a stage `sky`; lines for the parameters of `fit` and for the end. */
function recipe({ parameters = ['field: 160 uas'], end = [] }: Record<string, string[]>): string {
  return lines(
    'recipe: sample',
    'stages:',
    '  sky: { kind: observe }',
    '  fit:',
    '    kind: fit',
    '    inputs: { data: { stage: sky, output: data } }',
    '    parameters:',
    ...parameters.map((line) => `      ${line}`),
    ...end,
  );
}

test('finds nothing wrong with the recipe that these are variations of', () => {
  expect(messageOf(recipe({}))).toBe('nothing wrong');
});

const cases: Record<
  string,
  readonly (readonly [recipe: string | Uint8Array, message: string, lets?: string[]])[]
> = {
  'as a file': [
    [
      new Uint8Array([0x61, 0x3a, 0x20, 0x31, 0x0a, 0x62, 0xe4, 0x3a]),
      lines(
        'bad.yaml:2:2 not-text: expected UTF-8, got the byte 0xe4 at offset 6. Save the recipe as UTF-8.',
        '    b',
        '     ^',
      ),
    ],
    [
      new Uint8Array([0xff, 0xfe, 0x61, 0x00]),
      lines(
        'bad.yaml:1:1 not-text: expected UTF-8, got the byte 0xff at offset 0. Save the recipe as UTF-8.',
        '    ',
        '    ^',
      ),
    ],
    [
      'recipe: a\u0007b',
      lines(
        'bad.yaml:1:10 control-character: expected printable text, got the character U+0007. Delete the character.',
        '    recipe: a\ufffdb',
        '             ^',
      ),
    ],
    [
      ' '.repeat(1_000_001),
      'bad.yaml: too-large: expected at most 1000000 bytes, got 1000001. ' +
        'A recipe declares stages; data belong into files of their own.',
    ],
  ],
  'as YAML': [
    [
      'recipe: a\nstages: [',
      lines(
        'bad.yaml:2:10 syntax: expected well-formed YAML, got a fault: Flow sequence in block collection must be ' +
          'sufficiently indented and end with a ]. Mend the YAML here.',
        '    stages: [',
        '             ^',
      ),
    ],
    [
      'purpose: ring: a test',
      lines(
        'bad.yaml:1:10 syntax: expected well-formed YAML, got a second `:` in one line. ' +
          'Put text that holds `: ` into quotes.',
        '    purpose: ring: a test',
        '             ^',
      ),
    ],
    [
      'stages:\n\tsky: 1',
      lines(
        'bad.yaml:2:1 syntax: expected well-formed YAML, got a tab. Indent with spaces.',
        '    \tsky: 1',
        '    ^',
      ),
    ],
    [
      'recipe: a\n---\nrecipe: b',
      lines(
        'bad.yaml:2:1 several-documents: expected one YAML document, got the start of a second. ' +
          'Put each recipe into a file of its own.',
        '    ---',
        '    ^',
      ),
    ],
    [
      'recipe: !python/object a',
      lines(
        'bad.yaml:1:9 tag: expected a value without a tag, got a tag. Delete the tag; recipes know only text, ' +
          'numbers, true, false, lists and maps.',
        '    recipe: !python/object a',
        '            ^',
      ),
    ],
    [
      'recipe: &a [*a]',
      lines(
        'bad.yaml:1:13 alias-loop: expected an alias of something else, got `*a` inside `&a`. ' +
          'Write out what the alias stands for.',
        '    recipe: &a [*a]',
        '                ^',
      ),
    ],
    [
      'recipe: *a',
      lines(
        'bad.yaml:1:9 unknown-alias: expected an anchor `&a` before this alias, got none. ' +
          'Set the anchor before its alias.',
        '    recipe: *a',
        '            ^',
      ),
    ],
    [
      recipe({ end: ['recipe: again'] }),
      lines(
        'bad.yaml:9:1 doubled-key recipe: expected each key once, got it here and in line 1. Keep one of the two.',
        '    recipe: again',
        '    ^',
      ),
    ],
    [
      recipe({ end: ['__proto__: 1', '? [a]', ': b'] }),
      lines(
        'bad.yaml:9:1 bad-key: expected a name of 1 to 200 printable characters before the colon, ' +
          'got "__proto__". Write a plain name.',
        '    __proto__: 1',
        '    ^',
        '',
        'bad.yaml:10:3 bad-key: expected a name of 1 to 200 printable characters before the colon, ' +
          'got none. Write a plain name.',
        '    ? [a]',
        '      ^',
      ),
    ],
    [
      recipe({ parameters: ['field: 160 uas', '<<: 3'] }),
      lines(
        'bad.yaml:9:11 wrong-type <<: expected a map, or a list of maps, after `<<`, got 3 (number). ' +
          'Write it as expected.',
        '          <<: 3',
        '              ^',
      ),
    ],
  ],
  'in its keys and names': [
    [
      '',
      lines(
        'bad.yaml:1:1 wrong-type: expected a map with `recipe`, `stages`, `purpose` and `publish`, got nothing. ' +
          'Write it as expected.',
        '    ',
        '    ^',
      ),
    ],
    [
      'recipe: a',
      lines(
        'bad.yaml:1:1 missing-key stages: expected `stages`, got nothing. Add `stages`.',
        '    recipe: a',
        '    ^',
      ),
    ],
    [
      recipe({ end: ['publsh: {}'] }),
      lines(
        'bad.yaml:9:1 unknown-key publsh: expected `recipe`, `stages`, `purpose` or `publish`, got "publsh". ' +
          'Did you mean `publish`?',
        '    publsh: {}',
        '    ^',
      ),
    ],
    [
      'recipe: "Lantern\\u001b[31m"\nstages: { Sky: { kind: observe } }',
      lines(
        'bad.yaml:1:9 control-character recipe: expected printable text, got "Lantern\\u001b[31m" (text). ' +
          'Delete the character.',
        '    recipe: "Lantern\\u001b[31m"',
        '            ^',
        '',
        'bad.yaml:2:11 bad-name stages.Sky: expected at most 40 lower-case letters, digits and dashes, ' +
          'a letter first, got "Sky". Write `sky`.',
        '    stages: { Sky: { kind: observe } }',
        '              ^',
      ),
    ],
    [
      'recipe: a\nstages: {}',
      lines(
        'bad.yaml:2:1 out-of-range stages: expected 1 to 1000 stages, got 0. Write a value inside the range.',
        '    stages: {}',
        '    ^',
      ),
    ],
    [
      'recipe: a\nstages: { sky: { kind: obsreve } }',
      lines(
        'bad.yaml:2:24 unknown-kind stages.sky.kind: expected `observe` or `fit`, got "obsreve". ' +
          'Did you mean `observe`?',
        '    stages: { sky: { kind: obsreve } }',
        '                           ^',
      ),
    ],
  ],
  'in its parameters': [
    [
      recipe({ parameters: ['{}'] }),
      lines(
        'bad.yaml:7:5 missing-parameter stages.fit.parameters.field: ' +
          'expected a quantity of angle in uas from 1 to 1000 uas, got nothing. Add `field`.',
        '        parameters:',
        '        ^',
      ),
    ],
    [
      recipe({ parameters: ['field: 160 uas', 'componets: 3'] }),
      lines(
        'bad.yaml:9:7 unknown-parameter stages.fit.parameters.componets: ' +
          'expected `field`, `components` or `terms`, got "componets". Did you mean `components`?',
        '          componets: 3',
        '          ^',
      ),
    ],
    [
      recipe({ parameters: ['field: 10 min'] }),
      lines(
        'bad.yaml:8:14 wrong-dimension stages.fit.parameters.field: ' +
          'expected a quantity of angle in uas from 1 to 1000 uas, got "10 min" (time). ' +
          'Write the quantity in a unit of the right dimension.',
        '          field: 10 min',
        '                 ^',
      ),
    ],
    [
      recipe({ parameters: ['field: 160'] }),
      lines(
        'bad.yaml:8:14 bad-quantity stages.fit.parameters.field: ' +
          'expected a quantity of angle in uas from 1 to 1000 uas, got 160 (number). Write the unit: `160 uas`.',
        '          field: 160',
        '                 ^',
      ),
    ],
    [
      recipe({ parameters: ['field: 160 μas'] }),
      lines(
        'bad.yaml:8:14 bad-unit stages.fit.parameters.field: ' +
          'expected a quantity of angle in uas from 1 to 1000 uas, got "160 μas": `μas`. Did you mean `uas`?',
        '          field: 160 μas',
        '                 ^',
      ),
    ],
    [
      recipe({ parameters: ['field: 2 mas', 'components: 0x1000'] }),
      lines(
        'bad.yaml:8:14 out-of-range stages.fit.parameters.field: ' +
          'expected a quantity of angle in uas from 1 to 1000 uas, got "2 mas" (text). ' +
          'Write a value inside the range.',
        '          field: 2 mas',
        '                 ^',
        '',
        'bad.yaml:9:19 out-of-range stages.fit.parameters.components: ' +
          'expected an integer from 1 to 400, or `by-data` or `all`, got 0x1000 (number). ' +
          'Write a value inside the range.',
        '          components: 0x1000',
        '                      ^',
      ),
    ],
    [
      recipe({ parameters: ['field: 160 uas', 'components: by-date', 'terms: visibilities'] }),
      lines(
        'bad.yaml:9:19 unknown-word stages.fit.parameters.components: ' +
          'expected an integer from 1 to 400, or `by-data` or `all`, got "by-date" (text). ' +
          'Did you mean `by-data`?',
        '          components: by-date',
        '                      ^',
        '',
        'bad.yaml:10:14 wrong-type stages.fit.parameters.terms: ' +
          'expected a list of at least 1, each `visibilities` or `closure-phases`, got "visibilities" (text). ' +
          'Write a list: `[first, second]`.',
        '          terms: visibilities',
        '                 ^',
      ),
    ],
    [
      lines(
        'recipe: a',
        'stages:',
        '  sky:',
        '    kind: observe',
        '    parameters:',
        '      noise: { level: .nan, seed: "7" }',
        '      stations: { AA: { sefd: -1 Jy, limit: .nan } }',
        '      polarised: no',
        '      title: 7',
      ),
      lines(
        'bad.yaml:6:23 out-of-range stages.sky.parameters.noise.level: expected a number from 0 to 1, ' +
          'got .nan (number). Write a value inside the range.',
        '          noise: { level: .nan, seed: "7" }',
        '                          ^',
        '',
        'bad.yaml:6:35 wrong-type stages.sky.parameters.noise.seed: expected an integer of at least 0, ' +
          'got "7" (text). Remove the quotes.',
        '          noise: { level: .nan, seed: "7" }',
        '                                      ^',
        '',
        'bad.yaml:7:31 out-of-range stages.sky.parameters.stations.AA.sefd: ' +
          'expected a quantity of flux density in Jy of at least 0 Jy, got "-1 Jy" (text). ' +
          'Write a value inside the range.',
        '          stations: { AA: { sefd: -1 Jy, limit: .nan } }',
        '                                  ^',
        '',
        'bad.yaml:7:45 out-of-range stages.sky.parameters.stations.AA.limit: ' +
          'expected a quantity of angle in deg from 0 to 90 deg, got .nan (number). ' +
          'Write a value inside the range.',
        '          stations: { AA: { sefd: -1 Jy, limit: .nan } }',
        '                                                ^',
        '',
        'bad.yaml:8:18 wrong-type stages.sky.parameters.polarised: expected true or false, got "no" (text). ' +
          'Write it as expected.',
        '          polarised: no',
        '                     ^',
        '',
        'bad.yaml:9:14 wrong-type stages.sky.parameters.title: expected text that matches ^[A-Z], ' +
          'got 7 (number). Put it into quotes: `"7"`.',
        '          title: 7',
        '                 ^',
      ),
    ],
    [
      'recipe: a\nstages: { sky: { kind: observe, parameters: { noise: { seed: 9007199254740993 } } } }',
      lines(
        'bad.yaml:2:62 out-of-range stages.sky.parameters.noise.seed: expected an integer of at least 0, ' +
          'got 9007199254740993 (number). Stay below 2 to the power of 53.',
        '    stages: { sky: { kind: observe, parameters: { noise: { seed: 9007199254740993 } } } }',
        '                                                                 ^',
      ),
    ],
  ],
  'in its references': [
    [
      'recipe: a\nstages:\n  fit: { kind: fit, parameters: { field: 1 uas } }',
      lines(
        'bad.yaml:3:3 missing-input stages.fit.inputs.data: expected a reference (uv-fits or oifits), ' +
          'got nothing. Add `data`: Data.',
        '      fit: { kind: fit, parameters: { field: 1 uas } }',
        '      ^',
      ),
    ],
    [
      recipe({}).replace('data: {', 'date: {'),
      lines(
        'bad.yaml:6:5 missing-input stages.fit.inputs.data: expected a reference (uv-fits or oifits), ' +
          'got nothing. Add `data`: Data.',
        '        inputs: { date: { stage: sky, output: data } }',
        '        ^',
        '',
        'bad.yaml:6:15 unknown-input stages.fit.inputs.date: expected `data` or `extra`, got "date". ' +
          'Did you mean `data`?',
        '        inputs: { date: { stage: sky, output: data } }',
        '                  ^',
      ),
    ],
    [
      recipe({}).replace('stage: sky', 'stage: sly'),
      lines(
        'bad.yaml:6:30 unknown-stage stages.fit.inputs.data.stage: expected a stage of this recipe, got "sly". ' +
          'Did you mean `sky`?',
        '        inputs: { data: { stage: sly, output: data } }',
        '                                 ^',
      ),
    ],
    [
      recipe({}).replace('output: data', 'output: dta'),
      lines(
        'bad.yaml:6:43 unknown-output stages.fit.inputs.data.output: expected an output of `observe`: ' +
          '`data` or `truth`, got "dta". Did you mean `data`?',
        '        inputs: { data: { stage: sky, output: dta } }',
        '                                              ^',
      ),
    ],
    [
      recipe({}).replace('{ stage: sky, output: data }', '{ stage: fit, output: picture, keep: 1 }'),
      lines(
        'bad.yaml:6:30 loop stages.fit: expected stages that need only what other stages can make before, ' +
          'got `fit needs fit`. Cut the loop: a stage cannot need its own outputs.',
        '        inputs: { data: { stage: fit, output: picture, keep: 1 } }',
        '                                 ^',
        '',
        'bad.yaml:6:43 wrong-format stages.fit.inputs.data.output: expected an output that is uv-fits or oifits, ' +
          'got "picture", which is svg. Refer to an output of the right format.',
        '        inputs: { data: { stage: fit, output: picture, keep: 1 } }',
        '                                              ^',
        '',
        'bad.yaml:6:52 unknown-key stages.fit.inputs.data.keep: expected `stage` or `output`, got "keep". ' +
          'Delete it, or correct its name.',
        '        inputs: { data: { stage: fit, output: picture, keep: 1 } }',
        '                                                       ^',
      ),
    ],
    [
      recipe({}).replace('data: {', 'extra: [], data: {'),
      lines(
        'bad.yaml:6:22 wrong-type stages.fit.inputs.extra: expected at least one reference, got a list of 0. ' +
          'Write it as expected.',
        '        inputs: { extra: [], data: { stage: sky, output: data } }',
        '                         ^',
      ),
    ],
    [
      recipe({}).replace('{ stage: sky, output: data }', 'data.uvfits'),
      lines(
        'bad.yaml:6:21 wrong-type stages.fit.inputs.data: ' +
          'expected `{ file: PATH }` or `{ stage: NAME, output: NAME }`, got "data.uvfits" (text). ' +
          'Write it as expected.',
        '        inputs: { data: data.uvfits }',
        '                        ^',
      ),
    ],
    [
      lines(
        'recipe: a',
        'stages:',
        '  sky: { kind: observe }',
        '  fit: &fit { kind: fit, parameters: { field: 1 uas }, inputs: { data: &data { stage: sky, output: data } } }',
        '  b:',
        '    <<: *fit',
        '    inputs: { data: *data, extra: { stage: c, output: report } }',
        '  a:',
        '    <<: *fit',
        '    inputs: { data: *data, extra: { stage: b, output: report } }',
        '  c:',
        '    <<: *fit',
        '    inputs: { data: *data, extra: [{ stage: fit, output: report }, { stage: a, output: report }] }',
      ),
      lines(
        'bad.yaml:7:44 loop stages.b: expected stages that need only what other stages can make before, ' +
          'got `b needs c needs a needs b`. Cut the loop: a stage cannot need its own outputs.',
        '        inputs: { data: *data, extra: { stage: c, output: report } }',
        '                                               ^',
      ),
    ],
  ],
  'in loops that other stages lead to': [
    [
      lines(
        'recipe: a',
        'stages:',
        '  sky: { kind: observe }',
        '  first: &fit',
        '    kind: fit',
        '    parameters: { field: 1 uas }',
        '    inputs: { data: &data { stage: sky, output: data }, extra: { stage: second, output: report } }',
        '  second:',
        '    <<: *fit',
        '    inputs: { data: *data, extra: { stage: third, output: report } }',
        '  third:',
        '    <<: *fit',
        '    inputs: { data: *data, extra: { stage: second, output: report } }',
      ),
      lines(
        'bad.yaml:10:44 loop stages.second: expected stages that need only what other stages can make before, ' +
          'got `second needs third needs second`. Cut the loop: a stage cannot need its own outputs.',
        '        inputs: { data: *data, extra: { stage: third, output: report } }',
        '                                               ^',
      ),
    ],
  ],
  'in what it publishes': [
    [
      recipe({
        end: [
          'publish:',
          '  figures:',
          '    ring: { stage: fit, output: ring }',
          '  numbers:',
          '    diameter: { stage: sky, output: truth, value: diameter, tolerance: 0.01 furlong }',
          '    width: { stage: fit, output: picture }',
          '    flux: { stage: fit, output: ring, value: flux, tolerance: -1, against: { stage: sky } }',
        ],
      }),
      lines(
        'bad.yaml:11:33 wrong-format publish.figures.ring.output: expected an output that is svg, ' +
          'got "ring", which is numbers. Refer to an output of the right format.',
        '        ring: { stage: fit, output: ring }',
        '                                    ^',
        '',
        'bad.yaml:13:37 output-not-made publish.numbers.diameter.output: expected an output that stage `sky` makes, ' +
          'got "truth", which needs the input `image`. ' +
          'Give the stage that input, or refer to another output.',
        '        diameter: { stage: sky, output: truth, value: diameter, tolerance: 0.01 furlong }',
        '                                        ^',
        '',
        'bad.yaml:13:72 bad-unit publish.numbers.diameter.tolerance: expected a number and a unit, ' +
          'such as `0.01 uas`, got "0.01 furlong" (text): the unknown unit `furlong`. ' +
          'Write `.` for a product, one `/`, `**` for a power; letters count as they stand.',
        '        diameter: { stage: sky, output: truth, value: diameter, tolerance: 0.01 furlong }',
        '                                                                           ^',
        '',
        'bad.yaml:14:5 missing-key publish.numbers.width.value: expected `value`, got nothing. Add `value`.',
        '        width: { stage: fit, output: picture }',
        '        ^',
        '',
        'bad.yaml:14:34 wrong-format publish.numbers.width.output: expected an output that is numbers, ' +
          'got "picture", which is svg. Refer to an output of the right format.',
        '        width: { stage: fit, output: picture }',
        '                                     ^',
        '',
        'bad.yaml:15:63 out-of-range publish.numbers.flux.tolerance: expected a tolerance of at least 0, ' +
          'got -1 (number). Write a value inside the range.',
        '        flux: { stage: fit, output: ring, value: flux, tolerance: -1, against: { stage: sky } }',
        '                                                                  ^',
        '',
        'bad.yaml:15:67 missing-key publish.numbers.flux.against.output: expected `output`, got nothing. ' +
          'Add `output`.',
        '        flux: { stage: fit, output: ring, value: flux, tolerance: -1, against: { stage: sky } }',
        '                                                                      ^',
        '',
        'bad.yaml:15:67 missing-key publish.numbers.flux.against.value: expected `value`, got nothing. ' +
          'Add `value`.',
        '        flux: { stage: fit, output: ring, value: flux, tolerance: -1, against: { stage: sky } }',
        '                                                                      ^',
      ),
    ],
  ],
  'in its overrides': [
    [
      recipe({}),
      lines(
        '--let fit.components=abc: unknown-word stages.fit.parameters.components: ' +
          'expected an integer from 1 to 400, or `by-data` or `all`, got "abc" (text). Write one of the words.',
      ),
      ['fit.components=abc'],
    ],
    [
      recipe({ end: ['publsh: {}'] }),
      lines(
        'bad.yaml:9:1 unknown-key publsh: expected `recipe`, `stages`, `purpose` or `publish`, got "publsh". ' +
          'Did you mean `publish`?',
        '    publsh: {}',
        '    ^',
        '',
        '--let nonsense: bad-override: expected `STAGE.PARAMETER=VALUE`, got "nonsense". ' +
          'Write `--let STAGE.PARAMETER=VALUE`.',
        '',
        '--let sly.noise.seed=1: unknown-stage stages.sly: expected a stage of this recipe, got "sly". ' +
          'Did you mean `sky`?',
        '',
        '--let sky.noise.sead=1: unknown-parameter stages.sky.parameters.noise.sead: ' +
          'expected `seed` or `level`, got "sead". Did you mean `seed`?',
        '',
        '--let fit.field.x=1: wrong-type stages.fit.parameters.field: expected a map to set `x` in, ' +
          'got "160 uas" (text). Write it as expected.',
        '',
        '--let fit.terms=[: syntax: expected well-formed YAML, got a fault: ' +
          'Flow sequence must end with a ]. Mend the YAML here.',
      ),
      ['nonsense', 'sly.noise.seed=1', 'sky.noise.sead=1', 'fit.field.x=1', 'fit.terms=['],
    ],
    [
      recipe({}),
      lines(
        '--let fit.field=: wrong-type stages.fit.parameters.field: ' +
          'expected a quantity of angle in uas from 1 to 1000 uas, got nothing. Write it as expected.',
      ),
      ['fit.field='],
    ],
  ],
};

describe.each(Object.entries(cases))('a recipe that is wrong %s', (_, list) => {
  const titled = list.map(([recipe, message, lets]) => ({
    title: message.slice(0, 70),
    recipe,
    message,
    lets,
  }));
  test.each(titled)('is refused with $title…', ({ recipe, message, lets }) => {
    expect(messageOf(recipe, lets)).toBe(message);
  });
});
