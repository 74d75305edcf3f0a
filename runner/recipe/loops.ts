/** Loops between stages. */

import type { Spot } from './source-text.ts';

/** What each stage needs: names of stages, each with the place of the reference. */
export type Needs = ReadonlyMap<string, ReadonlyMap<string, Spot>>;

export interface Loop {
  /** From the stage that stands first in the recipe and back to it: [a, b, a]. */
  readonly stages: readonly string[];
  /** The reference by which the first stage needs the second. */
  readonly spot: Spot;
}

/** Loops without a stage in common, in the order of the recipe. Cost O(loops × references). */
export function findLoops(needs: Needs): readonly Loop[] {
  const loops: Loop[] = [];
  const unsettled = new Set(needs.keys());
  for (settle(needs, unsettled); unsettled.size > 0; settle(needs, unsettled)) {
    const stages = walkLoop(needs, unsettled);
    for (const stage of stages) unsettled.delete(stage);
    loops.push({
      stages: [...stages, stages[0]],
      spot: needs.get(stages[0])?.get(stages[1] ?? stages[0]) as Spot,
    });
  }
  return loops;
}

/** Takes out, again and again, the stages that need nothing unsettled. */
function settle(needs: Needs, unsettled: Set<string>): void {
  const neededBy = new Map<string, string[]>();
  const open = new Map<string, number>();
  for (const stage of unsettled) {
    const unmet = [...(needs.get(stage)?.keys() ?? [])].filter((name) => unsettled.has(name));
    open.set(stage, unmet.length);
    for (const name of unmet) neededBy.set(name, [...(neededBy.get(name) ?? []), stage]);
  }
  const ready = [...unsettled].filter((stage) => open.get(stage) === 0);
  for (let stage = ready.pop(); stage !== undefined; stage = ready.pop()) {
    unsettled.delete(stage);
    for (const name of neededBy.get(stage) ?? []) {
      const left = (open.get(name) as number) - 1;
      open.set(name, left);
      if (left === 0) ready.push(name);
    }
  }
}

/** Every unsettled stage needs another: follow the first until one comes again. */
function walkLoop(needs: Needs, unsettled: ReadonlySet<string>): string[] {
  const order = [...needs.keys()];
  const path: string[] = [];
  let stage = order.find((name) => unsettled.has(name)) as string;
  while (!path.includes(stage)) {
    path.push(stage);
    stage = [...(needs.get(stage)?.keys() ?? [])].find((name) => unsettled.has(name)) as string;
  }
  const loop = path.slice(path.indexOf(stage));
  const first = loop.reduce((a, b) => (order.indexOf(b) < order.indexOf(a) ? b : a));
  return [...loop.slice(loop.indexOf(first)), ...loop.slice(0, loop.indexOf(first))];
}
