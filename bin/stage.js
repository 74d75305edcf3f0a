// The start of a stage's process: `node --permission … bin/stage.js STAGE_CHILD ASSIGNMENT`. Sources that the runner has
// taken the types out of lie beside the assignment and are loaded from there, which saves half a second; the rest is
// up to runner/stage-child.ts. Plain JavaScript, so that nothing has to be prepared before it.

import { readFileSync } from 'node:fs';
import { registerHooks } from 'node:module';
import { dirname, join } from 'node:path';
import { pathToFileURL } from 'node:url';

const [child, assignment] = process.argv.slice(2);
const sources = new Map(
  Object.entries(JSON.parse(readFileSync(join(dirname(assignment), 'sources.json'), 'utf8'))),
);
process.argv.splice(2, 1);
registerHooks({
  load(url, context, next) {
    const source = sources.get(url);
    return source === undefined ? next(url, context) : { format: 'module', source, shortCircuit: true };
  },
});
await import(pathToFileURL(child).href);
