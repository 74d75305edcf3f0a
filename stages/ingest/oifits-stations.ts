/** Names of the stations that tables of OIFITS refer to. A station has one name in an observation: that of STA_NAME, or
 *  where that is blank TEL_NAME, or else its number. Arrays of one file may name unlike stations alike; those of the
 *  second array then carry its ARRNAME. Arrays that describe one station twice, at one place, mean one station. */

import type { Station } from '../data.ts';
import type { OiArray, OiData, OiStation } from '../formats/oifits-types.ts';
import { InputProblem } from '../problem.ts';

/** Two descriptions of one station differ by less, metres. */
const SAME_PLACE = 1;

export interface NamedStations {
  /** By name, in the order of the tables. Positions count when the frame is GEOCENTRIC and are (0, 0, 0) otherwise. */
  readonly stations: ReadonlyMap<string, Station>;
  /** Name of the station that stands in place `at` of the column STA_INDEX, all rows counted through. */
  readonly namesIn: (table: OiData) => (at: number) => string;
}

/** @throws InputProblem when one array has two stations of one name. Cost O(stations). */
export function namedStations(tables: readonly OiData[]): NamedStations {
  const stations = new Map<string, Station>();
  const owners = new Map<string, { frame: string; xyz: OiStation['xyz'] }>();
  const ofArray = new Map<OiArray, string[]>();
  for (const table of tables) {
    const { array } = table;
    if (array === undefined) {
      for (const number of [...new Set(numbersOf(table))].sort((a, b) => a - b)) {
        const name = nameOfNumber(number);
        if (!stations.has(name)) stations.set(name, { name, xyz: [0, 0, 0] });
      }
      continue;
    }
    if (ofArray.has(array)) continue;
    const own = ownNames(array);
    const names = array.stations.map(({ xyz }, k) => {
      const before = owners.get(own[k]);
      const isSame = before === undefined || (before.frame === array.frame && isNear(before.xyz, xyz));
      const name = isSame ? own[k] : `${own[k]} (${array.name})`;
      if (before === undefined) owners.set(name, { frame: array.frame, xyz });
      const isKnown = array.frame === 'GEOCENTRIC' && xyz.every(Number.isFinite);
      if (!stations.has(name)) stations.set(name, { name, xyz: isKnown ? xyz : [0, 0, 0] });
      return name;
    });
    ofArray.set(array, names);
  }
  const namesIn = (table: OiData) => {
    const names = table.array === undefined ? undefined : ofArray.get(table.array);
    if (names !== undefined) return (at: number) => names[table.stations[at]];
    const numbers = numbersOf(table);
    return (at: number) => nameOfNumber(numbers[at]);
  };
  return { stations, namesIn };
}

function ownNames({ name, stations }: OiArray): string[] {
  const seen = new Set<string>();
  return stations.map((station) => {
    const own = station.name || station.telescope || nameOfNumber(station.index);
    if (!seen.has(own)) {
      seen.add(own);
      return own;
    }
    throw new InputProblem({
      code: 'doubled-station',
      place: `OI_ARRAY ${name}, STA_INDEX ${station.index}`,
      expected: 'a STA_NAME of its own for every station of the array',
      found: JSON.stringify(own),
      advice: 'Correct the table with the program that wrote the file.',
    });
  });
}

function isNear(a: OiStation['xyz'], b: OiStation['xyz']): boolean {
  return a.every((value, axis) => Math.abs(value - b[axis]) < SAME_PLACE);
}

function numbersOf({ table }: OiData): Float64Array {
  return table.column('STA_INDEX').numbers();
}

function nameOfNumber(number: number): string {
  return `station ${number}`;
}
