/** The computation of `simulate`: truth, tracks, errors, files. */

import type { ByteSource } from '../bytes.ts';
import type { SkyImage } from '../data.ts';
import { writeNumbers } from '../formats/json.ts';
import { readSkyImage, writeSkyImage } from '../formats/sky-image.ts';
import { type UvWriteRequest, writeUvGroups } from '../formats/uv-groups-write.ts';
import type { StageReport, StageTask } from '../kind.ts';
import { visibilitiesOfModel } from '../numerics/models.ts';
import { ellipticalGaussian } from '../numerics/named-models.ts';
import { julianDateOfMjd, SIDEREAL_DEGREES_PER_DAY } from '../numerics/time.ts';
import { InputProblem } from '../problem.ts';
import { type Hands, observe } from './errors.ts';
import { parameterProblem, readParameters, type Simulation } from './parameters.ts';
import { layTracks, type Tracks } from './tracks.ts';
import { measureTruth, type Truth, truthOfImage, truthOfRing } from './truth.ts';

const REMARK = 'Invented data: a simulated observation, nothing was observed.';

export function compute(task: StageTask): StageReport {
  const simulation = readParameters(task.parameters);
  const truth = chooseTruth(simulation, task.inputs.image?.[0]);
  const numbers = measureTruth(truth, simulation.resolution, REMARK);
  const tracks = layTracks(simulation);
  requireRows(tracks);
  task.note('tracks laid', { rows: tracks.count, scans: tracks.scans });
  task.progress(0.2);
  const { re, im } = trueVisibilities(simulation, truth, tracks);
  task.progress(0.6);
  const hands = observe(simulation, tracks, re, im);
  writeUvGroups(task.outputs.data, uvRequest(simulation, tracks, hands));
  writeNumbers(task.outputs.truth, numbers);
  writeSkyImage(task.outputs.image, truth.image, [
    ['OBJECT', simulation.target.name],
    ['REMARK', REMARK],
  ]);
  return { warnings: warningsOf(simulation, tracks) };
}

function chooseTruth(simulation: Simulation, source: ByteSource | undefined): Truth {
  if ((source === undefined) === (simulation.truth === undefined)) {
    throw parameterProblem(
      'truth',
      'either the input image or this parameter',
      source === undefined ? 'neither' : 'both',
      'Give the truth once.',
    );
  }
  if (simulation.truth !== undefined) return truthOfRing(simulation.truth);
  const image = readSkyImage(source as ByteSource);
  requireFlux(image, (source as ByteSource).name);
  return truthOfImage(image);
}

function requireFlux(image: SkyImage, name: string): void {
  const flux = image.pixels.reduce((sum, value) => sum + value, 0);
  if (!(flux > 0 && flux < Number.POSITIVE_INFINITY)) {
    throw new InputProblem({
      code: 'image',
      place: `${name}, pixels`,
      expected: 'finite values with a sum above 0 Jy',
      found: `a sum of ${flux}`,
      advice: 'A truth needs flux.',
    });
  }
}

function requireRows(tracks: Tracks): void {
  if (tracks.count > 0) return;
  throw parameterProblem(
    'start, duration, target, stations',
    'at least one scan with two stations above their elevation limits',
    `none in ${tracks.scans} scans`,
    'Move the start, or lower the limits.',
  );
}

/** Jy by row: truth and extended flux, without any error of the array. */
function trueVisibilities(simulation: Simulation, truth: Truth, tracks: Tracks) {
  // Random groups count baselines from station 2 to station 1, CONVENTIONS from 1 to 2.
  const u = tracks.u.map((seconds) => -seconds * simulation.frequency);
  const v = tracks.v.map((seconds) => -seconds * simulation.frequency);
  const re = new Float64Array(tracks.count);
  const im = new Float64Array(tracks.count);
  truth.visibilities(re, im, u, v);
  const { extended } = simulation;
  if (extended === undefined) return { re, im };
  const largeRe = new Float64Array(tracks.count);
  const largeIm = new Float64Array(tracks.count);
  visibilitiesOfModel(largeRe, largeIm, ellipticalGaussian(extended.fwhm), u, v);
  return { re: re.map((value, k) => value + extended.flux * largeRe[k]), im };
}

function uvRequest(simulation: Simulation, tracks: Tracks, hands: Hands): UvWriteRequest {
  const { station1, station2, u, v, w, count, gst0Degrees } = tracks;
  return {
    target: simulation.target,
    arrayName: simulation.array,
    remark: REMARK,
    frequencyHz: simulation.frequency,
    bandwidthHz: simulation.bandwidth,
    stations: writtenStations(simulation),
    referenceDate: julianDateOfMjd(Math.floor(simulation.startMjd)),
    gst0Degrees,
    degreesPerDay: SIDEREAL_DEGREES_PER_DAY,
    count,
    station1,
    station2,
    timeJd: tracks.timeMjd.map((mjd) => julianDateOfMjd(mjd + clockOffset(simulation) / 86400)),
    u,
    v,
    w,
    integrationSeconds: new Float64Array(count).fill(simulation.record),
    ...hands,
  };
}

/** Stations as the antenna table has them: two of them may be exchanged. */
function writtenStations({ stations, faults }: Simulation): Simulation['stations'] {
  let written = stations;
  for (const { fault, station, other } of faults) {
    if (fault !== 'stations-swapped') continue;
    const place = (name: string | undefined) => stations.find((each) => each.name === name)?.xyz;
    written = written.map((each) => {
      const from = each.name === station ? place(other) : each.name === other ? place(station) : undefined;
      return from === undefined ? each : { ...each, xyz: from };
    });
  }
  return written;
}

/** Seconds by which all times are late. */
function clockOffset({ faults }: Simulation): number {
  return faults.reduce((sum, { fault, value }) => (fault === 'clock-offset' ? sum + value : sum), 0);
}

function warningsOf({ stations }: Simulation, tracks: Tracks): string[] {
  const seen = new Set([...tracks.station1, ...tracks.station2]);
  return stations
    .filter((_, k) => !seen.has(k))
    .map(
      ({ name }) =>
        `Station ${name} never observes: the target stays below its elevation limit in every scan.`,
    );
}
