/** From random groups to an observation: chooses, drops and counts samples, combines hands and channels of each row, and
 *  brings (u,v) to CONVENTIONS. */

import type { ByteSource } from '../bytes.ts';
import type { Hdu } from '../formats/fits/hdu.ts';
import { type AntennaTable, readUvGroups, type UvBlock, type UvData } from '../formats/uv-groups.ts';
import { InputProblem } from '../problem.ts';
import type { Choices } from './choices.ts';
import { chooseHands } from './hands.ts';
import {
  addRecord,
  drop,
  faultOf,
  makeRecords,
  makeTally,
  type Observation,
  type Records,
  type Tally,
} from './records.ts';
import { chosenNumbers, LIGHT_SPEED, middleOf, timeRange } from './select.ts';
import { type Roll, rollOf } from './station-roll.ts';
import { compareUv } from './uv-agreement.ts';
import { judgeUv, requirePlausible } from './uv-verdict.ts';

const ROWS_AT_ONCE = 65536;
const DEGREE = Math.PI / 180;

/** Reads, chooses, checks. @throws InputProblem */
export function observationOfUvGroups(
  source: ByteSource,
  hdus: readonly Hdu[],
  choices: Choices,
): Observation {
  const uv = readUvGroups(source, hdus);
  const hands = chooseHands(uv.stokes, choices.polarisation, `${source.name}, axis STOKES`);
  const bands = chosenNumbers(choices.bands, uv.bandCount, 'bands');
  const channels = chosenNumbers(choices.channels, uv.channelCount, 'channels');
  const cells = bands.flatMap((band) => channels.map((channel) => ({ band, channel })));
  const { frequencyHz, bandwidthHz } = middleOf(
    cells.map(({ band, channel }) => uv.frequencyHz[band * uv.channelCount + channel]),
    cells.map(({ band }) => uv.widthHz[band]),
    source.name,
  );
  const roll = rollOf(uv, choices);
  const reading = readRows(source, uv, choices, roll, hands.indices, cells);
  const verdict = settleUv(source, uv, roll, reading.records, frequencyHz, choices);
  return {
    format: 'uv-fits',
    target: uv.target,
    arrayName: uv.arrayName,
    remark: uv.remark,
    stations: roll.stations,
    wavelengthMetres: LIGHT_SPEED / frequencyHz,
    bandwidthMetres: (LIGHT_SPEED / frequencyHz / frequencyHz) * bandwidthHz,
    rows: uv.count,
    records: reading.records,
    tally: reading.tally,
    polarisation: hands.names.join(' and '),
    bands: bands.map((band) => band + 1),
    channels: channels.map((channel) => channel + 1),
    hands: hands.indices.length === 2 ? reading.hands : null,
    leftOut: [...roll.out],
    uv: verdict.agreement,
    warnings: [...roll.warnings, ...verdict.warnings],
  };
}

interface Reading {
  readonly records: Records;
  readonly tally: Tally;
  readonly hands: { both: number; one: number; identical: number };
}

interface Cell {
  readonly band: number;
  readonly channel: number;
}

/** Rows as records, u and v in seconds as the file counts them (stations in rising order). */
function readRows(
  source: ByteSource,
  uv: UvData,
  choices: Choices,
  roll: Roll,
  stokes: readonly number[],
  cells: readonly Cell[],
): Reading {
  const reading: Reading = {
    records: makeRecords(uv.count),
    tally: makeTally(),
    hands: { both: 0, one: 0, identical: 0 },
  };
  let isChosen: ((mjd: number) => boolean) | undefined;
  const only = requireOne(source);
  for (let from = 0; from < uv.count; from += ROWS_AT_ONCE) {
    const block = uv.block(from, ROWS_AT_ONCE);
    only(block);
    isChosen ??= timeRange(choices, block.timeMjd[0]);
    const offsets = cells.map(({ band, channel }) => stokes.map((s) => block.sampleOffset(s, band, channel)));
    readBlock(source, block, roll, offsets, isChosen, reading);
  }
  return reading;
}

/** Refuses a file with several targets or frequency setups. */
function requireOne(source: ByteSource): (block: UvBlock) => void {
  const seen: { source?: number; frequencySetup?: number } = {};
  return (block) => {
    for (const name of ['source', 'frequencySetup'] as const) {
      const values = block[name];
      seen[name] ??= values[0];
      const at = values.findIndex((value) => value !== seen[name]);
      if (at < 0) continue;
      throw new InputProblem({
        code: 'several-targets',
        place: `${source.name}, row ${block.from + at + 1}`,
        expected: `one target and one frequency setup (${name} ${seen[name]}, as in row 1)`,
        found: `${name} ${values[at]}`,
        advice: 'Split the file into one for each target and setup.',
      });
    }
  };
}

function readBlock(
  source: ByteSource,
  block: UvBlock,
  roll: Roll,
  offsets: readonly (readonly number[])[],
  isChosen: (mjd: number) => boolean,
  reading: Reading,
): void {
  const { tally, records } = reading;
  const samples = offsets.length * offsets[0].length;
  tally.read += samples * block.count;
  const sum = { re: 0, im: 0, weight: 0, samples: 0 };
  for (let row = 0; row < block.count; row++) {
    const first = roll.find(block.subarray[row], block.number1[row]);
    const second = roll.find(block.subarray[row], block.number2[row]);
    if (first === undefined || second === undefined) throw unknownStation(source, block, row, first, roll);
    const timeMjd = block.timeMjd[row];
    const u = block.u[row];
    const v = block.v[row];
    if (first < 0 || second < 0) drop(tally, 'station left out', samples);
    else if (first === second) drop(tally, 'autocorrelation', samples);
    else if (!Number.isFinite(u + v + timeMjd)) drop(tally, 'coordinates or time not finite', samples);
    else if (!isChosen(timeMjd)) drop(tally, 'time not chosen', samples);
    else {
      combine(block, row, offsets, reading, sum);
      if (sum.samples === 0) continue;
      addRecord(records, {
        station1: first,
        station2: second,
        timeMjd,
        integrationSeconds: block.integrationSeconds[row],
        u,
        v,
        ...sum,
      });
    }
  }
}

/** Weighted mean over the chosen channels and hands of one row, into `sum`; `sum.samples` is 0 when none is sound. */
function combine(
  block: UvBlock,
  row: number,
  offsets: readonly (readonly number[])[],
  { tally, hands }: Reading,
  sum: { re: number; im: number; weight: number; samples: number },
): void {
  const { data, partStride } = block;
  const start = row * block.rowStride;
  let weight = 0;
  let re = 0;
  let im = 0;
  let samples = 0;
  let pairs = 0;
  let twins = 0;
  for (const cell of offsets) {
    let sound = 0;
    let firstAt = -1;
    for (const offset of cell) {
      const at = start + offset;
      const w = data[at + 2 * partStride];
      const fault = faultOf(data[at], data[at + partStride], w);
      if (fault !== undefined) {
        drop(tally, fault, 1);
        continue;
      }
      re += w * data[at];
      im += w * data[at + partStride];
      weight += w;
      sound++;
      if (sound === 2) {
        pairs++;
        if (data[at] === data[firstAt] && data[at + partStride] === data[firstAt + partStride]) twins++;
      }
      firstAt = at;
    }
    samples += sound;
  }
  sum.samples = samples;
  if (samples === 0) return;
  if (pairs === 0) hands.one++;
  else hands.both++;
  if (pairs > 0 && pairs === twins) hands.identical++;
  sum.re = re / weight;
  sum.im = im / weight;
  sum.weight = weight;
}

function unknownStation(
  source: ByteSource,
  block: UvBlock,
  row: number,
  first: number | undefined,
  roll: Roll,
): InputProblem {
  const number = first === undefined ? block.number1[row] : block.number2[row];
  return new InputProblem({
    code: 'unknown-station',
    place: `${source.name}, row ${block.from + row + 1}`,
    expected: `baselines of the antenna table's stations (${roll.stations.map((each) => each.name).join(', ')})`,
    found: `baseline ${block.number1[row]}–${block.number2[row]}, where station number ${number} is not in the table`,
    advice: `Correct the antenna table, or drop the station with leaveOut: ["${number}"].`,
  });
}

/** Checks u and v (seconds) and turns them into wavelengths as CONVENTIONS count them, in place. */
function settleUv(
  source: ByteSource,
  uv: UvData,
  roll: Roll,
  records: Records,
  frequencyHz: number,
  choices: Choices,
) {
  const place = `${source.name}, parameters UU and VV`;
  let longest = 0;
  for (let k = 0; k < records.count; k++) {
    longest = Math.max(longest, records.u[k] * records.u[k] + records.v[k] * records.v[k]);
  }
  if (records.count > 0) requirePlausible(Math.sqrt(longest) * frequencyHz, Math.sqrt(longest), place);
  const comparison = compareUv(
    { ...records, unitsPerMetre: 1 / LIGHT_SPEED },
    {
      positions: roll.stations.map((station) => station.xyz),
      raDegrees: uv.target.raDegrees,
      decDegrees: uv.target.decDegrees,
      siderealTime: siderealTimeOf(uv.antennas[0]),
      statedJ2000: uv.equinox === 2000,
    },
  );
  const verdict = judgeUv(comparison, choices.uvSign, place, records.count > 0);
  const factor = -verdict.turn * frequencyHz;
  for (let k = 0; k < records.count; k++) {
    records.u[k] *= factor;
    records.v[k] *= factor;
  }
  return verdict;
}

/** Sidereal time of Greenwich as the antenna table counts it, in its own time scale. */
function siderealTimeOf(table: AntennaTable): ((mjd: number) => number) | undefined {
  const { referenceMjd, gst0Degrees, degreesPerDay, lessUtcSeconds } = table;
  if (referenceMjd === undefined || gst0Degrees === undefined) return undefined;
  const origin = referenceMjd - lessUtcSeconds / 86400;
  return (mjd) => (gst0Degrees + degreesPerDay * (mjd - origin)) * DEGREE;
}
