/** The optional inputs of `features`: bias, comparison of models, fits in other libraries. */

import { z } from 'zod';
import type { ByteSource } from '../bytes.ts';
import { readBasis } from '../formats/basis.ts';
import { readJson } from '../formats/json.ts';
import { readPosterior } from '../formats/posterior.ts';
import type { Alternative } from '../imaging/error-parts.ts';
import type { MethodBias } from '../imaging/method-bias.ts';
import type { ModelsVerdict } from '../imaging/ring-verdict.ts';
import { InputProblem } from '../problem.ts';

const quantity = z.object({
  offset: z.number(),
  slope: z.number(),
  centre: z.number(),
  covariance: z.tuple([z.number(), z.number(), z.number()]),
  squares: z.number().min(0),
  byOwnSpread: z.boolean(),
  spread: z.number().positive(),
  scatter: z.number().min(0),
  trials: z.number(),
});
const biasSchema = z.object({
  bias: z
    .object({
      diameter: quantity,
      width: quantity,
      asymmetry: quantity,
      'position-angle': quantity,
      'central-depression': quantity,
    })
    .nullable(),
});
const modelsSchema = z.object({ ringPreferred: z.boolean(), centre: z.number(), sentence: z.string() });

/** Null where the injections told nothing. @throws InputProblem when the document is no such thing */
export function readBias(source: ByteSource): MethodBias | null {
  return parsed(biasSchema, source, 'the output `bias` of a stage of kind injection').bias;
}

/** @throws InputProblem when the document is no such thing */
export function readModels(source: ByteSource): ModelsVerdict {
  return parsed(modelsSchema, source, 'the output `models` of a stage of kind fit');
}

/** @throws InputProblem when there are not as many bases as samples */
export function readOthers(bases: readonly ByteSource[], samples: readonly ByteSource[]): Alternative[] {
  if (bases.length === samples.length) {
    return bases.map((basis, k) => ({ basis: readBasis(basis), posterior: readPosterior(samples[k]) }));
  }
  throw new InputProblem({
    code: 'other-fits',
    place: 'inputs otherBasis and otherSamples',
    expected: 'a basis for every table of samples, in the same order',
    found: `${bases.length} bases and ${samples.length} tables of samples`,
    advice: 'Name both outputs of every other fit.',
  });
}

function parsed<T>(schema: z.ZodType<T>, source: ByteSource, expected: string): T {
  const result = schema.safeParse(readJson(source));
  if (result.success) return result.data;
  throw new InputProblem({
    code: 'wrong-document',
    place: `${source.name}, ${result.error.issues[0]?.path.join('.') || 'the document'}`,
    expected,
    found: result.error.issues[0]?.message ?? 'something else',
    advice: 'Refer to the right output.',
  });
}
