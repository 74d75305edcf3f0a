/** The stated noise against the scatter of records inside scans, as the report of `ingest` has it. */

import { z } from 'zod';
import type { ByteSource } from '../bytes.ts';
import { readJson } from '../formats/json.ts';
import { InputProblem } from '../problem.ts';
import type { Outcome } from './checks.ts';
import { judge } from './findings.ts';
import type { CheckParameters } from './parameters.ts';

/** What of the report is read: reduced chi-square per real component of the records of one average about their mean. */
const reportSchema = z.object({
  scatter: z.object({ averages: z.number(), median: z.number().nullable() }),
});

/** The outcome, or none without a report. The value is the root of the median reduced chi-square: scatter over noise.
 *  @throws InputProblem when the document is no such report */
export function checkStatedNoise(
  source: ByteSource | undefined,
  { limits, least }: CheckParameters,
): Outcome[] {
  if (source === undefined) return [];
  const { averages, median } = readScatter(source);
  if (median === null || averages < least) {
    return [
      {
        check: 'statedNoise',
        tooLittle: `${averages} averages of three records or more, at least ${least} are needed`,
      },
    ];
  }
  const detail = `Median scatter of records inside ${averages} averages, over the stated noise.`;
  return [judge('statedNoise', Math.sqrt(median), limits.statedNoise, detail)];
}

function readScatter(source: ByteSource) {
  const result = reportSchema.safeParse(readJson(source));
  if (result.success) return result.data.scatter;
  throw new InputProblem({
    code: 'report',
    place: `${source.name}, ${result.error.issues[0]?.path.join('.') || 'the document'}`,
    expected: 'the report of a stage of kind ingest, with scatter.averages and scatter.median',
    found: result.error.issues[0]?.message ?? 'something else',
    advice: 'Refer to the output `report` of the stage that made the visibilities.',
  });
}
