/** A twentieth of the suite of known sources, as the recipe has it: it runs, and says what it finds. */

import { mkdtempSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { expect, test } from 'vitest';
import { platebook } from './small-disk.ts';

const recipe = join(
  dirname(dirname(dirname(fileURLToPath(import.meta.url)))),
  'recipes',
  'truth-recovery.yaml',
);
const STAGES = ['quiet-night', 'loud-night', 'quiet-evening', 'loud-evening'];

test('recovers a sample of the truths', () => {
  const folder = mkdtempSync(join(tmpdir(), 'platebook-truths-'));
  const lets = STAGES.flatMap((stage) => ['--let', `${stage}.part=0.05`]);
  const { status, out, err } = platebook(['run', recipe, ...lets, '--json'], folder);
  expect(status, err).toBe(0);
  const { numbers } = JSON.parse(out) as { numbers: { name: string; value: number }[] };
  const value = (name: string) => numbers.find((number) => number.name === name)?.value;
  // 31 a round, four rounds.
  expect(value('observations')).toBe(4 * Math.round(0.05 * 31 * 4));
  // Some of a handful of rings are found, and a diameter is not off by more than a tenth.
  expect(value('rings-found')).toBeGreaterThan(0.5);
  expect(Math.abs(value('diameter-bias') ?? 99)).toBeLessThan(4);
});
