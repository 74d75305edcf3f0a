import { spawn } from 'node:child_process';
import { existsSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { setTimeout } from 'node:timers/promises';
import { fileURLToPath } from 'node:url';
import { expect, it } from 'vitest';
import { document, platebook } from '../runner/test-io.ts';
import { temporaryFolder } from '../runner/test-jobs.ts';

const root = dirname(dirname(dirname(fileURLToPath(import.meta.url))));
const recipe = join(root, 'recipes', 'lantern', 'small.yaml');

/** Milliseconds after the start at which the runner is killed; a run takes some seconds. */
const moments = [200, 700, 1300, 2200, 3200];

it('leaves a book that opens and audits as sound whenever the runner is killed', async () => {
  const folder = temporaryFolder();
  for (const moment of moments) {
    const words = [join(root, 'bin', 'platebook.js'), 'run', recipe, '--quiet'];
    const runner = spawn(process.execPath, words, { cwd: folder, stdio: 'ignore', detached: true });
    const ended = new Promise((resolve) => runner.once('exit', resolve));
    await Promise.race([setTimeout(moment), ended]);
    if (runner.exitCode === null && runner.pid !== undefined) process.kill(-runner.pid, 'SIGKILL');
    await ended;
    if (!existsSync(join(folder, 'book', 'ledger.jsonl'))) continue;
    const { verdict, problems, error } = await document(folder, ['audit']);
    // Killed while it was being started, a book is none yet.
    if (error?.code === 'no-book') continue;
    expect({ moment, verdict, problems }).toEqual({ moment, verdict: 'sound', problems: [] });
  }
  const { status } = await platebook(folder, ['run', recipe, '--quiet']);
  expect(status).toBe(0);
  expect(await document(folder, ['audit'])).toMatchObject({ verdict: 'sound' });
});
