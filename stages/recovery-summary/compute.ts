/** The computation of `recovery-summary`. */

import { z } from 'zod';
import type { NumberValue } from '../data.ts';
import { readDocument } from '../formats/document.ts';
import { writeJson, writeNumbers } from '../formats/json.ts';
import type { StageReport, StageTask } from '../kind.ts';
import { type FamilySummary, judge, type Suite, summarise } from './summarise.ts';

const quantity = z.object({
  truth: z.number(),
  measured: z.number(),
  spread: z.number(),
  corrected: z.number(),
  low: z.number(),
  high: z.number(),
  low95: z.number(),
  high95: z.number(),
  rank: z.number(),
});
const schema = z.object({
  noise: z.number(),
  components: z.number(),
  injected: z.number(),
  trials: z.array(
    z.object({
      family: z.string(),
      isRing: z.boolean(),
      verdict: z.enum(['ring', 'undecided', 'no ring']),
      hasTruth: z.boolean(),
      quantities: z
        .object({
          diameter: quantity,
          width: quantity,
          asymmetry: quantity,
          'position-angle': quantity,
          'central-depression': quantity,
        })
        .nullable(),
    }),
  ),
  pulls: z.array(
    z.object({
      family: z.string(),
      truth: z.number().nullable(),
      withRings: z.number().nullable(),
      withoutRings: z.number().nullable(),
    }),
  ),
});

export function compute(task: StageTask): StageReport {
  const { biasTarget, least } = task.parameters as { biasTarget: number; least: number };
  const expected = 'the output `trials` of a stage of kind truth-recovery';
  const suites: Suite[] = task.inputs.trials.map((source) => readDocument(schema, source, expected));
  const summary = summarise(suites);
  const verdicts = judge(summary, biasTarget, least);
  const missed = verdicts.filter(({ met }) => met === false);
  writeNumbers(task.outputs.numbers, { values: valuesOf(summary), remarks: remarksOf(summary, missed) });
  writeJson(task.outputs.report, { ...summary, verdicts });
  return { warnings: missed.map(({ target, found }) => `target missed: ${target}; found ${found}`) };
}

function valuesOf(summary: ReturnType<typeof summarise>): Record<string, NumberValue> {
  const { all, families, noRing, ringsDenied, uniformity, pull, observations } = summary;
  const plain = (value: number, unit: string, definition: string): NumberValue => ({
    value,
    unit,
    definition,
  });
  const values: Record<string, NumberValue> = {
    observations: plain(observations, '', 'Synthetic observations in the suite.'),
    'rings-found': proportion(all.found, 'Part of the resolved rings that are called one.'),
    ...(ringsDenied === null
      ? {}
      : {
          'rings-denied': proportion(
            ringsDenied,
            'Part of the resolved rings that are called `no ring`; the rest of those that are not found is undecided.',
          ),
        }),
    ...(noRing === null
      ? {}
      : {
          'no-ring-right': proportion(noRing, 'Part of the sources that are no ring and are called so.'),
        }),
    ...familyValues('', all),
    ...(uniformity === null
      ? {}
      : {
          'rank-probability': plain(
            uniformity.probability,
            '',
            'Probability of ranks of true diameters as uneven as found, were they uniform.',
          ),
        }),
    ...(pull === null
      ? {}
      : {
          'library-pull': {
            value: pull.mean,
            unit: 'uas',
            low: pull.mean - pull.error,
            high: pull.mean + pull.error,
            definition: `Mean shift of the uncorrected diameter when the library holds no rings, ${pull.count} observations.`,
          },
        }),
  };
  for (const family of families) Object.assign(values, familyValues(`-${family.family}`, family));
  return values;
}

function familyValues(suffix: string, { quantities }: FamilySummary): Record<string, NumberValue> {
  const { diameter, width, 'position-angle': angle, 'central-depression': depression } = quantities;
  if (diameter === undefined || width === undefined || angle === undefined || depression === undefined)
    return {};
  const bias = ({ bias: value, error }: typeof diameter, unit: string, what: string): NumberValue => ({
    value,
    unit,
    low: value - error,
    high: value + error,
    definition: `Mean of corrected less true ${what}, with its standard error.`,
  });
  const scatter = ({ scatter: value }: typeof diameter, unit: string, what: string): NumberValue => ({
    value,
    unit,
    definition: `Standard deviation of corrected less true ${what}.`,
  });
  return {
    [`diameter-bias${suffix}`]: bias(diameter, 'uas', 'diameters'),
    [`diameter-scatter${suffix}`]: scatter(diameter, 'uas', 'diameters'),
    [`diameter-interval${suffix}`]: {
      value: diameter.half,
      unit: 'uas',
      definition: `Mean of half the 68 % intervals of the diameter; of the posteriors before any correction ${diameter.spread.toFixed(2)} uas.`,
    },
    [`width-bias${suffix}`]: bias(width, 'uas', 'widths'),
    [`position-angle-bias${suffix}`]: bias(angle, 'deg', 'position angles'),
    [`depression-bias${suffix}`]: bias(depression, '', 'central depressions'),
    [`coverage-68${suffix}`]: proportion(
      diameter.coverage68,
      'Part of the 68 % intervals of the diameter that hold the truth.',
    ),
    [`coverage-95${suffix}`]: proportion(
      diameter.coverage95,
      'Part of the 95 % intervals of the diameter that hold the truth.',
    ),
  };
}

function proportion(
  found: { value: number; low: number; high: number; of: number },
  definition: string,
): NumberValue {
  const { value, low, high, of } = found;
  return { value, unit: '', low, high, definition: `${definition} Of ${of}; interval of 68 % by Wilson.` };
}

function remarksOf(
  summary: ReturnType<typeof summarise>,
  missed: readonly { target: string; found: string }[],
): string[] {
  return [
    `${summary.observations} synthetic observations of invented sources, none of which is in the library; ${summary.unresolved} rings that the ` +
      'resolution does not show as such are left out of bias and coverage.',
    missed.length === 0
      ? 'Every target is met.'
      : `${missed.length} targets are missed: ${missed.map(({ target, found }) => `${target} (${found})`).join('; ')}.`,
  ];
}
