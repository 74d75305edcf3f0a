/** Declaration of the kind `injection`: what the method does to rings of known size. */

import type { StageKind } from '../kind.ts';

export const injection = {
  kind: 'injection',
  version: 6,
  doc:
    "Measures the method's own error: rings of known size, about as large as the one that was found, are observed through " +
    'the same (u,v) points with the same noise and gains, fitted the same way and measured the same way. The difference of ' +
    'what comes out to what went in gives the bias of every quantity with its error, and how much the method scatters over ' +
    'noise, gains and rings: the error of a corrected value, in place of the width of its posterior.',
  source:
    'Common practice; regression: Gelman et al., Bayesian Data Analysis, 3rd ed., section 14.2; what a posterior holds and ' +
    'injections hold too: Rodgers, Inverse Methods for Atmospheric Sounding, 2000, section 3.2. Truths are measured at the ' +
    'resolution of the basis, as in stages/simulate.',
  inputs: {
    visibilities: { format: 'visibilities', doc: 'The visibilities that were fitted.' },
    basis: { format: 'basis', doc: 'The basis of the fit.' },
    image: { format: 'fits-image', doc: "The fit's image: rings are injected about the one in it." },
    report: { format: 'json', doc: "The fit's report: its settings are used again." },
  },
  parameters: {
    count: {
      type: 'integer',
      from: 4,
      to: 1000,
      default: 12,
      doc: 'Rings to inject; where some do not come out as rings, up to as many again.',
      why: 'The bias of a diameter is then known to a third of the error of one, and that error to a fifth.',
    },
    starts: {
      type: 'integer',
      from: 1,
      to: 100,
      default: 2,
      doc: 'Starts of each search.',
      why: 'The best library image and the mean find the same minimum in these data nearly always.',
    },
    seed: { type: 'integer', from: 0, to: 2147483647, default: 1, doc: 'Seed of sources, gains and noise.' },
  },
  outputs: {
    bias: {
      format: 'json',
      doc: 'Of every quantity the bias with its error and the scatter; and the injections one by one.',
    },
  },
  load: () => import('./compute.ts'),
} as const satisfies StageKind;
