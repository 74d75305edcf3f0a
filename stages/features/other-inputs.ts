/** The optional inputs of `features`: bias, comparison of models, fits in other libraries. */

import { z } from 'zod';
import type { ByteSource } from '../bytes.ts';
import { readBasis } from '../formats/basis.ts';
import { readDocument } from '../formats/document.ts';
import { readPosterior } from '../formats/posterior.ts';
import type { Alternative } from '../imaging/error-parts.ts';
import { biasOf, type MethodBias } from '../imaging/method-bias.ts';
import type { ModelsVerdict } from '../imaging/ring-verdict.ts';
import { InputProblem } from '../problem.ts';

const ofQuantities = <T extends z.ZodType>(each: T) =>
  z.object({
    diameter: each,
    width: each,
    asymmetry: each,
    'position-angle': each,
    'central-depression': each,
  });
const biasSchema = z.object({
  trials: z.array(
    z.object({
      truth: ofQuantities(z.number()).nullable(),
      measured: ofQuantities(z.object({ value: z.number(), deviation: z.number().min(0) })).nullable(),
      ringFraction: z.number(),
    }),
  ),
});
const modelsSchema = z.object({ ringPreferred: z.boolean(), centre: z.number(), sentence: z.string() });

/** The bias that all rings show which were injected, in one stage or several; null where they are too few.
 *  @throws InputProblem when a document is no such thing */
export function readBias(sources: readonly ByteSource[]): MethodBias | null {
  const expected = 'the output `bias` of a stage of kind injection';
  return biasOf(sources.flatMap((source) => readDocument(biasSchema, source, expected).trials));
}

/** @throws InputProblem when the document is no such thing */
export function readModels(source: ByteSource): ModelsVerdict {
  return readDocument(modelsSchema, source, 'the output `models` of a stage of kind fit');
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
