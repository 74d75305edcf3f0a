/** From OIFITS without usable complex visibilities: squared visibilities and triple products as they stand, as optical
 *  interferometers give them. Nothing is averaged: every time and wavelength is a scan of its own, in which triples are
 *  told to be independent or not. (u,v) are in the wavelength of each channel. Source of the quantities: Duvert, Young &
 *  Hummel 2017, A&A 597, A8. */

import type { ByteSource } from '../bytes.ts';
import type { SquaredVisibilities, Station, TripleProducts } from '../data.ts';
import type { OiData, Oifits, OiT3, OiVis2, OiWavelength } from '../formats/oifits-types.ts';
import { weightOfSigma } from '../formats/visibility-table.ts';
import type { Choices } from './choices.ts';
import { type NamedStations, namedStations } from './oifits-stations.ts';
import { drop, faultOf, makeRecords, makeTally, type Observation, type Tally } from './records.ts';
import { chosenNumbers, leftOut, timeRange } from './select.ts';

const DEGREE = Math.PI / 180;
/** Tables of one exposure may differ so much in time, days: a tenth of a second. */
const SAME_TIME = 1e-6;

/** One channel of one row that passed what both sorts of table share. */
interface Place {
  /** Stations of the row. */
  readonly stations: readonly number[];
  readonly mjd: number;
  readonly wavelength: number;
  /** Place of the channel in the columns of data. */
  readonly at: number;
  readonly row: number;
  /** What makes a scan. */
  readonly moment: string;
}

interface Square extends Place {
  readonly table: OiVis2;
}

interface Triple extends Place {
  readonly table: OiT3;
}

/** @param target  its index  @throws InputProblem for stations, bands or channels that the file does not have */
export function observationOfOptical(
  oifits: Oifits,
  source: ByteSource,
  target: number,
  choices: Choices,
): Observation {
  const bands = chosenNumbers(choices.bands, oifits.wavelengths.length, 'bands');
  const isOfBand = ({ wavelength }: OiData) => bands.includes(oifits.wavelengths.indexOf(wavelength));
  const [vis2, t3] = [oifits.vis2.filter(isOfBand), oifits.t3.filter(isOfBand)];
  const channels = channelsOf(
    bands.map((band) => oifits.wavelengths[band]),
    choices,
  );
  const { stations: byName, namesIn } = namedStations([...vis2, ...t3]);
  const names = [...byName.keys()];
  const reading = {
    target,
    channels,
    index: new Map(names.map((each, k) => [each, k])),
    namesIn,
    out: leftOut(names, choices),
    isChosen: timeRange(choices, [...vis2, ...t3].find(({ rows }) => rows > 0)?.mjd[0] ?? 0),
    tally: makeTally(),
    seen: new Set<string>(),
  };
  const squares = vis2.flatMap((table) => squaresOf(table, reading));
  const triples = t3.flatMap((table) => triplesOf(table, reading));
  const scans = scansOf([...squares, ...triples]);
  const waves = [...squares, ...triples].map(({ wavelength }) => wavelength);
  const [least, most] = [smallest(waves), -smallest(waves.map((wave) => -wave))];
  const { name, raDegrees, decDegrees } = oifits.targets[target];
  return {
    format: 'oifits',
    target: { name, raDegrees, decDegrees },
    arrayName: [...vis2, ...t3].find(({ array }) => array !== undefined)?.array?.name ?? 'unnamed',
    remark: remarkOf(oifits),
    stations: names.map((each): Station => ({ name: each, xyz: [0, 0, 0] })),
    wavelengthMetres: waves.length === 0 ? 1 : (least + most) / 2,
    bandwidthMetres: waves.length === 0 ? 0 : most - least,
    rows: [...vis2, ...t3].reduce((sum, { rows }) => sum + rows, 0),
    records: makeRecords(0),
    tally: reading.tally,
    polarisation: 'as the file holds it',
    bands: bands.map((band) => band + 1),
    channels: channels.map((channel) => channel + 1),
    hands: null,
    leftOut: [...reading.out],
    uv: {
      checked: false,
      largest: null,
      rms: null,
      rows: 0,
      finding: 'not checked: optical data',
      applied: 'taken as the format counts them',
    },
    optical: { squared: squaredColumns(squares, scans), triples: tripleColumns(triples, scans) },
    warnings: warningsOf(oifits, source.name),
  };
}

function smallest(values: readonly number[]): number {
  return values.reduce((a, b) => Math.min(a, b), Number.POSITIVE_INFINITY);
}

function remarkOf({ primary }: Oifits): string {
  const remark = primary.first.get('REMARK')?.value;
  return typeof remark === 'string' ? remark : '';
}

export function correlationsUnused(extnames: readonly string[]): string[] {
  return extnames.includes('OI_CORR')
    ? ['The correlations in OI_CORR are not used: errors count as independent.']
    : [];
}

function warningsOf({ vis, others }: Oifits, place: string): string[] {
  return [
    'The file has squared visibilities and triple products: fit `squared-visibilities`, `triple-phases`, `triple-amplitudes`. They are normalised: a total flux of 1 is written as 1 Jy.',
    ...(vis.length > 0
      ? [`${vis.length} OI_VIS of ${place} are left out: their amplitudes or phases lack a reference.`]
      : []),
    ...correlationsUnused(others),
  ];
}

function channelsOf(bands: readonly OiWavelength[], choices: Choices): number[] {
  const counts = bands.map(({ wavelengths }) => wavelengths.length);
  const count = choices.channels === undefined ? Math.max(0, ...counts) : Math.min(...counts);
  return chosenNumbers(choices.channels, count, 'channels');
}

interface Reading {
  readonly target: number;
  readonly channels: readonly number[];
  readonly index: ReadonlyMap<string, number>;
  readonly namesIn: NamedStations['namesIn'];
  readonly out: ReadonlySet<string>;
  readonly isChosen: (mjd: number) => boolean;
  readonly tally: Tally;
  /** Rows read so far: times, stations and wavelengths. */
  readonly seen: Set<string>;
}

function squaresOf(table: OiVis2, reading: Reading): Square[] {
  const isPlaced = (row: number) => Number.isFinite(table.u[row] + table.v[row]);
  return placesOf(table, 2, reading, isPlaced)
    .filter(({ at }) => isUsable(table.squared[at], table.squaredError[at], reading.tally))
    .map((place) => ({ ...place, table }));
}

function triplesOf(table: OiT3, reading: Reading): Triple[] {
  const { u1, v1, u2, v2, phaseDegrees, phaseErrorDegrees, amplitude, amplitudeError } = table;
  const isPlaced = (row: number) => Number.isFinite(u1[row] + v1[row] + u2[row] + v2[row]);
  const silent = makeTally();
  // A product without amplitude still has a phase, and the other way round.
  const hasAmplitude = (at: number) => isUsable(amplitude[at], amplitudeError[at], silent);
  return placesOf(table, 3, reading, isPlaced)
    .filter(({ at }) => hasAmplitude(at) || isUsable(phaseDegrees[at], phaseErrorDegrees[at], reading.tally))
    .map((place) => ({ ...place, table }));
}

/** Whether a value may be used; counts why not. */
function isUsable(value: number, error: number, tally: Tally): boolean {
  const fault = faultOf(value, 0, weightOfSigma(error));
  if (fault !== undefined) drop(tally, fault, 1);
  return fault === undefined;
}

/** Channels of rows of the target that are neither flagged nor left out. */
function placesOf(
  table: OiData,
  perRow: number,
  { target, channels, index, namesIn, out, isChosen, tally, seen }: Reading,
  isPlaced: (row: number) => boolean,
): Place[] {
  const own = channels.filter((channel) => channel < table.channels);
  const nameOf = namesIn(table);
  const places: Place[] = [];
  for (let row = 0; row < table.rows; row++) {
    if (table.target[row] !== target) continue;
    const names = Array.from({ length: perRow }, (_, k) => nameOf(perRow * row + k));
    const time = Math.round(table.mjd[row] / SAME_TIME);
    const key = `${time} ${table.wavelength.name} ${[...names].sort()}`;
    tally.read += own.length;
    if (names.some((name) => out.has(name))) drop(tally, 'station left out', own.length);
    else if (new Set(names).size < perRow) drop(tally, 'autocorrelation', own.length);
    else if (!(isPlaced(row) && Number.isFinite(time)))
      drop(tally, 'coordinates or time not finite', own.length);
    else if (!isChosen(table.mjd[row])) drop(tally, 'time not chosen', own.length);
    else if (seen.has(key)) drop(tally, 'row doubled', own.length);
    else {
      const isFlagged = (channel: number) => table.flag[row * table.channels + channel] !== 0;
      drop(tally, 'flagged in the file', own.filter(isFlagged).length);
      for (const channel of own) {
        if (isFlagged(channel)) continue;
        places.push({
          stations: names.map((name) => index.get(name) as number),
          mjd: table.mjd[row],
          wavelength: table.wavelength.wavelengths[channel],
          at: row * table.channels + channel,
          row,
          moment: `${time} ${table.wavelength.name} ${channel}`,
        });
      }
      seen.add(key);
    }
  }
  return places;
}

/** Numbers of the moments, rising with time and then with wavelength. */
function scansOf(places: readonly Place[]): ReadonlyMap<string, number> {
  const moments = new Map<string, Place>();
  for (const place of places) if (!moments.has(place.moment)) moments.set(place.moment, place);
  const sorted = [...moments.values()].sort(
    (a, b) =>
      Math.round(a.mjd / SAME_TIME) - Math.round(b.mjd / SAME_TIME) ||
      a.wavelength - b.wavelength ||
      (a.moment < b.moment ? -1 : 1),
  );
  return new Map(sorted.map(({ moment }, scan) => [moment, scan]));
}

function squaredColumns(squares: readonly Square[], scans: ReadonlyMap<string, number>): SquaredVisibilities {
  const { whole, real } = columnsOf(inOrder(squares, scans));
  return {
    count: squares.length,
    station1: whole(({ stations }) => stations[0]),
    station2: whole(({ stations }) => stations[1]),
    scan: whole(({ moment }) => scans.get(moment) as number),
    timeMjd: real(({ mjd }) => mjd),
    u: real(({ table, row, wavelength }) => table.u[row] / wavelength),
    v: real(({ table, row, wavelength }) => table.v[row] / wavelength),
    value: real(({ table, at }) => table.squared[at]),
    sigma: real(({ table, at }) => table.squaredError[at]),
  };
}

function tripleColumns(triples: readonly Triple[], scans: ReadonlyMap<string, number>): TripleProducts {
  const { whole, real } = columnsOf(inOrder(triples, scans));
  const silent = makeTally();
  const hasPhase = ({ table, at }: Triple) =>
    isUsable(table.phaseDegrees[at], table.phaseErrorDegrees[at], silent);
  const hasAmplitude = ({ table, at }: Triple) =>
    isUsable(table.amplitude[at], table.amplitudeError[at], silent);
  return {
    count: triples.length,
    station1: whole(({ stations }) => stations[0]),
    station2: whole(({ stations }) => stations[1]),
    station3: whole(({ stations }) => stations[2]),
    scan: whole(({ moment }) => scans.get(moment) as number),
    timeMjd: real(({ mjd }) => mjd),
    u1: real(({ table, row, wavelength }) => table.u1[row] / wavelength),
    v1: real(({ table, row, wavelength }) => table.v1[row] / wavelength),
    u2: real(({ table, row, wavelength }) => table.u2[row] / wavelength),
    v2: real(({ table, row, wavelength }) => table.v2[row] / wavelength),
    amplitude: real((each) => (hasAmplitude(each) ? each.table.amplitude[each.at] : 0)),
    sigmaAmplitude: real((each) =>
      hasAmplitude(each) ? each.table.amplitudeError[each.at] : Number.POSITIVE_INFINITY,
    ),
    phase: real((each) => (hasPhase(each) ? each.table.phaseDegrees[each.at] * DEGREE : 0)),
    sigmaPhase: real((each) =>
      hasPhase(each) ? each.table.phaseErrorDegrees[each.at] * DEGREE : Number.POSITIVE_INFINITY,
    ),
  };
}

/** By scan, then by stations: the order of rows in a file has no influence. */
function inOrder<P extends Place>(places: readonly P[], scans: ReadonlyMap<string, number>): P[] {
  const scanOf = ({ moment }: P) => scans.get(moment) as number;
  const byStations = (a: P, b: P) =>
    a.stations.reduce((order, station, k) => order || station - b.stations[k], 0);
  return [...places].sort((a, b) => scanOf(a) - scanOf(b) || byStations(a, b));
}

function columnsOf<P>(places: readonly P[]) {
  return {
    whole: (value: (place: P) => number) => Int32Array.from(places, value),
    real: (value: (place: P) => number) => Float64Array.from(places, value),
  };
}
