/** Files of tests share a process, which saves loading everything again for each: what one of them sets in the environment
 *  goes when it ends. */

import { afterAll } from 'vitest';

const before = { ...process.env };

afterAll(() => {
  for (const name of Object.keys(process.env)) if (!(name in before)) delete process.env[name];
  Object.assign(process.env, before);
});
