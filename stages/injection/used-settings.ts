/** The settings of a fit, read back from its report, for fits that are made the same way. */

import { z } from 'zod';
import type { ByteSource } from '../bytes.ts';
import { readDocument } from '../formats/document.ts';
import { DATA_TERMS, DATA_WORDS } from '../imaging/data-terms.ts';
import type { FitSettings } from '../imaging/settings.ts';

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
  const expected = 'the report of a stage of kind fit, with its settings';
  const advice = 'Refer to the output `report` of the fit whose method is tried.';
  const { settings } = readDocument(schema, source, expected, advice);
  const sampler = { chains: 4, warmUp: 100, draws: 150, most: 600, rHat: 1.02, ess: 200 };
  return { ...settings, starts, posterior: 'gaussian', sampler, samples: 100, seed: 1 };
}
