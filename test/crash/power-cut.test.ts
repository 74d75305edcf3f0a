/** The power is cut, on a model of a disk, after every step of a writer. See power-cut.ts and disk.ts. The numbers of
 *  points are floors: a writer that takes fewer steps has lost a sync. */

import { execFileSync } from 'node:child_process';
import { fileURLToPath } from 'node:url';
import { expect, test } from 'vitest';

const PROGRAM = fileURLToPath(new URL('./power-cut.ts', import.meta.url));
const FLOORS = {
  writer: { steps: 150, states: 1500 },
  'killed, then another writer': { steps: 120, states: 600 },
  'putting right': { steps: 30, states: 200 },
  'taking up': { steps: 12, states: 100 },
};

interface Round {
  readonly steps: number;
  readonly states: number;
  readonly distinct: number;
  readonly faults: readonly string[];
}

/** Runs the program with a fixed seed, shows what it counted, and returns it. */
function cutPower(...words: readonly string[]): Record<string, Round> {
  const printed = execFileSync(process.execPath, [PROGRAM, '--brief', '--seed', '1', ...words], {
    encoding: 'utf8',
    maxBuffer: 1 << 28,
  });
  const lines = printed.trim().split('\n');
  const title = words.length === 0 ? '' : `sabotage, ${words.at(-1)}: `;
  console.log(
    lines
      .slice(0, -1)
      .map((line) => title + line)
      .join('\n'),
  );
  return JSON.parse(lines.at(-1) as string);
}

test('leaves a sound book that holds every entry which was reported, wherever the power is cut', () => {
  const rounds = cutPower();
  expect(Object.keys(rounds)).toEqual(Object.keys(FLOORS));
  for (const [name, { steps, states }] of Object.entries(FLOORS)) {
    const round = rounds[name] as Round;
    expect(round.faults, name).toEqual([]);
    expect(round.steps, name).toBeGreaterThanOrEqual(steps);
    expect(round.states, name).toBeGreaterThanOrEqual(states);
  }
});

test.each(['no file sync', 'no directory sync', 'rename before write'])(
  'notices a writer with %s',
  (sabotage) => {
    expect(cutPower('--sabotage', sabotage).writer?.faults.length).toBeGreaterThan(0);
  },
);
