/** Checks that need a fit: the gain of every station against time, and baselines whose phases or amplitudes do not close.
 *  An image can take up neither: gains are of stations and scans, and an error of one baseline is in every closure that
 *  holds it. */

import { z } from 'zod';
import type { ByteSource } from '../bytes.ts';
import { readDocument } from '../formats/document.ts';
import { type ClosureData, closureSets } from '../numerics/closures.ts';
import { median } from '../numerics/statistics.ts';
import { normalTail } from '../numerics/tails.ts';
import {
  type BaselineErrors,
  baselineAmplitudes,
  baselinePhases,
  mostSignificant,
  significance,
} from './baseline-errors.ts';
import type { Outcome } from './checks.ts';
import { judge } from './findings.ts';
import type { CheckName, CheckParameters } from './parameters.ts';

const numbers = z.array(z.number());

const reportSchema = z.object({
  gains: z.object({
    scans: z.array(
      z.object({
        scan: z.number(),
        stations: z.array(z.string()),
        gains: numbers,
        deviations: numbers,
      }),
    ),
  }),
});

const residualsSchema = z.object({
  stations: z.array(z.string()),
  visibilities: z.object({
    u: numbers,
    v: numbers,
    station1: numbers,
    station2: numbers,
    scan: numbers,
    sigma: numbers,
    re: numbers,
    im: numbers,
    modelRe: numbers,
    modelIm: numbers,
  }),
});

/** An error of a baseline counts from so many of its own errors on. */
const SIGNIFICANT = 4;
/** Scatter of closures over their errors, without the baseline that explains it best, above which it is the model that does
 *  not follow the data (common practice: as where scatter over the stated noise is marginal). */
const FOLLOWED = 1.5;
const DEGREES = 180 / Math.PI;

export interface StationHistory {
  readonly station: string;
  readonly scans: readonly number[];
  readonly logGain: readonly number[];
  /** Standard deviations of the fit. */
  readonly deviations: readonly number[];
}

export interface AfterFit {
  readonly outcomes: readonly Outcome[];
  /** Of the fit, by station in the order of their first scans; null without its report. */
  readonly stationGains: readonly StationHistory[] | null;
  readonly baselines: ReturnType<typeof baselinesReport> | null;
}

/** @throws InputProblem when the documents are not those of a fit */
export function checkAfterFit(
  report: ByteSource | undefined,
  residuals: ByteSource | undefined,
  parameters: CheckParameters,
): AfterFit {
  const stationGains = report ? historiesOf(readDocument(reportSchema, report, expected('report'))) : null;
  const errors = residuals
    ? measureBaselines(readDocument(residualsSchema, residuals, expected('residuals')), parameters)
    : null;
  return {
    outcomes: [
      ...(stationGains ? [checkGains(stationGains, parameters)] : []),
      ...(errors
        ? [
            checkBaselines('baselinePhases', errors.stations, errors.phases, parameters),
            checkBaselines('baselineAmplitudes', errors.stations, errors.amplitudes, parameters),
          ]
        : []),
    ],
    stationGains,
    baselines: errors && baselinesReport(errors),
  };
}

const expected = (output: string) => `the output \`${output}\` of a stage of kind fit`;

function historiesOf({ gains }: z.infer<typeof reportSchema>): StationHistory[] {
  const names = [...new Set(gains.scans.flatMap(({ stations }) => stations))];
  return names.map((station) => {
    const own = gains.scans.flatMap(({ scan, stations, gains: values, deviations }) => {
      const k = stations.indexOf(station);
      return k < 0 ? [] : [{ scan, value: values[k], deviation: deviations[k] }];
    });
    return {
      station,
      scans: own.map(({ scan }) => scan),
      logGain: own.map(({ value }) => value),
      deviations: own.map(({ deviation }) => deviation),
    };
  });
}

/** The largest departure of a log gain from its station's median, over all stations and scans. */
function checkGains(histories: readonly StationHistory[], { limits, least }: CheckParameters): Outcome {
  const check = 'gainsOverTime';
  const count = histories.reduce((sum, { scans }) => sum + scans.length, 0);
  if (count < least) return { check, tooLittle: `${count} gains in the fit, at least ${least} are needed` };
  const departures = histories.flatMap(({ station, scans, logGain }) => {
    const middle = median(logGain);
    return scans.map((scan, k) => ({ station, scan, off: logGain[k] - middle }));
  });
  const worst = departures.reduce((a, b) => (Math.abs(b.off) > Math.abs(a.off) ? b : a));
  const { marginal } = limits.gainsOverTime;
  const scans = departures
    .filter(
      ({ station, off }) =>
        station === worst.station && Math.abs(off) > marginal && off < 0 === worst.off < 0,
    )
    .map(({ scan }) => scan);
  const when = scans.length > 1 ? `scans ${scans.join(', ')}` : `scan ${worst.scan}`;
  const detail =
    `Largest departure of a log gain of the fit from its station's median over scans: ${worst.station}, ${Math.abs(worst.off).toFixed(2)} ` +
    `${worst.off < 0 ? 'low' : 'high'} in ${when}.`;
  return judge(check, Math.abs(worst.off), limits.gainsOverTime, detail);
}

interface MeasuredBaselines {
  readonly stations: readonly string[];
  readonly phases: BaselineErrors;
  readonly amplitudes: BaselineErrors;
}

function measureBaselines(
  { stations, visibilities: rows }: z.infer<typeof residualsSchema>,
  { minimumSnr }: CheckParameters,
): MeasuredBaselines {
  const [re, im, sigma] = [rows.re, rows.im, rows.sigma].map((values) => Float64Array.from(values));
  const data: ClosureData = {
    count: re.length,
    station1: Int32Array.from(rows.station1),
    station2: Int32Array.from(rows.station2),
    scan: Int32Array.from(rows.scan),
    u: Float64Array.from(rows.u),
    v: Float64Array.from(rows.v),
    re,
    im,
    sigma,
    sigmaPhase: sigma.map((value, k) => value / Math.sqrt(re[k] * re[k] + im[k] * im[k])),
  };
  const model = { re: Float64Array.from(rows.modelRe), im: Float64Array.from(rows.modelIm) };
  const sets = closureSets(data, { minimumSnr });
  return {
    stations,
    phases: baselinePhases(data, sets, model),
    amplitudes: baselineAmplitudes(data, sets, model),
  };
}

const QUANTITIES: Readonly<Record<'baselinePhases' | 'baselineAmplitudes', { unit: number; words: string }>> =
  {
    baselinePhases: { unit: DEGREES, words: 'Degrees of the phase' },
    baselineAmplitudes: { unit: 1, words: 'The log amplitude' },
  };

/** The value is that of the most significant baseline, 0 where noise explains it. */
function checkBaselines(
  check: CheckName & keyof typeof QUANTITIES,
  stations: readonly string[],
  { errors, closures, scatter, remaining }: BaselineErrors,
  { limits, least }: CheckParameters,
): Outcome {
  if (closures < least) {
    return { check, tooLittle: `${closures} independent closures in the fit, at least ${least} are needed` };
  }
  if (!(remaining <= FOLLOWED)) {
    const tooLittle =
      `the fit leaves ${closures} independent closures with a scatter of ${remaining.toFixed(2)} over their errors when any one ` +
      `baseline is set free, at most ${FOLLOWED} is told apart: what its model does not follow would be taken for a baseline's error`;
    return { check, tooLittle };
  }
  const best = mostSignificant(errors);
  const isSignificant = significance(best) > SIGNIFICANT;
  const { unit, words } = QUANTITIES[check];
  const digits = unit === 1 ? 3 : 1;
  const shown =
    `${stations[best.station1]}–${stations[best.station2]}, ${(best.estimate * unit).toFixed(digits)} ± ${(best.error * unit).toFixed(digits)} ` +
    `in ${best.scans} scans`;
  const detail =
    `${words} of one baseline that explains best what does not close in ${closures} independent closures of the fit: ${shown}` +
    `${isSignificant ? '' : ', which noise explains'} (scatter of all over their errors ${scatter.toFixed(2)}).`;
  const value = isSignificant ? Math.abs(best.estimate) * unit : 0;
  const exceeds = (limit: number) =>
    errors.reduce((sum, { error }) => {
      const p = limit > 0 ? 2 * normalTail(Math.max(SIGNIFICANT, limit / (error * unit))) : 1;
      return sum + p - sum * p;
    }, 0);
  return judge(check, value, limits[check], detail, exceeds);
}

/** What the report says: every baseline. */
function baselinesReport({ stations, phases, amplitudes }: MeasuredBaselines) {
  const list = ({ errors }: BaselineErrors, unit: number) =>
    errors.map(({ station1, station2, estimate, error, scans }) => ({
      baseline: `${stations[station1]}–${stations[station2]}`,
      estimate: estimate * unit,
      error: error * unit,
      scans,
    }));
  return { phasesDegrees: list(phases, DEGREES), logAmplitudes: list(amplitudes, 1) };
}
