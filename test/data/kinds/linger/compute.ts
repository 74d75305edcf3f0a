import { setTimeout } from 'node:timers/promises';
import type { Compute } from '../../../../stages/kind.ts';

export const compute: Compute = async (task) => {
  task.progress(0.1);
  await setTimeout((task.parameters.time as number) * 1000);
  task.outputs.nothing?.write(Buffer.from('nothing'));
  return {};
};
