import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, expect, test } from 'vitest';
import { proofreadCommand } from '../../../runner/commands/proofread.ts';
import { sampleKinds } from '../recipe/sample-kinds.ts';

const cwd = mkdtempSync(join(tmpdir(), 'platebook-proofread-'));
afterAll(() => rmSync(cwd, { recursive: true }));

const GOOD = `recipe: sample
stages:
  sky: { kind: observe, inputs: { image: { file: truth.fits } } }
  fit:
    kind: fit
    inputs: { data: { stage: sky, output: data } }
    parameters: { field: 160 uas }
publish:
  figures: { ring-image: { stage: fit, output: picture } }
  numbers:
    diameter: { stage: fit, output: ring, value: diameter, tolerance: 0.01 uas, against: { stage: sky, output: truth, value: diameter } }
    width: { stage: fit, output: ring, value: width }
`;
writeFileSync(join(cwd, 'truth.fits'), '');
writeFileSync(join(cwd, 'good.yaml'), GOOD);
writeFileSync(join(cwd, 'bad.yaml'), GOOD.replace('160 uas', '160').replace('sample', 'Sample'));

async function proofread(path: string, further: object = {}) {
  const printed = { out: '', err: '' };
  const io = {
    out: (text: string) => {
      printed.out += text;
    },
    err: (text: string) => {
      printed.err += text;
    },
    ...{ cwd, env: {}, terminal: false, columns: 80, errorStream: process.stderr },
  };
  const options = { book: '/nowhere', json: false, quiet: false, kinds: sampleKinds, ...further };
  return { status: await proofreadCommand(path, options, io), ...printed };
}

test('says what a good recipe declares', async () => {
  expect(await proofread('good.yaml')).toEqual({
    status: 0,
    err: '',
    out: `sample: 2 stages, 1 figure, 2 numbers; nothing wrong.

  stage  sky  observe  from truth.fits
  stage  fit  fit      from sky
  figure  ring-image  fit picture
  number  diameter    fit ring diameter, tolerance 0.01 uas, against sky truth diameter
  number  width       fit ring width
`,
  });
});

test('prints every problem, and how many there are', async () => {
  expect(await proofread('bad.yaml')).toEqual({
    status: 2,
    err: '',
    out: `bad.yaml:1:9 bad-name recipe: expected at most 40 lower-case letters, digits and dashes, a letter first, got "Sample". Write \`sample\`.
    recipe: Sample
            ^

bad.yaml:7:26 bad-quantity stages.fit.parameters.field: expected a quantity of angle in uas from 1 to 1000 uas, got 160 (number). Write the unit: \`160 uas\`.
        parameters: { field: 160 }
                             ^

2 problems.
`,
  });
});

test('prints one document with --json', async () => {
  const good = await proofread('good.yaml', { json: true });
  expect(good.status).toBe(0);
  expect(JSON.parse(good.out)).toMatchObject({
    recipe: 'good.yaml',
    name: 'sample',
    stages: [
      { stage: 'sky', kind: 'observe' },
      { stage: 'fit', kind: 'fit' },
    ],
    problems: [],
  });
  const bad = await proofread('bad.yaml', { json: true });
  expect(bad.status).toBe(2);
  expect(JSON.parse(bad.out).problems).toMatchObject([
    { file: 'bad.yaml', line: 1, column: 9, code: 'bad-name', path: 'recipe', sourceLine: 'recipe: Sample' },
    { file: 'bad.yaml', line: 7, column: 26, code: 'bad-quantity', path: 'stages.fit.parameters.field' },
  ]);
});

test('says nothing about a good recipe with --quiet', async () => {
  expect(await proofread('good.yaml', { quiet: true })).toEqual({ status: 0, out: '', err: '' });
});

test('says that there is no recipe', async () => {
  expect(await proofread('none.yaml')).toEqual({
    status: 2,
    err: '',
    out:
      'none.yaml: no-recipe: expected a recipe at this path, got nothing that can be read (ENOENT). ' +
      'Give the path of a recipe.\n\n1 problem.\n',
  });
});
