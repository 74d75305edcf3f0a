/** The stated noise against the scatter of records inside scans, as the report of `ingest` has it: of all, by the median
 *  that a few bad scans do not move, and baseline by baseline. */

import { z } from 'zod';
import type { ByteSource } from '../bytes.ts';
import { readDocument } from '../formats/document.ts';
import { chiSquareQuantile, chiSquareTail } from '../numerics/chi-square.ts';
import { exp, ln } from '../numerics/elementary.ts';
import { median } from '../numerics/statistics.ts';
import { binomialTail } from '../numerics/tails.ts';
import type { Outcome } from './checks.ts';
import { judge } from './findings.ts';
import type { CheckParameters } from './parameters.ts';

/** What of the report is read: reduced chi-square per real component of the records of one average about their mean; by
 *  baseline since version 3 of `ingest`. */
const reportSchema = z.object({
  scatter: z.object({
    averages: z.number(),
    median: z.number().nullable(),
    baselines: z
      .array(
        z.object({
          baseline: z.string(),
          averages: z.number(),
          degrees: z.number().positive(),
          value: z.number(),
        }),
      )
      .optional(),
  }),
});

type Scatter = z.infer<typeof reportSchema>['scatter'];
type BaselineScatter = NonNullable<Scatter['baselines']>[number];

/** The outcomes, none without a report. @throws InputProblem when the document is no such report */
export function checkStatedNoise(source: ByteSource | undefined, parameters: CheckParameters): Outcome[] {
  if (source === undefined) return [];
  const scatter = readScatter(source);
  return [checkMedian(scatter, parameters), ...checkBaselines(scatter, parameters)];
}

/** The value is the root of the median reduced chi-square: scatter over noise. */
function checkMedian(
  { averages, median: middle, baselines }: Scatter,
  { limits, least }: CheckParameters,
): Outcome {
  if (middle === null || averages < least) {
    return {
      check: 'statedNoise',
      tooLittle: `${averages} averages of three records or more, at least ${least} are needed`,
    };
  }
  const detail = `Median scatter of records inside ${averages} averages, over the stated noise.`;
  const degrees = baselines && median(baselines.map((each) => each.degrees / each.averages));
  const exceeds = degrees === undefined ? undefined : medianTail(averages, degrees);
  return judge('statedNoise', Math.sqrt(middle), limits.statedNoise, detail, exceeds);
}

/** The probability that the median of n reduced chi-squares is above the square of a value: that half of them are. */
function medianTail(n: number, degrees: number) {
  return (value: number) => binomialTail(n / 2, n, chiSquareTail(degrees * value * value, degrees));
}

/** How often the largest of all baselines of sound data stays below what is allowed for. */
const CONFIDENCE = 0.9;

/** The value is the largest scatter of a baseline over what the largest of so many has by chance in one case of ten. */
function checkBaselines({ baselines }: Scatter, { limits }: CheckParameters): Outcome[] {
  if (baselines === undefined || baselines.length === 0) return [];
  const level = exp(ln(CONFIDENCE) / baselines.length);
  const allowed = ({ degrees }: BaselineScatter) => chiSquareQuantile(level, degrees) / degrees;
  const value = (each: BaselineScatter) => Math.sqrt(each.value / allowed(each));
  const worst = baselines.reduce((a, b) => (value(b) > value(a) ? b : a));
  const exceeds = (limit: number) =>
    baselines.reduce((sum, each) => {
      const p = chiSquareTail(limit * limit * allowed(each) * each.degrees, each.degrees);
      return sum + p - sum * p;
    }, 0);
  const detail =
    `Scatter of records inside scans over the stated noise, largest of ${baselines.length} baselines: ${worst.baseline}, ` +
    `${Math.sqrt(worst.value).toFixed(2)} in ${worst.averages} scans (by chance up to ${Math.sqrt(allowed(worst)).toFixed(2)}); ${others(baselines, value, limits.noiseByBaseline.marginal)}.`;
  return [judge('noiseByBaseline', value(worst), limits.noiseByBaseline, detail, exceeds)];
}

/** Whether one baseline is off or many, which tells a bad baseline from a bad station and from weights that are wrong
 *  throughout. */
function others(
  baselines: readonly BaselineScatter[],
  value: (each: BaselineScatter) => number,
  marginal: number,
): string {
  const above = baselines.filter((each) => value(each) > marginal);
  if (above.length === 0) return 'none is above its limit';
  const common = stationsOf(above[0]).filter((name) =>
    above.every((each) => stationsOf(each).includes(name)),
  );
  const whose = above.length > 1 && common.length === 1 ? `, all with ${common[0]}` : '';
  return `${above.length} of ${baselines.length} are above ${marginal}${whose}`;
}

/** Names of stations have no dash of this length. */
function stationsOf({ baseline }: BaselineScatter): string[] {
  return baseline.split('–');
}

function readScatter(source: ByteSource): Scatter {
  const expected = 'the report of a stage of kind ingest, with scatter.averages and scatter.median';
  const advice = 'Refer to the output `report` of the stage that made the visibilities.';
  return readDocument(reportSchema, source, expected, advice).scatter;
}
