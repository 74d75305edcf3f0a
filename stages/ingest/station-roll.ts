/** Which station a number in the data means: stations of all antenna tables, less those left out. */

import type { Station } from '../data.ts';
import type { AntennaTable, UvData } from '../formats/uv-groups.ts';
import type { Choices } from './choices.ts';
import { leftOut } from './select.ts';

/** Stations of all subarrays: one name is one station. */
export interface Roll {
  readonly stations: readonly Station[];
  readonly out: ReadonlySet<string>;
  readonly warnings: string[];
  /** Index of a station by its number; −1 when it is left out; undefined when no table has it. */
  readonly find: (subarray: number, number: number) => number | undefined;
}

/** @throws InputProblem for a name in `leaveOut` that is no station's */
export function rollOf(uv: UvData, choices: Choices): Roll {
  const stations = new Map<string, Station>();
  for (const table of uv.antennas) {
    for (const { name, xyz } of table.antennas) if (!stations.has(name)) stations.set(name, { name, xyz });
  }
  const names = [...stations.keys()];
  const out = leftOut(names, choices);
  const warnings: string[] = [];
  const known = new Map<number, number | undefined>();
  const find = (subarray: number, number: number) => {
    const key = subarray * 65536 + number;
    if (!known.has(key)) known.set(key, indexOf(tableOf(uv, subarray, warnings), number, names, out));
    return known.get(key);
  };
  return { stations: [...stations.values()], out, warnings, find };
}

function tableOf(uv: UvData, subarray: number, warnings: string[]): AntennaTable {
  const table = uv.antennas.find((each) => each.subarray === subarray);
  if (table !== undefined) return table;
  const warning = `The baseline codes name subarray ${subarray}, for which there is no antenna table; its stations are taken from ${uv.antennas[0].place}.`;
  if (!warnings.includes(warning)) warnings.push(warning);
  return uv.antennas[0];
}

function indexOf(
  table: AntennaTable,
  number: number,
  names: readonly string[],
  out: ReadonlySet<string>,
): number | undefined {
  const name = table.byNumber.get(number)?.name;
  if (name === undefined) return out.has(`${number}`) ? -1 : undefined;
  return out.has(name) ? -1 : names.indexOf(name);
}
