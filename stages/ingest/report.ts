/** The report of `ingest` as JSON: what was read, dropped and found. Numbers that cannot be had are null. */

import { median } from '../numerics/statistics.ts';
import type { AveragingResult } from './averaging.ts';
import { snrOf } from './averaging.ts';
import type { Choices } from './choices.ts';
import { kept, type Observation, type OpticalData, REASONS, stationsInRows } from './records.ts';
import type { Timetable } from './scans.ts';
import { LIGHT_SPEED } from './select.ts';

/** Loss of amplitude is judged on averages at least this strong: at 10 its own error is about a tenth over the root of
 *  the number of records. */
const STRONG = 10;

/** Builds the document. */
export function reportOf(
  observation: Observation,
  timetable: Timetable,
  result: AveragingResult,
  present: ReadonlySet<number>,
  choices: Choices,
  warnings: readonly string[],
): Record<string, unknown> {
  const { tally } = observation;
  const { averages } = result;
  const frequencyHz = LIGHT_SPEED / observation.wavelengthMetres;
  const dropped = REASONS.flatMap((reason) => {
    const count = tally.dropped.get(reason);
    return count === undefined ? [] : [[reason, count] as const];
  });
  return {
    format: observation.format,
    target: observation.target,
    array: observation.arrayName,
    remark: observation.remark,
    rows: observation.rows,
    samples: { read: tally.read, kept: kept(tally), dropped: Object.fromEntries(dropped) },
    chosen: {
      polarisation: observation.polarisation,
      bands: observation.bands,
      channels: observation.channels,
      frequencyHz,
      bandwidthHz: (observation.bandwidthMetres * frequencyHz) / observation.wavelengthMetres,
    },
    hands: observation.hands,
    stations: stationsOf(observation, present),
    uv: observation.uv,
    scans: scansOf(observation, timetable, result),
    averaged: {
      over: choices.averaging,
      visibilities: averages.count,
      baselinesDroppedAsIncomplete: result.incomplete,
      baselinesDroppedAsFaint: result.faint,
      medianSnr: middle(list(averages.count, (k) => snrOf(averages, k))),
    },
    ...(observation.optical === undefined ? {} : { optical: opticalOf(observation.optical) }),
    scatter: scatterOf(observation, timetable, result),
    coherence: coherenceOf(observation, timetable, result),
    warnings,
  };
}

/** How many measurements of each sort; a triple product may lack phase or amplitude. */
function opticalOf({ squared, triples }: OpticalData) {
  const finite = (errors: Float64Array) => errors.filter(Number.isFinite).length;
  return {
    moments: new Set([...squared.scan, ...triples.scan]).size,
    squaredVisibilities: squared.count,
    tripleProducts: triples.count,
    triplePhases: finite(triples.sigmaPhase),
    tripleAmplitudes: finite(triples.sigmaAmplitude),
  };
}

function stationsOf({ stations, leftOut, records, optical }: Observation, present: ReadonlySet<number>) {
  const rows = new Int32Array(stations.length);
  for (const column of stationsInRows(records, optical)) for (const station of column) rows[station]++;
  const absent = stations.filter((station, k) => !present.has(k) && !leftOut.includes(station.name));
  return {
    present: stations.flatMap(({ name }, k) => (present.has(k) ? [{ name, rows: rows[k] }] : [])),
    absent: absent.map((station) => station.name),
    leftOut,
  };
}

function scansOf(observation: Observation, timetable: Timetable, { averages }: AveragingResult) {
  return timetable.scans.map(({ first, last, startMjd, endMjd }, scan) => {
    const baselines = new Set<number>();
    const stations = new Set<number>();
    for (let k = 0; k < averages.count; k++) {
      if (timetable.scanOfInterval[averages.interval[k]] !== scan) continue;
      baselines.add(averages.station1[k] * observation.stations.length + averages.station2[k]);
      stations.add(averages.station1[k]).add(averages.station2[k]);
    }
    return {
      scan,
      startMjd,
      endMjd,
      records: last - first + 1,
      /** Numbers of the output's NS_SCAN that lie in this scan. */
      intervals: [timetable.intervalOf[first], timetable.intervalOf[last]],
      baselines: baselines.size,
      stations: stations.size,
    };
  });
}

/** Scatter of records inside an average over their stated noise. */
function scatterOf(observation: Observation, timetable: Timetable, { averages }: AveragingResult) {
  const judged = list(averages.count, (k) => k).filter((k) => averages.records[k] > 2);
  const values = judged.map((k) => averages.scatter[k]);
  return {
    definition:
      'reduced chi-square per real component of the records of one average about their mean, averages of three records or more; 1 when the stated noise is right',
    averages: judged.length,
    median: middle(values),
    worst: extreme(observation, timetable, averages, judged, averages.scatter),
    baselines: scatterByBaseline(observation, averages, judged),
  };
}

/** The same pooled over the scans of each baseline, with its degrees of freedom, 2 (n − 1) for n records. */
function scatterByBaseline(
  { stations }: Observation,
  averages: AveragingResult['averages'],
  judged: readonly number[],
) {
  const sums = new Map<string, { averages: number; degrees: number; chiSquare: number }>();
  for (const k of judged) {
    const baseline = `${stations[averages.station1[k]].name}–${stations[averages.station2[k]].name}`;
    const sum = sums.get(baseline) ?? { averages: 0, degrees: 0, chiSquare: 0 };
    const degrees = 2 * (averages.records[k] - 1);
    sum.averages++;
    sum.degrees += degrees;
    sum.chiSquare += degrees * averages.scatter[k];
    sums.set(baseline, sum);
  }
  return [...sums].map(([baseline, { averages: count, degrees, chiSquare }]) => ({
    baseline,
    averages: count,
    degrees,
    value: chiSquare / degrees,
  }));
}

function coherenceOf(observation: Observation, timetable: Timetable, { averages }: AveragingResult) {
  const judged = list(averages.count, (k) => k).filter(
    (k) => averages.records[k] > 2 && snrOf(averages, k) >= STRONG && !Number.isNaN(averages.loss[k]),
  );
  return {
    definition: `fraction of amplitude lost in a coherent average, against the debiased root mean square of its records, averages with a signal-to-noise ratio of ${STRONG} or more`,
    averages: judged.length,
    medianLoss: middle(judged.map((k) => averages.loss[k])),
    worst: extreme(observation, timetable, averages, judged, averages.loss),
  };
}

function extreme(
  { stations }: Observation,
  { scanOfInterval }: Timetable,
  averages: AveragingResult['averages'],
  judged: readonly number[],
  values: Float64Array,
) {
  if (judged.length === 0) return null;
  const k = judged.reduce((worst, each) => (values[each] > values[worst] ? each : worst));
  return {
    baseline: `${stations[averages.station1[k]].name}-${stations[averages.station2[k]].name}`,
    scan: scanOfInterval[averages.interval[k]],
    value: values[k],
    snr: snrOf(averages, k),
  };
}

function list(count: number, value: (k: number) => number): number[] {
  return Array.from({ length: count }, (_, k) => value(k));
}

function middle(values: readonly number[]): number | null {
  return values.length === 0 ? null : median(values);
}
