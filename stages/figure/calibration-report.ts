/** Reads of a calibration report what its figure shows: every finding with its limits, and gains by scan. */

import { z } from 'zod';
import type { ByteSource } from '../bytes.ts';
import { readDocument } from '../formats/document.ts';
import { median } from '../numerics/statistics.ts';
import { ADVICE } from './findings.ts';

const numbers = z.array(z.number());

const reportSchema = z.object({
  findings: z.array(
    z.object({
      check: z.string(),
      finding: z.enum(['within limits', 'marginal', 'out of limits']),
      value: z.number(),
      marginal: z.number(),
      limit: z.number(),
    }),
  ),
  gainRatios: z
    .array(z.object({ stations: z.array(z.string()), scans: numbers, logRatio: numbers, sigma: numbers }))
    .optional(),
  gainsOverTime: z
    .array(z.object({ station: z.string(), scans: numbers, logGain: numbers, deviations: numbers }))
    .optional(),
});

export type DrawnFinding = z.infer<typeof reportSchema>['findings'][number];

/** Log gains of one station, or of one over another, less their median. */
export interface GainLane {
  readonly name: string;
  readonly scans: readonly number[];
  readonly logGain: readonly number[];
  readonly sigma: readonly number[];
}

export interface CalibrationReport {
  readonly findings: readonly DrawnFinding[];
  /** Of the fit where the report has them, else ratios of co-located stations. */
  readonly lanes: readonly GainLane[];
  readonly lanesAre: 'gains of the fit' | 'gain ratios of co-located stations';
}

/** Reads a report. @throws InputProblem when it is none */
export function readCalibration(source: ByteSource): CalibrationReport {
  const expected = 'a report with findings and their limits, as the calibration check writes it';
  const { findings, gainRatios = [], gainsOverTime } = readDocument(reportSchema, source, expected, ADVICE);
  const lanes =
    gainsOverTime?.map(({ station, scans, logGain, deviations }) =>
      laneOf(station, scans, logGain, deviations),
    ) ??
    gainRatios.map(({ stations, scans, logRatio, sigma }) =>
      laneOf(stations.join(' over '), scans, logRatio, sigma),
    );
  return {
    findings,
    lanes: lanes.filter(({ scans }) => scans.length > 0),
    lanesAre: gainsOverTime ? 'gains of the fit' : 'gain ratios of co-located stations',
  };
}

function laneOf(
  name: string,
  scans: readonly number[],
  logGain: readonly number[],
  sigma: readonly number[],
): GainLane {
  const middle = logGain.length === 0 ? 0 : median(logGain);
  return { name, scans, logGain: logGain.map((value) => value - middle), sigma };
}
