/** An invented array of eight stations at six sites over ten hours, and what the checks find in it with faults planted. */

import type { ByteSource } from '../../stages/bytes.ts';
import { memorySink, sourceOf } from '../../stages/bytes.ts';
import { calibrationCheck } from '../../stages/calibration-check/calibration-check.ts';
import type { Visibilities } from '../../stages/data.ts';
import { readVisibilities } from '../../stages/formats/visibilities.ts';
import { writeVisibilities } from '../../stages/formats/visibilities-write.ts';
import { ingest } from '../../stages/ingest/ingest.ts';
import type { Finding } from '../../stages/kind.ts';
import { simulate } from '../../stages/simulate/simulate.ts';
import { runKind } from './simulate-task.ts';

const station = (name: string, longitude: number, latitude: number) => ({
  name,
  longitude: `${longitude} deg`,
  latitude: `${latitude} deg`,
  height: '1000 m',
  sefd: '5000 Jy',
  gainError: 0.1,
  elevationLimit: '10 deg',
});

export const ARRAY = {
  target: { name: 'Lantern nucleus', ra: '180 deg', dec: '18 deg' },
  band: { frequency: '230 GHz', bandwidth: '2 GHz' },
  stations: [
    station('WICK-A', 20.5, -27.5),
    station('WICK-B', 20.51, -27.51),
    station('FLINT-A', -66.5, -28),
    station('FLINT-B', -66.52, -28.01),
    station('TALLOW', 36, 37.6),
    station('EMBER', -18.5, 64.8),
    station('GLIM', -48, 66.5),
    station('BEACON', -14, 28.6),
  ],
  start: '2031-03-10T20:30:00Z',
  duration: '10 h',
  record: '1 min',
  scan: '5 min',
  interval: '30 min',
  truth: {
    flux: '0.8 Jy',
    diameter: '46 uas',
    width: '14 uas',
    asymmetry: 0.2,
    positionAngle: '150 deg',
    field: '160 uas',
    pixels: 64,
  },
};

/** Observed and ingested. */
export async function observed(more: Record<string, unknown>) {
  const { outputs } = await runKind(simulate, { ...ARRAY, seed: 7, ...more });
  const ran = await runKind(ingest, {}, { data: [outputs.data] });
  return {
    visibilities: ran.outputs.visibilities,
    report: ran.outputs.report,
    findings: ran.report.findings ?? [],
    stop: ran.report.stop,
  };
}

export interface FalseAlarm {
  readonly check: string;
  readonly marginal: number;
  readonly outOfLimits: number;
  readonly asLarge: number;
}

/** What the calibration check says; `document` is its report. */
export async function checked(
  inputs: Readonly<Record<string, readonly ByteSource[]>>,
  written: Record<string, unknown> = {},
) {
  const { report, outputs } = await runKind(calibrationCheck, { outOfLimits: 'mark', ...written }, inputs);
  const document = jsonOf(outputs.report) as {
    falseAlarms: FalseAlarm[];
    errorBudget: Record<string, never>;
    trends: { sunDistanceDegrees: number };
    rows: { all: number; belowMinimumSnr: number };
  };
  return {
    findings: report.findings ?? [],
    warnings: report.warnings ?? [],
    document,
    outputs,
    finding: (name: string) => report.findings?.find(({ check }) => check === name) as Finding,
  };
}

export function jsonOf(source: ByteSource): unknown {
  return JSON.parse(new TextDecoder().decode(source.read(0, source.size)));
}

/** The visibilities of a source, changed, as a source again. */
export function changed(source: ByteSource, change: (data: Visibilities) => Visibilities): ByteSource {
  const sink = memorySink();
  writeVisibilities(sink, change(readVisibilities(source)));
  return sourceOf(sink.bytes(), 'visibilities');
}
