/** From OIFITS without complex visibilities to an observation: squared visibilities and triple products, as optical
 *  interferometers give them. For every time and wavelength it makes complex visibilities whose amplitudes are the roots of the
 *  squared ones and whose closure phases are the measured ones:
 *
 *    |V| = sqrt(V2), sigma = sigma(V2) / (2 |V|), at most sqrt(sigma(V2)) / 2 where V2 is lost in the noise
 *    phases: of the baselines of a tree 0, of the others what the triangles say
 *
 *  So closure phases and amplitudes (or closure amplitudes) may be fitted, and nothing else may: phases mean nothing by
 *  themselves. A closure phase's error is shared by its three baselines, 1/sqrt(3) each. Triangles beyond an independent set
 *  are left over and counted. Times and wavelengths are not averaged: each is a scan of its own. Source of the quantities:
 *  Duvert, Young & Hummel 2017, A&A 597, A8. */

import type { ByteSource } from '../bytes.ts';
import type { Station } from '../data.ts';
import type { OiData, Oifits, OiT3, OiVis2 } from '../formats/oifits-types.ts';
import { cos, sin } from '../numerics/elementary.ts';
import { InputProblem } from '../problem.ts';
import type { Choices } from './choices.ts';
import { addRecord, drop, makeRecords, makeTally, type Observation, type Tally } from './records.ts';

const DEGREE = Math.PI / 180;
/** Tables of one exposure may differ so much in time, days: a tenth of a second. */
const SAME_TIME = 1e-6;
/** Between the wavelengths of one time, so that each is a record of its own. */
const CHANNEL_STEP = 0.05 / 86400;

interface Group {
  readonly mjd: number;
  readonly wavelength: number;
  readonly channel: number;
  readonly baselines: Map<string, Baseline>;
  readonly triangles: Triangle[];
}

interface Baseline {
  readonly a: number;
  readonly b: number;
  readonly u: number;
  readonly v: number;
  readonly amplitude: number;
  readonly sigma: number;
  phase: number;
  phaseError: number;
}

interface Triangle {
  readonly stations: readonly [number, number, number];
  readonly phase: number;
  readonly error: number;
}

/** @param target  its index  @throws InputProblem where no squared visibility can be used */
export function observationOfOptical(
  oifits: Oifits,
  source: ByteSource,
  target: number,
  choices: Choices,
): Observation {
  const stations = stationsOf([...oifits.vis2, ...oifits.t3], source.name);
  const tally = makeTally();
  const groups = new Map<string, Group>();
  for (const table of oifits.vis2) addSquared(table, target, stations, groups, tally, choices);
  for (const table of oifits.t3) addTriples(table, target, stations, groups, choices);
  const left = [...groups.values()].reduce((sum, group) => sum + solvePhases(group), 0);
  const used = [...groups.values()].sort((x, y) => x.mjd - y.mjd || x.channel - y.channel);
  const wavelengths = used.map(({ wavelength }) => wavelength);
  const wavelengthMetres =
    wavelengths.length === 0 ? 1 : (Math.min(...wavelengths) + Math.max(...wavelengths)) / 2;
  const count = used.reduce((sum, { baselines }) => sum + baselines.size, 0);
  const records = makeRecords(count);
  const phaseErrors = new Map<string, number>();
  for (const group of used) {
    for (const line of group.baselines.values()) {
      const timeMjd = group.mjd + CHANNEL_STEP * group.channel;
      phaseErrors.set(keyOf(timeMjd, line.a, line.b), line.phaseError);
      addRecord(records, {
        station1: line.a,
        station2: line.b,
        timeMjd,
        integrationSeconds: 0,
        u: line.u / group.wavelength,
        v: line.v / group.wavelength,
        re: line.amplitude * cos(line.phase),
        im: line.amplitude * sin(line.phase),
        weight: 1 / (line.sigma * line.sigma),
        samples: 1,
      });
    }
  }
  const { name, raDegrees, decDegrees } = oifits.targets[target];
  const list = [...stations.values()];
  return {
    format: 'oifits',
    target: { name, raDegrees, decDegrees },
    arrayName: oifits.arrays[0]?.name ?? 'unnamed',
    remark: '',
    stations: list,
    wavelengthMetres,
    bandwidthMetres: Math.max(...wavelengths, 0) - Math.min(...wavelengths, wavelengthMetres),
    rows: [...oifits.vis2, ...oifits.t3].reduce((sum, { rows }) => sum + rows, 0),
    records,
    tally,
    polarisation: 'as the file holds it',
    bands: oifits.wavelengths.map((_, k) => k + 1),
    channels: [...new Set(used.map(({ channel }) => channel + 1))],
    hands: null,
    leftOut: choices.leaveOut,
    uv: {
      checked: false,
      largest: null,
      rms: null,
      rows: 0,
      finding: 'not checked: optical data',
      applied: 'taken as the format counts them',
    },
    phaseErrorOf: (timeMjd, a, b) => phaseErrors.get(keyOf(timeMjd, a, b)) ?? Math.PI,
    warnings: [
      'The file has squared visibilities and triple products only: amplitudes are their roots, and phases mean nothing but in closures.',
      'The visibilities are normalised: a total flux of 1 is written as 1 Jy.',
      ...(left > 0 ? [`${left} closure phases are not independent of others and were left over.`] : []),
    ],
  };
}

/** A number in `keyOf`: the same for what was written and what was averaged. */
function keyOf(timeMjd: number, a: number, b: number): string {
  return `${Math.round(timeMjd * 86400 * 100)}:${Math.min(a, b)}:${Math.max(a, b)}`;
}

function stationsOf(tables: readonly OiData[], place: string): Map<string, Station> {
  const stations = new Map<string, Station>();
  for (const { array } of tables) {
    if (array === undefined) {
      throw new InputProblem({
        code: 'no-array',
        place,
        expected: 'tables of data that name an OI_ARRAY',
        found: 'one without ARRNAME',
        advice: 'Give the stations their names: write the file as revision 2.',
      });
    }
    for (const { name } of array.stations)
      if (!stations.has(name)) stations.set(name, { name, xyz: [0, 0, 0] });
  }
  return stations;
}

/** The numbers of a row's stations; null where one is left out. */
function rowStations(
  table: OiData,
  row: number,
  stations: ReadonlyMap<string, Station>,
  choices: Choices,
): number[] | null {
  const names = [...stations.keys()];
  const own = Array.from({ length: table.stationsPerRow }, (_, k) => {
    const at = table.stations[row * table.stationsPerRow + k];
    return (table.array as NonNullable<OiData['array']>).stations[at].name;
  });
  return own.some((name) => choices.leaveOut.includes(name)) ? null : own.map((name) => names.indexOf(name));
}

function groupAt(
  groups: Map<string, Group>,
  table: OiData,
  row: number,
  channel: number,
  make: boolean,
): Group | undefined {
  const mjd = Math.round(table.mjd[row] / SAME_TIME) * SAME_TIME;
  const key = `${Math.round(table.mjd[row] / SAME_TIME)}:${table.wavelength.name}:${channel}`;
  const found = groups.get(key);
  if (found !== undefined || !make) return found;
  const made: Group = {
    mjd,
    wavelength: table.wavelength.wavelengths[channel],
    channel,
    baselines: new Map(),
    triangles: [],
  };
  groups.set(key, made);
  return made;
}

function addSquared(
  table: OiVis2,
  target: number,
  stations: ReadonlyMap<string, Station>,
  groups: Map<string, Group>,
  tally: Tally,
  choices: Choices,
): void {
  for (let row = 0; row < table.rows; row++) {
    if (table.target[row] !== target) continue;
    const pair = rowStations(table, row, stations, choices);
    tally.read += table.channels;
    if (pair === null) {
      drop(tally, 'station left out', table.channels);
      continue;
    }
    for (let channel = 0; channel < table.channels; channel++) {
      const at = row * table.channels + channel;
      const [square, error] = [table.squared[at], table.squaredError[at]];
      if (table.flag[at] !== 0) drop(tally, 'flagged in the file', 1);
      else if (!(Number.isFinite(square) && Number.isFinite(error))) drop(tally, 'value not finite', 1);
      else if (!(error > 0)) drop(tally, 'weight infinite', 1);
      else if (!Number.isFinite(table.u[row] + table.v[row] + table.mjd[row]))
        drop(tally, 'coordinates or time not finite', 1);
      else
        addBaseline(
          groupAt(groups, table, row, channel, true) as Group,
          pair,
          table,
          row,
          square,
          error,
          tally,
        );
    }
  }
}

function addBaseline(
  { baselines }: Group,
  [first, second]: readonly number[],
  table: OiVis2,
  row: number,
  square: number,
  error: number,
  tally: Tally,
): void {
  const turn = first > second;
  const [a, b] = turn ? [second, first] : [first, second];
  const key = `${a}:${b}`;
  if (baselines.has(key)) {
    drop(tally, 'row doubled', 1);
    return;
  }
  const amplitude = Math.sqrt(Math.max(0, square));
  baselines.set(key, {
    a,
    b,
    u: turn ? -table.u[row] : table.u[row],
    v: turn ? -table.v[row] : table.v[row],
    amplitude,
    sigma: Math.min(error / (2 * amplitude), Math.sqrt(error) / 2),
    phase: 0,
    phaseError: Math.PI,
  });
}

function addTriples(
  table: OiT3,
  target: number,
  stations: ReadonlyMap<string, Station>,
  groups: Map<string, Group>,
  choices: Choices,
): void {
  for (let row = 0; row < table.rows; row++) {
    const three = table.target[row] === target ? rowStations(table, row, stations, choices) : null;
    if (three === null) continue;
    for (let channel = 0; channel < table.channels; channel++) {
      const at = row * table.channels + channel;
      const [phase, error] = [table.phaseDegrees[at] * DEGREE, table.phaseErrorDegrees[at] * DEGREE];
      if (table.flag[at] !== 0 || !Number.isFinite(phase) || !(error > 0 && Number.isFinite(error))) continue;
      groupAt(groups, table, row, channel, false)?.triangles.push({
        stations: three as unknown as Triangle['stations'],
        phase,
        error,
      });
    }
  }
}

/** Gives the baselines phases with which the triangles close as measured. @returns triangles that were left over */
function solvePhases({ baselines, triangles }: Group): number {
  const known = new Set<string>();
  const sideOf = (from: number, to: number) => ({
    key: from < to ? `${from}:${to}` : `${to}:${from}`,
    sign: from < to ? 1 : -1,
  });
  const waiting = triangles
    .map(({ stations: [a, b, c], phase, error }) => ({
      sides: [sideOf(a, b), sideOf(b, c), sideOf(c, a)],
      phase,
      error,
    }))
    .filter(({ sides }) => sides.every(({ key }) => baselines.has(key)))
    .sort((x, y) => x.error - y.error);
  let left = 0;
  while (waiting.length > 0) {
    const unknown = ({ sides }: (typeof waiting)[number]) =>
      sides.filter(({ key }) => !known.has(key)).length;
    // First those that fix one more baseline; else one whose other sides may be chosen.
    const next =
      waiting.find((triangle) => unknown(triangle) === 1) ??
      waiting.find((triangle) => unknown(triangle) > 1);
    if (next === undefined) {
      left += waiting.length;
      break;
    }
    waiting.splice(waiting.indexOf(next), 1);
    const open = next.sides.filter(({ key }) => !known.has(key));
    const last = open[open.length - 1];
    for (const { key } of open) known.add(key);
    const others = next.sides.filter((side) => side !== last);
    const sum = others.reduce(
      (total, { key, sign }) => total + sign * (baselines.get(key) as Baseline).phase,
      0,
    );
    (baselines.get(last.key) as Baseline).phase = last.sign * (next.phase - sum);
    for (const { key } of next.sides) {
      const line = baselines.get(key) as Baseline;
      line.phaseError = Math.min(line.phaseError, next.error / Math.sqrt(3));
    }
  }
  return left;
}
