/** A writer is killed, in truth and with SIGKILL, before every step by which it changes a file, and in the middle of
 *  every write. See test/crash. The numbers of points are floors: a writer that takes fewer steps has lost a sync. */

import { execFile } from 'node:child_process';
import { cpSync, mkdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { build } from 'vite';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { faultsAfterCrash, linesIn } from './after-crash.ts';
import type { Line } from './kill-writer.ts';
import { makeScratchDirectory } from './scratch.ts';
import { PLACES, prepare, prepareFirstVersion, type Report } from './writer.ts';

const WRITER = fileURLToPath(new URL('./kill-writer.ts', import.meta.url));
/** Writers at a time. */
const AT_A_TIME = 2;
const NO_SUCH_STEP = '1000000';

/** What a writer said before it ended. */
interface Told {
  readonly killed: boolean;
  readonly reports: readonly (Report & { steps: number })[];
  /** Steps in all, and those that are writes: null of a writer that was killed. */
  readonly ended: Extract<Line, { what: 'ended' }> | null;
}

let scratch: ReturnType<typeof makeScratchDirectory>;
/** The writer when nobody kills it. */
let whole: { told: Told; lines: Buffer[] };
let made = 0;

beforeAll(async () => {
  scratch = makeScratchDirectory();
  // Some two hundred processes: in one file they start in half the time.
  await build({
    configFile: false,
    logLevel: 'error',
    build: { ssr: WRITER, outDir: scratch.directory, emptyOutDir: false, target: 'node24', minify: false },
  });
  const root = newRoot(prepare);
  whole = { told: await runWriter(root, NO_SUCH_STEP), lines: linesBelow(root) };
});

afterAll(() => scratch.remove());

function newRoot(fill: (root: string) => void): string {
  made += 1;
  const root = join(scratch.directory, `root-${made}`);
  mkdirSync(root);
  fill(root);
  return root;
}

const linesBelow = (root: string) => linesIn(readFileSync(join(root, PLACES.book, 'ledger.jsonl')));

/** Runs the writer until it kills itself or ends. */
function runWriter(root: string, ...words: string[]): Promise<Told> {
  const env = { NODE_COMPILE_CACHE: join(scratch.directory, 'compiled') };
  return new Promise((resolve, reject) => {
    execFile(
      process.execPath,
      [join(scratch.directory, 'kill-writer.js'), root, ...words],
      { env },
      (error, out, err) => {
        const told = out
          .split('\n')
          .filter((line) => line !== '')
          .map((line) => JSON.parse(line) as Line);
        const ended = told.find((line) => line.what === 'ended') ?? null;
        const killed = error?.signal === 'SIGKILL';
        if (error !== null && !killed) reject(new Error(`${error.message}\n${err}`));
        else resolve({ killed, reports: told.filter((line) => line.what !== 'ended'), ended });
      },
    );
  });
}

/** The points of a writer: before each of so many steps, and in the middle of those that are writes. */
function pointsOf({ ended }: Told, steps = ended?.steps ?? 0): string[][] {
  const before = Array.from({ length: steps }, (_, i) => [String(i + 1)]);
  const within = (ended?.writes ?? []).filter((step) => step <= steps).map((step) => [String(step), 'half']);
  return [...before, ...within];
}

/** Kills a writer at each of the points.
 *  @param start  makes what it finds
 *  @param known  what had been reported before, and the lines that it would write
 *  @returns what does not hold afterwards */
async function faultsOfKills(
  points: readonly string[][],
  words: readonly string[],
  start: (root: string) => void,
  known: { reported: readonly Report[]; lines: readonly Buffer[] },
): Promise<string[]> {
  const faults: string[] = [];
  const left = [...points];
  const work = async () => {
    for (let point = left.pop(); point !== undefined; point = left.pop()) {
      const root = newRoot(start);
      const { killed, reports } = await runWriter(root, ...point, ...words);
      const reported = [...known.reported, ...reports];
      const found = killed ? faultsAfterCrash(root, { reported, lines: known.lines }) : ['it was not killed'];
      faults.push(...found.map((fault) => `step ${point.join(', ')}: ${fault}`));
    }
  };
  await Promise.all(Array.from({ length: AT_A_TIME }, work));
  process.stdout.write(`killed at ${points.length} points, ${faults.length} faults\n`);
  return faults;
}

test('A writer killed at any step leaves a sound book with all that was reported', async () => {
  const points = pointsOf(whole.told);
  expect(points.length).toBeGreaterThanOrEqual(180);
  expect(whole.lines).toHaveLength(4);
  expect(await faultsOfKills(points, [], prepare, { reported: [], lines: whole.lines })).toEqual([]);
});

test.each([
  ['that was torn', 0, 'half'],
  ['that is not sealed', 1],
])('A writer killed while it puts right a line %s leaves it to the next', async (_, later, ...half) => {
  const step = (whole.told.ended?.lines.at(-1) ?? 0) + later;
  const left = newRoot(prepare);
  const first = await runWriter(left, String(step), ...half.map(String));
  expect(first.killed).toBe(true);
  const start = (root: string) => cpSync(left, root, { recursive: true });
  await expectPuttingRight(start, first.reports, 10);
});

test('A writer killed while it takes up a book of the first version leaves it to the next', async () => {
  await expectPuttingRight(prepareFirstVersion, [], 20);
});

/** Kills a writer at every step of opening a book, and at the next. */
async function expectPuttingRight(
  start: (root: string) => void,
  reported: readonly Report[],
  floor: number,
): Promise<void> {
  const root = newRoot(start);
  const told = await runWriter(root, NO_SUCH_STEP, 'again');
  const points = pointsOf(told, (told.reports[0]?.steps ?? 0) + 1);
  expect(points.length).toBeGreaterThanOrEqual(floor);
  expect(await faultsOfKills(points, ['again'], start, { reported, lines: linesBelow(root) })).toEqual([]);
}

test('A writer that renames before it writes is caught', async () => {
  const words = ['rename before write'];
  const told = await runWriter(newRoot(prepare), NO_SUCH_STEP, ...words);
  const faults = await faultsOfKills(pointsOf(told).slice(0, 40), words, prepare, {
    reported: [],
    lines: whole.lines,
  });
  expect(faults.join('\n')).toMatch(/seals\/latest is no seal/);
});
