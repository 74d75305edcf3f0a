import { execFileSync } from 'node:child_process';
import { readFileSync, writeFileSync } from 'node:fs';
import { Worker } from 'node:worker_threads';
import type { Compute } from '../../../../stages/kind.ts';

export const compute: Compute = (task) => {
  const path = task.parameters.path as string;
  const ways: Record<string, () => Uint8Array> = {
    read: () => readFileSync(path),
    write: () => (writeFileSync(path, 'written'), Buffer.from('written')),
    start: () => execFileSync('/bin/cat', [path]),
    worker: () => (new Worker('', { eval: true }), Buffer.from('started')),
  };
  const loot = ways[task.parameters.how as string]?.() ?? Buffer.from('nothing');
  task.outputs.loot?.write(loot);
  return {};
};
