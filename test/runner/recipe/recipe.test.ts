import { execFileSync } from 'node:child_process';
import { mkdirSync, mkdtempSync, realpathSync, rmSync, symlinkSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { basename, join } from 'node:path';
import fc from 'fast-check';
import { afterAll, describe, expect, test } from 'vitest';
import { type Recipe, RecipeProblems, readRecipe } from '../../../runner/recipe/recipe.ts';
import { sampleKinds } from './sample-kinds.ts';

const folder = realpathSync(mkdtempSync(join(tmpdir(), 'platebook-recipe-')));
afterAll(() => rmSync(folder, { recursive: true }));

function read(text: string, lets: string[] = [], roots: string[] = []): Recipe {
  const bytes = new TextEncoder().encode(text);
  return readRecipe({
    path: join(folder, 'a.yaml'),
    shown: 'a.yaml',
    bytes,
    kinds: sampleKinds,
    lets,
    roots,
  });
}

function problemsOf(text: string, lets: string[] = [], roots: string[] = []) {
  try {
    read(text, lets, roots);
  } catch (error) {
    if (error instanceof RecipeProblems) return error.problems;
    throw error;
  }
  return [];
}

const GOOD = `# invented
recipe: sample
purpose: >
  Two lines that
  become one.
stages:
  sky:
    kind: observe
    inputs: { image: { file: truth.fits, keep: true } }
    parameters:
      stations:
        BB: &station { sefd: 1 kJy }
        AA: { <<: *station, limit: 0.1 rad }
  fit:
    kind: fit
    inputs:
      data: { stage: sky, output: data }
      extra: { stage: other, output: report }
    parameters: &parameters
      field: 0.16 mas
      components: by-data
  other:
    kind: fit
    inputs:
      data: { stage: sky, output: data }
    parameters: *parameters
publish:
  figures:
    ring-image: { stage: fit, output: picture }
  numbers:
    ring-diameter:
      { stage: fit, output: ring, value: diameter, tolerance: 0.01 uas,
        against: { stage: sky, output: truth, value: diameter } }
    asymmetry: { stage: fit, output: ring, value: asymmetry, tolerance: 1e-3 }
`;

writeFileSync(join(folder, 'truth.fits'), '');

describe('readRecipe', () => {
  const recipe = read(GOOD);
  const stage = (name: string, from = recipe) => from.stages.find((candidate) => candidate.name === name);

  test('reads name, purpose, bytes and the order of the stages', () => {
    expect(recipe.name).toBe('sample');
    expect(recipe.purpose).toBe('Two lines that become one.');
    expect(new TextDecoder().decode(recipe.bytes)).toBe(GOOD);
    expect(recipe.stages.map(({ name, kind }) => [name, kind.kind])).toEqual([
      ['sky', 'observe'],
      ['fit', 'fit'],
      ['other', 'fit'],
    ]);
  });

  test('reads references to files and to stages', () => {
    const path = join(folder, 'truth.fits');
    expect(stage('sky')?.inputs).toEqual({ image: [{ file: 'truth.fits', path, keep: true }] });
    expect(stage('fit')?.inputs).toEqual({
      data: [{ stage: 'sky', output: 'data' }],
      extra: [{ stage: 'other', output: 'report' }],
    });
  });

  // 1 kJy = 1000 Jy; 0.1 rad = 18/pi deg = 5.729577951308232 deg (a calculator); 0.16 mas = 160 uas.
  test('resolves quantities, merges, aliases and defaults', () => {
    expect(stage('sky')?.parameters).toEqual({
      stations: { AA: { sefd: 1000, limit: 5.729577951308232 }, BB: { sefd: 1000, limit: 10 } },
      noise: { seed: 1, level: 0.25 },
      clock: { offset: 0 },
      polarised: false,
    });
    expect(stage('other')?.parameters).toEqual({
      field: 160,
      components: 'by-data',
      terms: ['visibilities'],
    });
    expect(stage('fit')?.parameters).toEqual(stage('other')?.parameters);
  });

  test('records every parameter, a quantity with its unit', () => {
    expect(stage('sky')?.recorded).toEqual({
      stations: {
        AA: { sefd: { value: 1000, unit: 'Jy' }, limit: { value: 5.729577951308232, unit: 'deg' } },
        BB: { sefd: { value: 1000, unit: 'Jy' }, limit: { value: 10, unit: 'deg' } },
      },
      noise: { seed: 1, level: 0.25 },
      clock: { offset: { value: 0, unit: 's' } },
      polarised: false,
    });
  });

  test('sorts the names of a map, so that their order in the recipe changes nothing', () => {
    expect(Object.keys(stage('sky')?.parameters.stations as object)).toEqual(['AA', 'BB']);
  });

  test('reads what is published', () => {
    expect(recipe.publish).toEqual({
      figures: [{ name: 'ring-image', stage: 'fit', output: 'picture' }],
      numbers: [
        {
          name: 'ring-diameter',
          stage: 'fit',
          output: 'ring',
          value: 'diameter',
          tolerance: { value: 0.01, unit: 'uas' },
          against: { stage: 'sky', output: 'truth', value: 'diameter' },
        },
        {
          name: 'asymmetry',
          stage: 'fit',
          output: 'ring',
          value: 'asymmetry',
          tolerance: { value: 0.001, unit: '' },
          against: null,
        },
      ],
    });
  });

  test('reads the same from a file, with a byte order mark, with CRLF', () => {
    const path = join(folder, 'a.yaml');
    for (const text of [GOOD, `\ufeff${GOOD}`, GOOD.replaceAll('\n', '\r\n')]) {
      writeFileSync(path, text);
      const { bytes, ...read } = readRecipe({ path, kinds: sampleKinds });
      expect({ ...read, bytes: null }).toEqual({ ...recipe, bytes: null });
      expect(new TextDecoder('utf-8', { ignoreBOM: true }).decode(bytes)).toBe(text);
    }
  });

  test('reads the same in whatever order the stages stand', () => {
    const parts = GOOD.slice(GOOD.indexOf('  sky:'), GOOD.indexOf('publish:'))
      .replaceAll(/&\w+ ?|<<: \*station, /g, '')
      .replace('AA: {', 'AA: { sefd: 1 kJy,')
      .replace('*parameters', '{ field: 160 uas, components: by-data }')
      .split(/^(?= {2}\w)/m);
    const [head, tail] = [GOOD.slice(0, GOOD.indexOf('  sky:')), GOOD.slice(GOOD.indexOf('publish:'))];
    const byName = (stages: Recipe['stages']) =>
      Object.fromEntries(stages.map((stage) => [stage.name, stage]));
    expect(parts).toHaveLength(3);
    fc.assert(
      fc.property(fc.shuffledSubarray(parts, { minLength: 3 }), (shuffled) => {
        const again = read(head + shuffled.join('') + tail);
        expect(byName(again.stages)).toEqual(byName(recipe.stages));
        expect(again.publish).toEqual(recipe.publish);
      }),
    );
  });

  test('throws nothing but RecipeProblems, whatever the text', () => {
    const piece = fc.constantFrom(
      ...[
        'recipe: a',
        'stages:',
        'publish:',
        '\n',
        '\n  ',
        '\n    ',
        'kind: fit',
        'kind: observe',
        'inputs: ',
      ],
      ...[
        'parameters: ',
        '{',
        '}',
        '[',
        ']',
        ': ',
        ', ',
        '&a ',
        '*a',
        '<<: ',
        '- ',
        '? ',
        '| ',
        '"',
        "'",
        '# ',
        '!!str ',
      ],
      ...[
        'stage: fit',
        'output: ring',
        'file: .',
        'fit:',
        'noise: ',
        'stations: ',
        'constructor: ',
        '1 uas',
        '.inf',
        '%',
      ],
    );
    const text = fc.oneof(
      fc.string({ unit: 'binary', maxLength: 200 }),
      fc.array(piece, { maxLength: 40 }).map((pieces) => pieces.join('')),
      fc
        .array(piece, { maxLength: 12 })
        .map((pieces) => `recipe: a\nstages:\n  fit:\n    kind: fit\n    ${pieces.join('')}`),
    );
    const lets = fc.array(
      fc.oneof(fc.string(), fc.constantFrom('fit.terms=[', 'fit.noise.x=1', 'a.__proto__.b=1')),
    );
    fc.assert(
      fc.property(text, lets, (text, lets) => void problemsOf(text, lets)),
      { numRuns: 400 },
    );
  });

  test('throws nothing but RecipeProblems, whatever the bytes', () => {
    fc.assert(
      fc.property(fc.uint8Array({ maxLength: 60 }), (bytes) => {
        try {
          readRecipe({ path: join(folder, 'a.yaml'), bytes, kinds: sampleKinds });
        } catch (error) {
          expect(error).toBeInstanceOf(RecipeProblems);
        }
      }),
    );
  });
});

describe('hostile recipes', () => {
  // Nine to the power of fifteen nodes, were they written out.
  const letters = 'abcdefghijklmnop'.split('');
  const nineTimes = (letter: string, i: number) =>
    `${letter}: &${letter} [${Array(9).fill(`*${letters[i]}`).join(', ')}]`;
  const bomb = ['a: &a [x]', ...letters.slice(1).map(nineTimes)];

  test.each([
    ['an alias bomb', bomb.join('\n'), 'too-many-nodes', 1000],
    ['a megabyte of brackets', '['.repeat(1_000_000), 'too-deep', 1000],
    ['a megabyte of dashes', '- '.repeat(500_000), 'too-deep', 1000],
    ['a megabyte of maps', '{a: '.repeat(250_000), 'too-deep', 1000],
    ['a megabyte of list items', '- a\n'.repeat(250_000), 'too-many-nodes', 10_000],
  ])('%s is refused soon', (_, text, code, milliseconds) => {
    // Time of the processor, so that neighbours on the machine do not count.
    const start = process.cpuUsage();
    expect(problemsOf(text).map((problem) => problem.code)).toEqual([code]);
    const { user, system } = process.cpuUsage(start);
    expect((user + system) / 1000).toBeLessThan(milliseconds);
  });

  test('a long list of problems is told in full, and shown in part', () => {
    const keys = Array.from({ length: 150 }, (_, i) => `x${i}: 1`);
    const text = `recipe: a\nstages: { sky: { kind: observe } }\n${keys.join('\n')}`;
    expect(problemsOf(text)).toHaveLength(150);
    expect(() => read(text)).toThrow(/… and 50 more\.$/);
  });

  test('names of object prototypes are names like others', () => {
    const text = `recipe: a\nstages:\n  constructor: { kind: toString, inputs: { valueOf: { stage: hasownproperty, output: x } } }`;
    expect(problemsOf(text).map(({ code }) => code)).toEqual(['unknown-kind', 'unknown-stage']);
    const inside =
      'recipe: a\nstages: { sky: { kind: observe, parameters: { toString: 1, noise: { valueOf: 2 } } } }';
    expect(problemsOf(inside).map(({ code }) => code)).toEqual(['unknown-parameter', 'unknown-parameter']);
  });
});

describe('files of a recipe', () => {
  const withFile = (file: string) =>
    `recipe: a\nstages: { sky: { kind: observe, inputs: { image: { file: ${JSON.stringify(file)} } } } }`;
  const elsewhere = realpathSync(mkdtempSync(join(tmpdir(), 'platebook-elsewhere-')));
  afterAll(() => rmSync(elsewhere, { recursive: true }));
  mkdirSync(join(folder, 'data'));
  writeFileSync(join(folder, 'data', 'inside.fits'), '');
  writeFileSync(join(elsewhere, 'outside.fits'), '');
  symlinkSync(join(elsewhere, 'outside.fits'), join(folder, 'data', 'climbs.fits'));
  symlinkSync('inside.fits', join(folder, 'data', 'stays.fits'));
  symlinkSync('round.fits', join(folder, 'data', 'round.fits'));
  execFileSync('mkfifo', [join(folder, 'data', 'pipe')]);

  const found = (file: string, roots: string[] = []) =>
    problemsOf(withFile(file), [], roots).map(({ code, found, advice }) => `${code}: ${found}. ${advice}`);

  const MOVE = 'Move the file below the directory of the recipe, or allow its directory with `--root`.';
  const PATH = 'Correct the path, which counts from the directory of the recipe.';
  test.each([
    ['data/insied.fits', 'no-file: "data/insied.fits": none at this path. Did you mean `inside.fits`?'],
    ['date/x.fits', `no-file: "date/x.fits": none at this path. ${PATH}`],
    ['data', 'not-a-file: "data": a directory. Name a regular file.'],
    ['.', 'not-a-file: ".": a directory. Name a regular file.'],
    ['data/pipe', 'not-a-file: "data/pipe": a pipe. Name a regular file.'],
    ['data/round.fits', 'not-a-file: "data/round.fits": links in a loop. Name a regular file.'],
    ['../x.fits', `outside-roots: "../x.fits": a path that leaves it. ${MOVE}`],
    ['/dev/zero', `outside-roots: "/dev/zero": a path that leaves it. ${MOVE}`],
    ['data/climbs.fits', `outside-roots: "data/climbs.fits": a link that leaves it. ${MOVE}`],
    ['a\u0000b', 'control-character: "a\\u0000b" (text). Delete the character.'],
    ['', 'wrong-type: "" (text). Write it as expected.'],
    [`${'x'.repeat(5000)}`, `no-file: "${'x'.repeat(60)}…": one that is too long. ${PATH}`],
  ])('%j is refused', (file, message) => expect(found(file)).toEqual([message]));

  test('a neighbour of the directory whose name begins like it is outside', () => {
    const file = `../${basename(folder)}-twin/x.fits`;
    expect(problemsOf(withFile(file)).map(({ code }) => code)).toEqual(['outside-roots']);
  });

  test('devices below an allowed root are refused', () => {
    expect(found('/dev/zero', ['/dev'])).toEqual(['not-a-file: "/dev/zero": a device. Name a regular file.']);
  });

  test('links that stay, and files below an allowed root, are accepted by their real path', () => {
    const pathOf = (file: string, roots: string[] = []) =>
      read(withFile(file), [], roots).stages[0].inputs.image[0];
    const inside = { path: join(folder, 'data', 'inside.fits'), keep: false };
    expect(pathOf('data/stays.fits')).toEqual({ file: 'data/stays.fits', ...inside });
    const outside = join(elsewhere, 'outside.fits');
    expect(pathOf(outside, [elsewhere])).toEqual({ file: outside, path: outside, keep: false });
    expect(pathOf('data/climbs.fits', [elsewhere])).toEqual({
      file: 'data/climbs.fits',
      path: outside,
      keep: false,
    });
  });

  test.each([
    ['missing.yaml', 'no-recipe: expected a recipe at this path, got nothing that can be read (ENOENT).'],
    ['data', 'no-recipe: expected a recipe at this path, got a directory.'],
    ['data/pipe', 'no-recipe: expected a recipe at this path, got a pipe.'],
  ])('the recipe %s itself is refused', (name, message) => {
    const request = { path: join(folder, name), shown: name, kinds: sampleKinds };
    expect(() => readRecipe(request)).toThrow(new RegExp(`^${name}: ${message.replace(/[().]/g, '\\$&')}`));
  });
});

describe('overrides', () => {
  const parametersOf = (name: string, lets: string[]) =>
    read(GOOD, lets).stages.find((stage) => stage.name === name)?.parameters as Record<string, unknown>;

  test('set a parameter, the last of several, and are kept as given', () => {
    expect(parametersOf('fit', ['fit.components=30', 'fit.components=40']).components).toBe(40);
    expect(parametersOf('other', ['fit.components=30']).components).toBe('by-data');
    expect(read(GOOD, ['fit.field= 1 mas', 'sky.noise.seed=3']).overrides).toEqual([
      { stage: 'fit', parameter: 'field', text: ' 1 mas' },
      { stage: 'sky', parameter: 'noise.seed', text: '3' },
    ]);
  });

  test('take lists and maps', () => {
    expect(parametersOf('fit', ['fit.terms=[closure-phases, visibilities]']).terms).toEqual([
      'closure-phases',
      'visibilities',
    ]);
    expect(parametersOf('sky', ['sky.noise={ seed: 4 }']).noise).toEqual({ seed: 4, level: 0.5 });
  });

  test('reach into a group and leave its default as it is otherwise', () => {
    expect(parametersOf('sky', ['sky.noise.seed=7']).noise).toEqual({ seed: 7, level: 0.25 });
    expect(parametersOf('sky', ['sky.clock.offset=1 min']).clock).toEqual({ offset: 60 });
    expect(parametersOf('sky', ['sky.stations.AA.sefd=2 Jy']).stations).toEqual({
      AA: { sefd: 2, limit: 5.729577951308232 },
      BB: { sefd: 1000, limit: 10 },
    });
  });
});
