/** Reads uv data from FITS random groups; what the file may vary in is settled here: parameters are found by the
 *  beginning of their names, axes by CTYPE, parameters of one name are added (FITS Standard 4.0, section 6.1.2), as are all DATEs, PSCAL and PZERO always applied, and the
 *  baseline code is taken apart. Nothing is judged: weights and values come as they stand. See uv-groups.ts. */

import type { ByteSource } from '../bytes.ts';
import { type GroupsData, readGroups } from './fits/groups.ts';
import { type Hdu, listHdus } from './fits/hdu.ts';
import {
  type AntennaTable,
  type FrequencySetup,
  numberOf,
  readAntennaTables,
  readFrequencySetups,
  textOf,
} from './uv-antennas.ts';
import { type Axes, coordinate, findAxes, frequencies, valueAt } from './uv-axes.ts';
import { type StationParameters, stationsOf } from './uv-baselines.ts';
import type { UvBlock, UvData } from './uv-groups.ts';
import { uvProblem } from './uv-problem.ts';

/** JD of MJD 0. */
const MJD_ZERO = 2400000.5;

/** Reads headers and tables; rows on demand.
 *  @throws InputProblem when something needed is missing or contradicts itself. */
export function readUvGroups(source: ByteSource, hdus: readonly Hdu[] = listHdus(source)): UvData {
  const hdu = hdus[0];
  if (hdu === undefined || hdu.kind !== 'groups') {
    throw uvProblem(
      'no-groups',
      source.name,
      'random groups (GROUPS = T) in the first HDU',
      'another kind of HDU',
    );
  }
  const groups = readGroups(source, hdu);
  const axes = findAxes(hdu, groups);
  const parameters = findParameters(hdu, groups);
  const antennas = readAntennaTables(source, hdus);
  const bands = axes.band.n;
  const setups = readFrequencySetups(source, hdus);
  return {
    target: {
      name: textOf(hdu.header, 'OBJECT') || 'unnamed',
      raDegrees: coordinate(hdu, axes.ra, 'OBSRA'),
      decDegrees: coordinate(hdu, axes.dec, 'OBSDEC'),
    },
    equinox: numberOf(hdu.header, 'EQUINOX') ?? numberOf(hdu.header, 'EPOCH'),
    arrayName: textOf(hdu.header, 'TELESCOP') || antennas[0].arrayName || 'unnamed',
    remark: textOf(hdu.header, 'REMARK'),
    referenceFrequencyHz: axes.channel.crval,
    bandCount: bands,
    channelCount: axes.channel.n,
    ...frequencies(hdu, axes.channel, bands, setupInUse(hdu, setups, groups, parameters)),
    stokes: Array.from({ length: axes.stokes.n }, (_, k) => Math.round(valueAt(axes.stokes, k + 1))),
    antennas,
    count: groups.count,
    hasIntegration: parameters.integration !== undefined,
    block: (from, rows) => readBlock(hdu, groups, parameters, axes, antennas, from, rows),
  };
}

interface Parameters extends StationParameters {
  /** Each one place, or several that are to be added. */
  readonly u: readonly number[];
  readonly v: readonly number[];
  readonly w: readonly number[];
  readonly dates: readonly number[];
  readonly integration: number | undefined;
  readonly source: number | undefined;
  readonly frequencySetup: number | undefined;
}

function findParameters(hdu: Hdu, groups: GroupsData): Parameters {
  // Some writers cannot have two parameters of one name and call the second _DATE.
  const names = groups.parameters.map((each) => each.name.trim().toUpperCase().replace(/^_+/, ''));
  const find = (start: string) => {
    const at = names.findIndex((name) => name.startsWith(start));
    return at < 0 ? undefined : at;
  };
  const dates = names.flatMap((name, k) => (name.startsWith('DATE') ? [k] : []));
  const sameName = (start: string) => {
    const at = find(start);
    return at === undefined ? [] : names.flatMap((name, k) => (name === names[at] ? [k] : []));
  };
  const u = sameName('UU');
  const v = sameName('VV');
  const baseline = find('BASELINE');
  const antenna1 = find('ANTENNA1');
  const antenna2 = find('ANTENNA2');
  const paired = antenna1 !== undefined && antenna2 !== undefined;
  if (u.length === 0 || v.length === 0 || dates.length === 0 || (baseline === undefined && !paired)) {
    throw uvProblem(
      'missing-parameter',
      hdu.place,
      'the parameters UU…, VV…, BASELINE and DATE (once or more)',
      names.join(', ') || 'none',
    );
  }
  return {
    u,
    v,
    w: sameName('WW'),
    dates,
    baseline,
    antenna1,
    antenna2,
    subarray: find('SUBARRAY'),
    integration: find('INTTIM'),
    source: find('SOURCE'),
    frequencySetup: find('FREQSEL'),
  };
}

/** The row of the frequency table that the data use. @throws InputProblem when it is not there, or nothing says which */
function setupInUse(
  hdu: Hdu,
  setups: readonly FrequencySetup[],
  groups: GroupsData,
  parameters: Parameters,
): FrequencySetup | undefined {
  if (setups.length === 0) return undefined;
  const number =
    parameters.frequencySetup === undefined
      ? undefined
      : Math.round(groups.block(0, 1).parameter(parameters.frequencySetup)[0]);
  // With one setup a number below 1 stands for any.
  if (setups.length === 1 && (number === undefined || number < 1)) return setups[0];
  const setup = setups.find((each) => each.number === number);
  if (setup !== undefined) return setup;
  throw uvProblem(
    'bad-frequency-table',
    hdu.place,
    `a frequency setup among ${setups.map((each) => each.number).join(', ')}`,
    number === undefined ? 'no parameter FREQSEL' : `FREQSEL ${number} in row 1`,
  );
}

function readBlock(
  hdu: Hdu,
  groups: GroupsData,
  parameters: Parameters,
  axes: Axes,
  antennas: readonly AntennaTable[],
  from: number,
  rows: number,
): UvBlock {
  const count = Math.max(0, Math.min(rows, groups.count - from));
  const block = groups.block(from, count);
  const optional = (at: number | undefined) =>
    at === undefined ? new Float64Array(count) : block.parameter(at);
  const sumOf = (places: readonly number[]) => {
    const sum = optional(places[0]).slice();
    for (const at of places.slice(1)) {
      const more = block.parameter(at);
      for (let row = 0; row < count; row++) sum[row] += more[row];
    }
    return sum;
  };
  const data = block.data;
  const stations = stationsOf(hdu, parameters, block.parameter, from, count);
  const whole = (at: number | undefined) => Int32Array.from(optional(at), Math.round);
  return {
    from,
    count,
    u: sumOf(parameters.u),
    v: sumOf(parameters.v),
    w: sumOf(parameters.w),
    timeMjd: sumOfDates(
      parameters.dates.map((at) => block.parameter(at)),
      leadOf(antennas, stations.subarray),
      hdu,
      from,
    ),
    ...stations,
    integrationSeconds: optional(parameters.integration),
    source: whole(parameters.source),
    frequencySetup: whole(parameters.frequencySetup),
    data,
    rowStride: count === 0 ? 0 : data.length / count,
    partStride: axes.part.stride,
    sampleOffset: (stokes, band, channel) =>
      stokes * axes.stokes.stride + band * axes.band.stride + channel * axes.channel.stride,
  };
}

/** Lead over UTC of the times of each row, days: that of its subarray's antenna table, or of the first. */
function leadOf(antennas: readonly AntennaTable[], subarrays: Int32Array): (row: number) => number {
  const leads = new Map(antennas.map(({ subarray, lessUtcSeconds }) => [subarray, lessUtcSeconds / 86400]));
  const otherwise = antennas[0].lessUtcSeconds / 86400;
  return (row) => leads.get(subarrays[row]) ?? otherwise;
}

/** MJD from the parts of a Julian date. 2400000.5 is taken off the largest part before the others are added, so that
 *  none of their digits is lost. A time that is not finite stays so and is dropped with its row. */
function sumOfDates(
  parts: readonly Float64Array[],
  lessUtcDays: (row: number) => number,
  hdu: Hdu,
  from: number,
): Float64Array {
  const mjd = new Float64Array(parts[0].length);
  for (let row = 0; row < mjd.length; row++) {
    let largest = 0;
    for (let p = 1; p < parts.length; p++) if (parts[p][row] > parts[largest][row]) largest = p;
    let sum = parts[largest][row] - MJD_ZERO;
    for (let p = 0; p < parts.length; p++) if (p !== largest) sum += parts[p][row];
    if (sum < -MJD_ZERO / 2 || sum > MJD_ZERO) {
      throw uvProblem(
        'bad-time',
        `${hdu.place}, row ${from + row + 1}`,
        'parameters DATE that add up to a Julian date',
        `${sum + MJD_ZERO}`,
      );
    }
    mjd[row] = sum - lessUtcDays(row);
  }
  return mjd;
}
