/** The computation of `ingest`: finds out what the data are, reads them, averages them, writes visibilities and report. */

import type { ByteSource } from '../bytes.ts';
import type { Visibilities } from '../data.ts';
import { listHdus, verifyChecksums } from '../formats/fits/hdu.ts';
import { writeJson } from '../formats/json.ts';
import { writeVisibilities } from '../formats/visibilities-write.ts';
import type { Finding, StageReport, StageTask } from '../kind.ts';
import { InputProblem } from '../problem.ts';
import { type AveragingResult, average } from './averaging.ts';
import { type Choices, choicesOf } from './choices.ts';
import { observationOfOifits } from './from-oifits.ts';
import { observationOfTable } from './from-table.ts';
import { observationOfUvGroups } from './from-uv-groups.ts';
import { kept, type Observation, REASONS, stationsInRows } from './records.ts';
import { reportOf } from './report.ts';
import { findScans } from './scans.ts';
import { GOOD_AGREEMENT, POOR_AGREEMENT } from './uv-agreement.ts';

/** Reads `data`, writes `visibilities` and `report`. @throws InputProblem */
export function compute(task: StageTask): StageReport {
  const choices = choicesOf(task.parameters);
  const observation = observe(task.inputs.data[0], choices);
  task.note('read', { format: observation.format, rows: observation.rows });
  requireDates(observation);
  task.progress(0.6);
  const timetable = findScans(observation.records, choices.gap, choices.averaging);
  const result = average(observation.records, timetable, choices, observation.tally);
  requireSome(observation, result);
  const present = presentStations(observation, result);
  const warnings = [...observation.warnings, ...warningsOf(observation, result)];
  task.progress(0.9);
  writeVisibilities(task.outputs.visibilities, visibilitiesOf(observation, result, present));
  writeJson(task.outputs.report, reportOf(observation, timetable, result, present, choices, warnings));
  task.note('averaged', { scans: timetable.scans.length, visibilities: result.averages.count });
  task.progress(1);
  const exchanged = (observation.uv.exchanged ?? []).map((k) => observation.stations[k].name);
  const stop =
    exchanged.length === 0
      ? {}
      : { stop: `The antenna table has ${exchanged.join(' and ')} exchanged: correct their positions.` };
  return { findings: findingsOf(observation), warnings, ...stop };
}

/** Tells the format from the content and reads it. */
function observe(source: ByteSource, choices: Choices): Observation {
  if (!isFits(source)) return observationOfTable(source, choices);
  const hdus = listHdus(source);
  if (hdus[0].kind === 'groups') {
    if (choices.checksums === 'verify') for (const hdu of hdus) verifyChecksums(source, hdu);
    return observationOfUvGroups(source, hdus, choices);
  }
  if (hdus.some((hdu) => hdu.extname.startsWith('OI_'))) return observationOfOifits(source, choices);
  throw new InputProblem({
    code: 'no-visibilities',
    place: source.name,
    expected: 'a FITS file with random groups (uv data) or with tables of OIFITS',
    found: `HDUs ${hdus.map((hdu) => hdu.extname || hdu.kind).join(', ')}`,
    advice: 'Give observed visibilities.',
  });
}

function isFits(source: ByteSource): boolean {
  const mark = 'SIMPLE  =';
  return source.size >= mark.length && Buffer.from(source.read(0, mark.length)).toString('latin1') === mark;
}

/** Seconds. A time mark at the start of a 10 s record instead of its middle makes 5 s. */
const MARGINAL_CLOCK = 0.3;
const LARGEST_CLOCK = 0.95;

/** MJD of the year 4596: beyond it, or before 1858, a time is no date of an observation. */
const LATEST_MJD = 1e6;

function requireDates({ records }: Observation): void {
  for (let k = 0; k < records.count; k++) {
    const mjd = records.timeMjd[k];
    if (mjd >= 0 && mjd <= LATEST_MJD) continue;
    throw new InputProblem({
      code: 'bad-time',
      place: 'input data',
      expected: `times as MJD from 0 to ${LATEST_MJD}`,
      found: `MJD ${mjd}`,
      advice: 'Check the unit of the times (JD or MJD) and what they count from.',
    });
  }
}

function requireSome({ tally, optical }: Observation, { averages }: AveragingResult): void {
  if (averages.count + (optical?.squared.count ?? 0) + (optical?.triples.count ?? 0) > 0) return;
  const reasons = REASONS.filter((reason) => tally.dropped.has(reason));
  throw new InputProblem({
    code: 'nothing-left',
    place: 'input data',
    expected: 'at least one visibility that may be used',
    found: `${tally.read} samples, dropped: ${reasons.map((reason) => `${reason} ${tally.dropped.get(reason)}`).join(', ') || 'none'}`,
    advice: 'Check the data, and the parameters that leave some out.',
  });
}

function presentStations({ optical }: Observation, { averages }: AveragingResult): ReadonlySet<number> {
  return new Set(stationsInRows(averages, optical).flatMap((column) => [...column]));
}

function warningsOf(observation: Observation, { crowded }: AveragingResult): string[] {
  const { tally, hands } = observation;
  const warnings: string[] = [];
  if (crowded > 0) {
    warnings.push(
      `${crowded} rows share baseline and time with another row of other content; both were averaged.`,
    );
  }
  if (kept(tally) * 2 < tally.read) {
    warnings.push(`Fewer than half of the samples are kept: ${kept(tally)} of ${tally.read}.`);
  }
  if (hands !== null && hands.one > 0 && hands.both > 0) {
    warnings.push(
      `Stokes I rests on one hand alone in ${hands.one} of ${hands.one + hands.both} rows: circular (or linear) polarisation would show in these only.`,
    );
  }
  return warnings;
}

/** Only stations that have data, in the order of the file's table. */
function visibilitiesOf(
  observation: Observation,
  { averages }: AveragingResult,
  present: ReadonlySet<number>,
): Visibilities {
  const { count } = averages;
  const used = [...present].sort((a, b) => a - b);
  const place = new Map(used.map((station, k) => [station, k]));
  const placesOf = (stations: Int32Array) => stations.map((station) => place.get(station) as number);
  const amplitude = (k: number) =>
    Math.sqrt(averages.re[k] * averages.re[k] + averages.im[k] * averages.im[k]);
  return {
    target: observation.target,
    arrayName: observation.arrayName,
    remark: observation.remark,
    stations: used.map((station) => observation.stations[station]),
    wavelengthMetres: observation.wavelengthMetres,
    bandwidthMetres: observation.bandwidthMetres,
    count,
    station1: placesOf(averages.station1.slice(0, count)),
    station2: placesOf(averages.station2.slice(0, count)),
    scan: averages.interval.slice(0, count),
    timeMjd: averages.timeMjd.slice(0, count),
    integrationSeconds: averages.integrationSeconds.slice(0, count),
    u: averages.u.slice(0, count),
    v: averages.v.slice(0, count),
    re: averages.re.slice(0, count),
    im: averages.im.slice(0, count),
    sigma: averages.sigma.slice(0, count),
    sigmaPhase: averages.sigma.slice(0, count).map((sigma, k) => Math.min(Math.PI, sigma / amplitude(k))),
    ...opticalOf(observation, placesOf),
  };
}

/** Optical data with stations numbered anew. */
function opticalOf(
  { optical }: Observation,
  placesOf: (stations: Int32Array) => Int32Array,
): Pick<Visibilities, 'squared' | 'triples'> {
  if (optical === undefined) return {};
  const { squared, triples } = optical;
  const pair = ({ station1, station2 }: { station1: Int32Array; station2: Int32Array }) => ({
    station1: placesOf(station1),
    station2: placesOf(station2),
  });
  return {
    ...(squared.count > 0 ? { squared: { ...squared, ...pair(squared) } } : {}),
    ...(triples.count > 0
      ? { triples: { ...triples, ...pair(triples), station3: placesOf(triples.station3) } }
      : {}),
  };
}

function findingsOf({ uv, stations }: Observation): Finding[] {
  if (uv.largest === null) return [];
  const names = (uv.exchanged ?? []).map((k) => stations[k].name);
  const detail =
    names.length === 0
      ? `Largest difference over the longest baseline, ${uv.rows} rows: ${uv.finding}.`
      : `Largest difference over the longest baseline, ${uv.rows} rows: they agree once the positions of ${names.join(' and ')} are exchanged.`;
  const agreement: Finding = {
    check: 'u and v against station positions',
    finding: judged(uv.largest, GOOD_AGREEMENT, POOR_AGREEMENT),
    value: uv.largest,
    marginal: GOOD_AGREEMENT,
    limit: POOR_AGREEMENT,
    detail,
  };
  return uv.clock ? [agreement, clockFinding(uv.clock)] : [agreement];
}

/** Times against (u,v). What is below 0.9 s may be the difference of UT1 and UTC, which the file need not know. */
function clockFinding({ seconds, error }: { readonly seconds: number; readonly error: number }): Finding {
  const value = Math.abs(seconds);
  const late = seconds < 0 ? 'late' : 'early';
  return {
    check: 'clock',
    // An offset that its own error explains is none.
    finding: judged(value > 4 * error ? value : 0, MARGINAL_CLOCK, LARGEST_CLOCK),
    value,
    marginal: MARGINAL_CLOCK,
    limit: LARGEST_CLOCK,
    detail: `Seconds by which the times of all stations are ${late} for their (u,v): ${seconds.toFixed(3)} ± ${error.toFixed(3)}.`,
  };
}

function judged(value: number, marginal: number, limit: number): Finding['finding'] {
  return value <= marginal ? 'within limits' : value <= limit ? 'marginal' : 'out of limits';
}
