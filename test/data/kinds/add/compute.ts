import { readAll } from '../../../../stages/bytes.ts';
import type { Compute } from '../../../../stages/kind.ts';

export const compute: Compute = (task) => {
  const terms = (task.inputs.data ?? []).map((source) => Number(Buffer.from(readAll(source)).toString()));
  const sum = terms.reduce((a, b) => a + b, (task.parameters.term as number) + (task.parameters.length as number));
  task.progress(0.5);
  task.outputs.sum?.write(Buffer.from(`${sum}\n`));
  return { warnings: sum > 1e6 ? ['a large sum'] : [] };
};
