/** Checks that need a fit: the gain of every station against time, and phases of baselines that do not close. An image can take
 *  up neither: gains are of stations and scans, and a phase of one baseline is in every triangle that holds it. */

import { z } from 'zod';
import type { ByteSource } from '../bytes.ts';
import { readJson } from '../formats/json.ts';
import { median } from '../numerics/statistics.ts';
import { InputProblem } from '../problem.ts';
import type { Outcome } from './checks.ts';
import { judge } from './findings.ts';
import type { CheckParameters } from './parameters.ts';

const reportSchema = z.object({
  gains: z.object({
    scans: z.array(
      z.object({
        scan: z.number(),
        stations: z.array(z.string()),
        gains: z.array(z.number()),
        deviations: z.array(z.number()),
      }),
    ),
  }),
});

const residualsSchema = z.object({
  stations: z.array(z.string()),
  closurePhases: z.object({
    stations: z.array(z.array(z.number())),
    sigmaDegrees: z.array(z.number()),
    residualDegrees: z.array(z.number()),
  }),
});

/** A phase counts from so many of its errors on. */
const SIGNIFICANT = 4;

/** @throws InputProblem when the documents are not those of a fit */
export function checkAfterFit(
  report: ByteSource | undefined,
  residuals: ByteSource | undefined,
  parameters: CheckParameters,
): Outcome[] {
  return [
    ...(report === undefined ? [] : [checkGains(parsed(reportSchema, report, 'report'), parameters)]),
    ...(residuals === undefined
      ? []
      : [checkBaselines(parsed(residualsSchema, residuals, 'residuals'), parameters)]),
  ];
}

interface Departure {
  readonly station: string;
  readonly scan: number;
  readonly off: number;
}

/** The largest departure of a log gain from its station's median, over all stations and scans. */
function checkGains({ gains }: z.infer<typeof reportSchema>, { limits, least }: CheckParameters): Outcome {
  const byStation = new Map<string, { scan: number; value: number }[]>();
  for (const { scan, stations, gains: values } of gains.scans) {
    stations.forEach((station, k) => {
      byStation.set(station, [...(byStation.get(station) ?? []), { scan, value: values[k] }]);
    });
  }
  const count = [...byStation.values()].reduce((sum, list) => sum + list.length, 0);
  if (count < least)
    return { check: 'gainsOverTime', tooLittle: `${count} gains in the fit, at least ${least} are needed` };
  const departures = [...byStation].flatMap(([station, list]): Departure[] => {
    const middle = median(list.map(({ value }) => value));
    return list.map(({ scan, value }) => ({ station, scan, off: value - middle }));
  });
  const worst = departures.reduce((a, b) => (Math.abs(b.off) > Math.abs(a.off) ? b : a));
  const limit = limits.gainsOverTime.marginal;
  const scans = departures
    .filter(
      ({ station, off }) => station === worst.station && Math.abs(off) > limit && off < 0 === worst.off < 0,
    )
    .map(({ scan }) => scan);
  const when = scans.length > 1 ? `scans ${scans.join(', ')}` : `scan ${worst.scan}`;
  return judge(
    'gainsOverTime',
    Math.abs(worst.off),
    limits.gainsOverTime,
    `Largest departure of a log gain of the fit from its station's median over scans: ${worst.station}, ${Math.abs(worst.off).toFixed(2)} ` +
      `${worst.off < 0 ? 'low' : 'high'} in ${when}.`,
  );
}

/** The phase of one baseline that explains the residual closure phases best: weighted mean over the triangles that hold it. */
function checkBaselines(
  { stations, closurePhases }: z.infer<typeof residualsSchema>,
  { limits, least }: CheckParameters,
): Outcome {
  const { residualDegrees, sigmaDegrees } = closurePhases;
  if (residualDegrees.length < least) {
    return {
      check: 'baselinePhases',
      tooLittle: `${residualDegrees.length} closure phases in the fit, at least ${least} are needed`,
    };
  }
  const sums = new Map<string, { weight: number; sum: number; count: number }>();
  closurePhases.stations.forEach(([a, b, c], k) => {
    const weight = 1 / (sigmaDegrees[k] * sigmaDegrees[k]);
    for (const [i, j, sign] of [
      [a, b, 1],
      [b, c, 1],
      [a, c, -1],
    ]) {
      const name = `${stations[i]}–${stations[j]}`;
      const found = sums.get(name) ?? { weight: 0, sum: 0, count: 0 };
      sums.set(name, {
        weight: found.weight + weight,
        sum: found.sum + sign * weight * residualDegrees[k],
        count: found.count + 1,
      });
    }
  });
  const phases = [...sums].map(([baseline, { weight, sum, count }]) => {
    const error = 1 / Math.sqrt(weight);
    return { baseline, phase: sum / weight, error, count };
  });
  const best = phases.reduce((a, b) => (Math.abs(b.phase) / b.error > Math.abs(a.phase) / a.error ? b : a));
  const isSignificant = Math.abs(best.phase) > SIGNIFICANT * best.error;
  const shown = `${best.baseline}, ${best.phase.toFixed(1)} ± ${best.error.toFixed(1)} deg in ${best.count} triangles`;
  return judge(
    'baselinePhases',
    isSignificant ? Math.abs(best.phase) : 0,
    limits.baselinePhases,
    `Degrees of the phase of one baseline that does not close, from the residual closure phases of the fit: ${shown}` +
      `${isSignificant ? '' : ', which noise explains'}.`,
  );
}

function parsed<T>(schema: z.ZodType<T>, source: ByteSource, output: string): T {
  const result = schema.safeParse(readJson(source));
  if (result.success) return result.data;
  throw new InputProblem({
    code: 'wrong-document',
    place: `${source.name}, ${result.error.issues[0]?.path.join('.') || 'the document'}`,
    expected: `the output \`${output}\` of a stage of kind fit`,
    found: result.error.issues[0]?.message ?? 'something else',
    advice: 'Refer to the right output.',
  });
}
