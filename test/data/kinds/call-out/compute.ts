import type { Compute } from '../../../../stages/kind.ts';

export const compute: Compute = async (task) => {
  const way = task.parameters.way;
  if (way === 'import') await import('node:net');
  if (way === 'builtin') process.getBuiltinModule('node:http');
  if (way === 'fetch') await fetch('http://127.0.0.1:9/');
  task.outputs.environment?.write(Buffer.from(JSON.stringify(process.env)));
  return {};
};
