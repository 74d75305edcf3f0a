import { copyFileSync, cpSync, existsSync, readFileSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { beforeAll, describe, expect, it } from 'vitest';
import { openBook } from '../../../ledger/book.ts';
import { readPngText } from '../../../runner/plates/png-text.ts';
import { stageKinds } from '../../../stages/kinds.ts';
import { document, platebook } from '../test-io.ts';
import { temporaryFolder } from '../test-jobs.ts';

const root = dirname(dirname(dirname(dirname(fileURLToPath(import.meta.url)))));
const recipe = join(root, 'recipes', 'lantern', 'small.yaml');
const stageNames = [
  'observation',
  'visibilities',
  'calibration',
  'library',
  'basis',
  'fit',
  'injections',
  'features',
  'pictures',
];

interface StageDocument {
  readonly kind: string;
  readonly stage: string;
  readonly state: string;
  readonly entry: number;
  readonly outputs: Readonly<Record<string, { readonly digest: string; readonly path: string }>>;
}

describe('run, trace, diff, rerun and audit on the small recipe', () => {
  const folder = temporaryFolder();
  let first: {
    run: number;
    finished: boolean;
    stages: StageDocument[];
    plates: { name: string; plate: string; path: string; files: { format: string; path: string }[] }[];
    numbers: { name: string; value: number; low: number; high: number; unit: string; entry: number }[];
  };
  const digests = (stages: readonly StageDocument[]) =>
    stages.map(({ stage, outputs }) => [stage, Object.values(outputs).map(({ digest }) => digest)]);

  beforeAll(async () => {
    first = await document(folder, ['run', recipe]);
  });

  it('computes every stage and prints the document of the design', () => {
    expect(first).toMatchObject({ run: 1, recipe: 'lantern-small', finished: true });
    expect(first.stages.map(({ stage, state }) => [stage, state])).toEqual(
      stageNames.map((name) => [name, 'computed']),
    );
    for (const { outputs } of first.stages) {
      for (const { path } of Object.values(outputs)) expect(existsSync(path)).toBe(true);
    }
    const diameter = first.numbers.find(({ name }) => name === 'ring-diameter');
    expect(diameter?.unit).toBe('uas');
    expect(diameter?.low).toBeLessThan(diameter?.value ?? 0);
    expect(diameter?.high).toBeGreaterThan(diameter?.value ?? 0);
  });

  it('writes only numbers that the kinds declare', () => {
    const declared = new Map(stageKinds.map((kind) => [kind.kind, kind.outputs]));
    const written = first.stages.flatMap(({ kind, outputs }) =>
      Object.entries(outputs)
        .filter(([name]) => declared.get(kind)?.[name]?.format === 'numbers')
        .map(([name, { path }]) => ({
          numbers: Object.keys(JSON.parse(readFileSync(path, 'utf8')).values),
          declared: declared.get(kind)?.[name]?.numbers,
        })),
    );
    expect(written).toHaveLength(3);
    for (const { numbers, declared } of written) expect(declared).toEqual(expect.arrayContaining(numbers));
  });

  it('carries everything forward the second time, and the plates keep their numbers and bytes', async () => {
    const before = first.plates.map(({ path }) => readFileSync(path));
    const second = await document(folder, ['run', recipe]);
    expect(second.stages.every(({ state }: StageDocument) => state === 'carried forward')).toBe(true);
    expect(second.plates.map(({ plate }: { plate: string }) => plate)).toEqual(
      first.plates.map(({ plate }) => plate),
    );
    expect(first.plates.map(({ path }) => readFileSync(path))).toEqual(before);
  });

  it('marks numbers on which something was withdrawn while the run went on', async () => {
    const copy = temporaryFolder();
    cpSync(join(folder, 'book'), join(copy, 'book'), { recursive: true });
    const features = first.stages.find(({ stage }) => stage === 'features')?.entry ?? 0;
    let withdrawal = 0;
    const { out } = await platebook(copy, ['run', recipe], (text) => {
      if (!text.startsWith('  features ')) return;
      const book = openBook(join(copy, 'book'), { by: { name: 'B. Reader' } });
      withdrawal = book.append({ type: 'withdrawal', withdraws: features, reason: 'wrong radius' }).entry
        .number;
      book.close();
    });
    expect(out).toMatch(/^ {2}ring-diameter +†\d/m);
    const note = `† depends on something withdrawn: does not stand any more (entry ${withdrawal})`;
    expect(out).toContain(`\n\n  ${note}\n`);
    const of = new Map(first.numbers.map(({ name, entry }) => [name, entry]));
    for (const line of out.split('\n').filter((each) => of.has(each.trim().split(/ +/)[0] ?? ''))) {
      expect(line.includes('†'), line).toBe(of.get(line.trim().split(/ +/)[0] ?? '') === features);
    }
  });

  it('gives the same bytes afresh, on one core, in another time zone and locale', async () => {
    const zone = process.env.TZ;
    process.env.TZ = 'Pacific/Auckland';
    try {
      const afresh = await document(folder, ['run', recipe, '--afresh', '--cores', '1']);
      expect(afresh.stages.every(({ state }: StageDocument) => state === 'computed')).toBe(true);
      expect(digests(afresh.stages)).toEqual(digests(first.stages));
    } finally {
      if (zone === undefined) delete process.env.TZ;
      else process.env.TZ = zone;
    }
  });

  it('traces a plate back to the observation, a published number, and a picture saved again', async () => {
    const png = first.plates[0]?.path ?? '';
    const { lineage } = await document(folder, ['trace', png]);
    const names = lineage.filter(({ type }: { type: string }) => type === 'stage');
    expect(names.map(({ name }: { name: string }) => name).sort()).toEqual([...stageNames].sort());
    const seed = names.find(({ name }: { name: string }) => name === 'observation').parameters.seed;
    expect(seed).toBe(7);
    const saved = join(folder, 'saved-again.png');
    writeFileSync(saved, Buffer.concat([readFileSync(png), Buffer.from([0])]));
    const again = await document(folder, ['trace', saved]);
    expect(again.lineage.map(({ number }: { number: number }) => number)).toEqual(
      expect.arrayContaining(names.map(({ number }: { number: number }) => number)),
    );
    const { plates } = await document(folder, ['run', recipe]);
    expect(readPngText(readFileSync(png)).Plate).toBe(plates[0].plate);
    expect((await platebook(folder, ['trace', 'ring-diameter'])).out).toContain('ring-diameter');
  });

  it('shows one changed parameter, nothing else under parameters, and the shift of each number', async () => {
    const changed = await document(folder, ['run', recipe, '--let', 'fit.components=11']);
    const diff = await document(folder, ['diff', '1', String(changed.run)]);
    expect(diff.parameters).toEqual([{ stage: 'fit', parameter: 'components', values: [14, 11] }]);
    expect(diff.inputs.filter(({ derived }: { derived: boolean }) => !derived)).toEqual([]);
    expect(diff.code).toEqual([]);
    expect(diff.numbers.map(({ name }: { name: string }) => name)).toEqual(
      first.numbers.map(({ name }) => name),
    );
    for (const { values, shift } of diff.numbers) expect(shift).toBeCloseTo(values[1] - values[0], 9);
    expect(changed.stages.filter(({ state }: StageDocument) => state === 'carried forward')).toHaveLength(5);
  });

  it('reruns the first run and finds it identical', async () => {
    const { status, out } = await platebook(folder, ['rerun', 'run', '1', '--json']);
    const verdict = JSON.parse(out);
    expect(verdict.verdict).toBe('identical');
    expect(verdict.outputs.length).toBe(
      Object.values(first.stages).flatMap((s) => Object.keys(s.outputs)).length,
    );
    expect(status).toBe(0);
  });

  it('lays numbers beside the plates, each with its entry', () => {
    const beside = dirname(first.plates[0]?.path ?? '');
    const numbers = JSON.parse(readFileSync(join(beside, 'numbers.json'), 'utf8'));
    expect(numbers.numbers.map(({ name }: { name: string }) => name)).toContain('ring-diameter');
    const tex = readFileSync(join(beside, 'numbers.tex'), 'utf8');
    expect(tex).toMatch(/\\newcommand\{\\RingDiameter\}.*entry \d+/);
  });

  it('audits as sound, and as damaged with the entry named once a byte is flipped', async () => {
    expect(await document(folder, ['audit'])).toMatchObject({ verdict: 'sound', problems: [] });
    const ledger = join(folder, 'book', 'ledger.jsonl');
    copyFileSync(ledger, `${ledger}.kept`);
    const bytes = readFileSync(ledger);
    bytes[200] = (bytes[200] ?? 0) ^ 1;
    writeFileSync(ledger, bytes);
    const { status, out } = await platebook(folder, ['audit', '--json']);
    expect(status).toBe(1);
    const found = JSON.parse(out);
    expect(found.verdict).toBe('damaged');
    expect(found.problems[0].entry).toBe(1);
    copyFileSync(`${ledger}.kept`, ledger);
  });
});

describe('what a run records of paths', () => {
  it('names no folder above the recipe, whether paths are absolute or climb', async () => {
    const folder = temporaryFolder();
    writeFileSync(join(folder, 'data.csv'), 'a,b\n1,2\n');
    const text = `recipe: paths\nstages:\n  a: { kind: ingest, inputs: { data: { file: ${join(folder, 'data.csv')} } } }\n`;
    writeFileSync(join(folder, 'paths.yaml'), text);
    await document(temporaryFolder(), ['run', join(folder, 'paths.yaml'), '--book', join(folder, 'book')]);
    const ledger = readFileSync(join(folder, 'book', 'ledger.jsonl'), 'utf8');
    expect(ledger).toContain('"origin":{"file":"data.csv"}');
    expect(ledger).toContain('"path":"paths.yaml"');
    expect(ledger).not.toContain(folder);
  });
});

describe('run on a recipe that is wrong', () => {
  it('refuses a published number that the output cannot hold, with the near miss', async () => {
    const folder = temporaryFolder();
    const text = readFileSync(recipe, 'utf8').replace(
      'output: ring, value: diameter',
      'output: ring, value: diametre',
    );
    writeFileSync(join(folder, 'wrong.yaml'), text);
    const { status, err } = await platebook(folder, ['run', 'wrong.yaml']);
    expect(status).toBe(2);
    expect(err).toContain('unknown-number publish.numbers.ring-diameter.value');
    expect(err).toContain('Did you mean `diameter`?');
  });

  it('starts nothing, leaves no book, and ends with status 2', async () => {
    const folder = temporaryFolder();
    writeFileSync(join(folder, 'wrong.yaml'), 'recipe: wrong\nstages:\n  a: { kind: ingesst }\n');
    const { status, err } = await platebook(folder, ['run', 'wrong.yaml']);
    expect(status).toBe(2);
    expect(err).toContain('wrong.yaml:3:14 unknown-kind stages.a.kind');
    expect(err).toContain('ingest');
    expect(existsSync(join(folder, 'book'))).toBe(false);
  });

  it('prints the problem as a document with --json', async () => {
    const folder = temporaryFolder();
    const { status, out } = await platebook(folder, ['run', 'none.yaml', '--json']);
    expect(status).toBe(2);
    expect(JSON.parse(out).error).toMatchObject({ code: 'no-recipe' });
  });
});
