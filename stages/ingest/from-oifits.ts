/** From OIFITS to an observation: the complex visibilities of OI_VIS. Where a file has none with a reference, from-optical.ts
 *  takes OI_VIS2 and OI_T3. */

import type { ByteSource } from '../bytes.ts';
import { readOifits } from '../formats/oifits.ts';
import { requireValidOifits } from '../formats/oifits-strict.ts';
import type { Oifits, OiVis } from '../formats/oifits-types.ts';
import { weightOfSigma } from '../formats/visibility-table.ts';
import { cos, sin } from '../numerics/elementary.ts';
import { InputProblem } from '../problem.ts';
import { convert } from '../units.ts';
import type { Choices } from './choices.ts';
import { correlationsUnused, observationOfOptical } from './from-optical.ts';
import { type NamedStations, namedStations } from './oifits-stations.ts';
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
import { chosenNumbers, LIGHT_SPEED, leftOut, middleOf, timeRange } from './select.ts';
import { checkOurs, longestOf, withoutPosition } from './uv-check.ts';
import { requirePlausible } from './uv-verdict.ts';

const DEGREE = Math.PI / 180;

/** @throws InputProblem */
export function observationOfOifits(source: ByteSource, choices: Choices): Observation {
  if (choices.rules !== 'ignore') requireValidOifits(source);
  const oifits = readOifits(source);
  const target = chooseTarget(oifits, choices.target, source.name);
  if (!oifits.vis.some(isReferred) && oifits.vis2.length + oifits.t3.length > 0)
    return observationOfOptical(oifits, source, target, choices);
  const tables = requireVis(oifits, source);
  const bands = chosenNumbers(choices.bands, oifits.wavelengths.length, 'bands');
  const channels = chooseChannels(oifits, bands, choices);
  const { frequencyHz, bandwidthHz } = middleFrequency(oifits, bands, channels, source.name);
  const { stations, namesIn } = namedStations(tables);
  const out = leftOut([...stations.keys()], choices);
  const wavelengthMetres = LIGHT_SPEED / frequencyHz;
  const index = new Map([...stations.keys()].map((name, k) => [name, k]));
  const setting = { target, bands, channels, index, namesIn, out, wavelengthMetres };
  const { records, tally, rows } = readTables(oifits, tables, setting, choices);
  const place = `${source.name}, UCOORD and VCOORD`;
  if (records.count > 0) requirePlausible(longestOf(records), undefined, place);
  const { name, raDegrees, decDegrees, equinox } = oifits.targets[target];
  const facts = { place, wavelengthMetres, statedJ2000: equinox === 2000 };
  const list = [...stations.values()];
  const verdict = checkOurs(records, list, { raDegrees, decDegrees }, choices, facts);
  const normalised = tables.some((vis) => vis.amplitudeType !== 'correlated flux');
  const remark = oifits.primary.first.get('REMARK')?.value;
  return {
    format: 'oifits',
    target: { name, raDegrees, decDegrees },
    arrayName: tables[0].array?.name ?? 'unnamed',
    remark: typeof remark === 'string' ? remark : '',
    stations: list,
    wavelengthMetres,
    bandwidthMetres: (wavelengthMetres / frequencyHz) * bandwidthHz,
    rows,
    records,
    tally,
    polarisation: 'as the file holds it',
    bands: bands.map((band) => band + 1),
    channels: channels.map((channel) => channel + 1),
    hands: null,
    leftOut: [...out],
    uv: verdict.agreement,
    warnings: [
      ...unitless(tables),
      ...(normalised ? ['The visibilities are normalised: a total flux of 1 is written as 1 Jy.'] : []),
      ...unusedOptical(oifits),
      ...correlationsUnused(oifits.others),
      ...withoutPosition(list),
      ...verdict.warnings,
    ],
  };
}

function unitless(tables: readonly OiVis[]): string[] {
  return tables
    .filter(({ amplitudeType, unit }) => amplitudeType === 'correlated flux' && unit.trim() === '')
    .map(({ place }) => `The correlated fluxes of ${place} have no unit: they are taken for Jy.`);
}

function unusedOptical({ vis2, t3 }: Oifits): string[] {
  if (vis2.length + t3.length === 0) return [];
  return [
    `${vis2.length} OI_VIS2 and ${t3.length} OI_T3 are left out: the complex visibilities of OI_VIS hold what they say.`,
  ];
}

/** Whether amplitudes and phases are of the source alone, not relative to other channels. */
function isReferred({ amplitudeType, phaseType }: OiVis): boolean {
  return ['absolute', 'correlated flux'].includes(amplitudeType) && phaseType === 'absolute';
}

function requireVis(oifits: Oifits, source: ByteSource): readonly OiVis[] {
  if (oifits.vis.length === 0) {
    throw new InputProblem({
      code: 'no-complex-visibilities',
      place: source.name,
      expected: 'a table OI_VIS, OI_VIS2 or OI_T3',
      found: `${oifits.flux.length} OI_FLUX and no data of baselines`,
      advice: 'Give a file with visibilities.',
    });
  }
  const odd = oifits.vis.find((table) => !isReferred(table));
  if (odd === undefined) return oifits.vis;
  throw new InputProblem({
    code: 'no-complex-visibilities',
    place: odd.place,
    expected: 'AMPTYP absolute or correlated flux, and PHITYP absolute',
    found: `AMPTYP ${odd.amplitudeType}, PHITYP ${odd.phaseType}`,
    advice: 'Differential amplitudes and phases lack their reference: give a file with absolute ones.',
  });
}

function chooseTarget(oifits: Oifits, wanted: string | undefined, place: string): number {
  const names = oifits.targets.map((target) => target.name);
  const at = wanted === undefined ? 0 : names.indexOf(wanted);
  const isOne = wanted === undefined ? names.length === 1 : at === names.lastIndexOf(wanted);
  if (at >= 0 && isOne) {
    requirePosition(oifits.targets[at], place);
    return at;
  }
  throw new InputProblem({
    code: 'several-targets',
    place: `${place}, OI_TARGET`,
    expected:
      wanted === undefined ? 'one target, or the parameter target' : `${JSON.stringify(wanted)}, once`,
    found: names.join(', '),
    advice: 'Choose one with the parameter target.',
  });
}

function requirePosition({ raDegrees, decDegrees }: Oifits['targets'][number], place: string): void {
  if (Math.abs(raDegrees) <= 360 && Math.abs(decDegrees) <= 90) return;
  throw new InputProblem({
    code: 'no-position',
    place: `${place}, OI_TARGET`,
    expected: "the target's RAEP0 and DECEP0 in degrees",
    found: `${raDegrees}, ${decDegrees}`,
    advice: 'Correct the table with the program that wrote the file.',
  });
}

function chooseChannels(oifits: Oifits, bands: readonly number[], choices: Choices): number[] {
  const counts = bands.map((band) => oifits.wavelengths[band].wavelengths.length);
  const count = choices.channels === undefined ? Math.max(...counts) : Math.min(...counts);
  return chosenNumbers(choices.channels, count, 'channels');
}

function middleFrequency(
  oifits: Oifits,
  bands: readonly number[],
  channels: readonly number[],
  place: string,
) {
  const frequencies: number[] = [];
  const widths: number[] = [];
  for (const band of bands) {
    const { wavelengths, bandwidths } = oifits.wavelengths[band];
    for (const channel of channels) {
      const wavelength = wavelengths[channel];
      if (wavelength === undefined) continue;
      const width = bandwidths[channel];
      frequencies.push(LIGHT_SPEED / wavelength);
      widths.push(width > 0 && Number.isFinite(width) ? (LIGHT_SPEED / wavelength / wavelength) * width : 0);
    }
  }
  return middleOf(frequencies, widths, `${place}, OI_WAVELENGTH`);
}

interface Setting {
  readonly target: number;
  readonly bands: readonly number[];
  readonly channels: readonly number[];
  /** Of a station by its name. */
  readonly index: ReadonlyMap<string, number>;
  readonly namesIn: NamedStations['namesIn'];
  readonly out: ReadonlySet<string>;
  readonly wavelengthMetres: number;
}

function readTables(oifits: Oifits, tables: readonly OiVis[], setting: Setting, choices: Choices) {
  const chosen = tables.filter((vis) => setting.bands.includes(oifits.wavelengths.indexOf(vis.wavelength)));
  const rows = chosen.reduce((sum, vis) => sum + vis.rows, 0);
  const records = makeRecords(rows);
  const tally = makeTally();
  const first = chosen.find((vis) => vis.rows > 0);
  const isChosen = timeRange(choices, first?.mjd[0] ?? 0);
  for (const vis of chosen) readTable(vis, setting, isChosen, records, tally);
  return { records, tally, rows };
}

function readTable(
  vis: OiVis,
  setting: Setting,
  isChosen: (mjd: number) => boolean,
  records: Records,
  tally: Tally,
): void {
  const channels = setting.channels.filter((channel) => channel < vis.channels);
  const toJy = vis.amplitudeType === 'correlated flux' ? convert(1, vis.unit || 'Jy', 'Jy') : 1;
  const nameOf = setting.namesIn(vis);
  for (let row = 0; row < vis.rows; row++) {
    if (vis.target[row] !== setting.target) continue;
    tally.read += channels.length;
    const [name1, name2] = [nameOf(2 * row), nameOf(2 * row + 1)];
    const place = vis.u[row] + vis.v[row] + vis.mjd[row];
    if (setting.out.has(name1) || setting.out.has(name2)) drop(tally, 'station left out', channels.length);
    else if (name1 === name2) drop(tally, 'autocorrelation', channels.length);
    else if (!Number.isFinite(place)) drop(tally, 'coordinates or time not finite', channels.length);
    else if (!isChosen(vis.mjd[row])) drop(tally, 'time not chosen', channels.length);
    else {
      const sum = combine(vis, row, channels, toJy, tally);
      if (sum.samples === 0) continue;
      addRecord(records, {
        station1: setting.index.get(name1) as number,
        station2: setting.index.get(name2) as number,
        timeMjd: vis.mjd[row],
        integrationSeconds: vis.integrationSeconds[row],
        u: vis.u[row] / setting.wavelengthMetres,
        v: vis.v[row] / setting.wavelengthMetres,
        ...sum,
      });
    }
  }
}

/** Weighted mean over the channels of one row. */
function combine(vis: OiVis, row: number, channels: readonly number[], toJy: number, tally: Tally) {
  const sum = { re: 0, im: 0, weight: 0, samples: 0 };
  for (const channel of channels) {
    const at = row * vis.channels + channel;
    const amplitude = vis.amplitude[at] * toJy;
    const phase = vis.phaseDegrees[at] * DEGREE;
    const weight = weightOfSigma(vis.amplitudeError[at] * toJy);
    const fault = vis.flag[at] !== 0 ? 'flagged in the file' : faultOf(amplitude, phase, weight);
    if (fault !== undefined) {
      drop(tally, fault, 1);
      continue;
    }
    sum.re += weight * amplitude * cos(phase);
    sum.im += weight * amplitude * sin(phase);
    sum.weight += weight;
    sum.samples++;
  }
  if (sum.samples > 0) {
    sum.re /= sum.weight;
    sum.im /= sum.weight;
  }
  return sum;
}
