import { expect, test } from 'vitest';
import { kindsCommand } from '../../../runner/commands/kinds.ts';
import { RunnerProblem } from '../../../runner/problem.ts';
import { stageKinds } from '../../../stages/kinds.ts';
import { sampleKinds } from '../recipe/sample-kinds.ts';

async function printed(name: string | undefined, further: object = {}): Promise<string> {
  let out = '';
  const io = {
    out: (text: string) => {
      out += text;
    },
    err: () => {},
    ...{ cwd: '/', env: {}, terminal: false, columns: 80, errorStream: process.stderr },
  };
  const options = { book: '/nowhere', json: false, quiet: false, kinds: sampleKinds, ...further };
  expect(await kindsCommand(name, options, io)).toBe(0);
  return out;
}

test('lists the kinds, one line each', async () => {
  expect(await printed(undefined)).toBe('observe  Makes data.\nfit      Fits.\n');
});

test('tells one kind in full', async () => {
  expect(await printed('fit')).toBe(`fit, version 1
  Fits.

  Source: Nowhere.

Inputs
  data: uv-fits or oifits
      Data.
  extra: json; one or several; may be left out
      Remarks.

Parameters
  field: a quantity of angle in uas from 1 to 1000 uas; required
      Field of view.
  components: an integer from 1 to 400, or \`by-data\` or \`all\`; default 20
      Components.
      Default: Enough for these tests.
  terms: a list of at least 1, each \`visibilities\` or \`closure-phases\`; default [visibilities]
      Data terms.

Outputs
  ring: numbers
      The ring.
  picture: svg
      A picture.
  report: json
      What was done.
`);
});

test('tells fields of groups and maps further in, and what outputs need', async () => {
  const text = await printed('observe');
  expect(text).toContain(`  stations: a map from names, each a map with the fields below; default {}
      Stations by name.
      sefd: a quantity of flux density in Jy of at least 0 Jy; required
          Sensitivity.
      limit: a quantity of angle in deg from 0 to 90 deg; default 10 deg
          Lowest elevation.
  noise: a map with the fields below; default { level: 0.25 }
`);
  expect(text).toContain(`  clock: a map with the fields below; default: its fields' defaults
`);
  expect(text).toContain('  truth: numbers; made when `image` is given\n');
});

test('stays within 100 columns for every kind of the program', async () => {
  for (const name of [undefined, ...stageKinds.map(({ kind }) => kind)]) {
    const lines = (await printed(name, { kinds: stageKinds })).split('\n');
    expect(lines.filter((line) => line.length > 100)).toEqual([]);
  }
});

test('prints the declarations with --json', async () => {
  const all = JSON.parse(await printed(undefined, { json: true }));
  expect(all.kinds.map(({ kind }: { kind: string }) => kind)).toEqual(['observe', 'fit']);
  const { load, ...declared } = sampleKinds[1];
  expect(JSON.parse(await printed('fit', { json: true }))).toEqual(declared);
  expect(load).toBeTypeOf('function');
});

test('refuses an unknown kind', async () => {
  await expect(printed('observ')).rejects.toThrow(
    new RunnerProblem(
      'unknown-kind',
      'kinds: unknown-kind: expected `observe` or `fit`, got "observ". Did you mean `observe`?',
    ),
  );
});
