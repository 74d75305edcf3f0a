// Compares the outputs of two `run --json` documents, digest by digest, and ends with the plain line of a test.
import { readFileSync } from 'node:fs';

const [here, there] = process.argv.slice(2).map((file) => JSON.parse(readFileSync(file, 'utf8')));
let same = 0;
let different = 0;
for (const [i, stage] of here.stages.entries()) {
  for (const [name, { digest }] of Object.entries(stage.outputs)) {
    const other = there.stages[i]?.outputs[name]?.digest;
    if (other === digest) same += 1;
    else {
      different += 1;
      console.log(`${stage.stage}.${name}: ${digest} here, ${other} emulated`);
    }
  }
}
const finished = here.finished && there.finished && same > 0;
console.log(`${same} passed, ${different + (finished ? 0 : 1)} failed`);
process.exitCode = finished && different === 0 ? 0 : 1;
