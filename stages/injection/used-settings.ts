/** The settings of a fit, read back from its report, for fits that are made the same way. */

import { z } from 'zod';
import type { ByteSource } from '../bytes.ts';
import { readJson } from '../formats/json.ts';
import { DATA_TERMS, DATA_WORDS } from '../imaging/data-terms.ts';
import type { FitSettings } from '../imaging/settings.ts';
import { InputProblem } from '../problem.ts';

const schema = z.object({
  settings: z.object({
    data: z.union([z.enum(DATA_WORDS), z.array(z.enum(DATA_TERMS))]),
    components: z.number(),
    priorWidth: z.number(),
    flux: z.number(),
    fluxPrior: z.number(),
    shortest: z.number(),
    gainPriors: z.object({ usual: z.number(), stations: z.record(z.string(), z.number()) }),
    minimumSnr: z.number(),
    centroid: z.enum(['free', 'fixed']),
    positivity: z.number(),
  }),
});

/** Settings for a fit with a Gaussian posterior. @throws InputProblem when the document is no report of a fit */
export function readUsedSettings(source: ByteSource, starts: number): FitSettings {
  const result = schema.safeParse(readJson(source));
  if (result.success) {
    const sampler = { chains: 4, warmUp: 100, draws: 150, most: 600, rHat: 1.02, ess: 200 };
    return { ...result.data.settings, starts, posterior: 'gaussian', sampler, samples: 100, seed: 1 };
  }
  throw new InputProblem({
    code: 'report',
    place: `${source.name}, ${result.error.issues[0]?.path.join('.') || 'the document'}`,
    expected: 'the report of a stage of kind fit, with its settings',
    found: result.error.issues[0]?.message ?? 'something else',
    advice: 'Refer to the output `report` of the fit whose method is tried.',
  });
}
