/** Declaration of the kind `features`: the ring in every image of a posterior. */

import type { StageKind } from '../kind.ts';

export const features = {
  kind: 'features',
  version: 6,
  doc:
    'Measures the ring in every image of a posterior: diameter, width, asymmetry and position angle, central ' +
    "depression, roundness; medians with 68 % and 95 % intervals, corrected for the method's bias where it is known, and " +
    'the parts of the error. Says `no ring` when most images have none or a model without one explains the data, and ' +
    '`undecided` when most images have none and yet a model with one is preferred. With a ' +
    'calibration alpha it gives the angular gravitational radius, with a distance the mass, and what both assume.',
  source:
    'Definitions: stages/numerics/ring.ts and blurred-ring.ts. Quantiles: Hyndman & Fan 1996, Am. Stat. 50, 361, type 7. ' +
    'Circular statistics: Mardia & Jupp, Directional Statistics, sections 2.2 and 2.3. Calibration: Misner, Thorne & ' +
    'Wheeler, Gravitation, section 25.6.',
  inputs: {
    basis: { format: 'basis', doc: 'The basis of the fit.' },
    samples: { format: 'fits-table', doc: 'Draws of the posterior, as fit writes them.' },
    image: {
      format: 'fits-image',
      optional: true,
      doc: "The fit's image; measured too, for comparison in the report.",
    },
    bias: {
      format: 'json',
      optional: true,
      many: true,
      doc:
        'The bias that one stage of kind `injection` found, or several of different seeds together: values are corrected by it, ' +
        'and the intervals are as wide as its errors.',
    },
    models: {
      format: 'json',
      optional: true,
      doc: "The fit's comparison of geometric models: where it prefers none with a dark centre, there is no ring; where it prefers one, images without do not deny it.",
    },
    otherBasis: {
      format: 'basis',
      optional: true,
      many: true,
      doc: 'Bases of other libraries in which the same data were fitted, in the order of `otherSamples`.',
    },
    otherSamples: {
      format: 'fits-table',
      optional: true,
      many: true,
      doc: 'Draws of these fits: between them and the main one lies the part of the error that the library makes.',
    },
  },
  parameters: {
    alpha: {
      type: 'number',
      from: 1,
      to: 100,
      optional: true,
      doc:
        'Ring diameter over angular gravitational radius, for this definition of the diameter and this method. ' +
        '10.392 is the photon capture diameter of a body without spin; a ring of light need not lie there.',
    },
    alphaError: {
      type: 'number',
      from: 0,
      to: 50,
      optional: true,
      doc: 'Standard deviation of alpha; exact when absent.',
    },
    distance: {
      type: 'quantity',
      unit: 'pc',
      from: 1e-3,
      to: 1e11,
      optional: true,
      doc: 'Distance; with alpha it gives the mass.',
    },
    distanceError: {
      type: 'quantity',
      unit: 'pc',
      from: 0,
      to: 1e11,
      optional: true,
      doc: 'Standard deviation of the distance; exact when absent.',
    },
  },
  outputs: {
    ring: {
      format: 'numbers',
      doc: 'The numbers of the ring; only `ring-fraction` when there is none or it is undecided.',
      numbers: [
        'diameter',
        'width',
        'asymmetry',
        'position-angle',
        'central-depression',
        'roundness',
        'thin-ring-diameter',
        'diameter-uncorrected',
        'diameter-error-noise',
        'diameter-error-calibration',
        'diameter-error-components',
        'diameter-error-library',
        'diameter-error-method',
        'deepest-depression',
        'ring-fraction',
        'gravitational-radius',
        'mass',
      ],
    },
    report: {
      format: 'json',
      doc: 'How many images have a ring, why the others have none, and the measures.',
    },
  },
  load: () => import('./compute.ts'),
} as const satisfies StageKind;
