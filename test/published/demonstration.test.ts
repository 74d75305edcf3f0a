import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { beforeAll, describe, expect, it } from 'vitest';
import type { PublishedNumber } from '../../ledger/entry.ts';
import { document } from '../runner/test-io.ts';
import { temporaryFolder } from '../runner/test-jobs.ts';

/** The main job against the truth that the simulation put in, measured by the same definition at the same resolution.
 *  The bounds are the project's own targets; the truth of an invented source is exact. The intervals do not hold the
 *  method's own bias, so no coverage is asked of a single run; fit-coverage.test.ts asks it of three hundred. */
describe('the demonstration', () => {
  const recipe = join(
    dirname(dirname(dirname(fileURLToPath(import.meta.url)))),
    'recipes',
    'lantern',
    'lantern.yaml',
  );
  let run: { finished: boolean; numbers: PublishedNumber[]; stages: { stage: string; warnings: string[] }[] };

  beforeAll(async () => {
    run = await document(temporaryFolder(), ['run', recipe]);
  });

  function published(name: string): { value: number; truth: number; low: number; high: number } {
    const number = run.numbers.find((each) => each.name === name);
    if (number?.against == null || number.low === null || number.high === null)
      throw new Error(`${name} is absent`);
    return { value: number.value, truth: number.against.value, low: number.low, high: number.high };
  }

  it('finishes and publishes every number with its interval and its truth', () => {
    expect(run.finished).toBe(true);
    expect(run.numbers.map(({ name }) => name)).toEqual([
      'ring-diameter',
      'ring-width',
      'ring-asymmetry',
      'ring-position-angle',
      'central-depression',
    ]);
    for (const { name } of run.numbers) {
      const { value, low, high } = published(name);
      expect(low, name).toBeLessThan(value);
      expect(high, name).toBeGreaterThan(value);
    }
  });

  it('finds the diameter within 5 % of the truth', () => {
    const { value, truth } = published('ring-diameter');
    expect(Math.abs(value / truth - 1)).toBeLessThan(0.05);
  });

  it('finds the bright side where it is: the picture is neither turned by 180° nor mirrored', () => {
    const { value, truth } = published('ring-position-angle');
    expect(Math.abs(value - truth)).toBeLessThan(15);
  });

  it('keeps the uncertainty of the diameter below the width of the ring', () => {
    const { low, high } = published('ring-diameter');
    expect((high - low) / 2).toBeLessThan(published('ring-width').value);
  });
});
