/** Declaration of the kind `features`: the ring in every image of a posterior. */

import type { StageKind } from '../kind.ts';

export const features = {
  kind: 'features',
  version: 1,
  doc:
    'Measures the ring in every image of a posterior: diameter, width, asymmetry and position angle, central ' +
    'depression, roundness; medians with 68 % and 95 % intervals. Says `no ring` when most images have none. With a ' +
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
    distance: {
      type: 'quantity',
      unit: 'pc',
      from: 1e-3,
      to: 1e11,
      optional: true,
      doc: 'Distance; with alpha it gives the mass.',
    },
  },
  outputs: {
    ring: {
      format: 'numbers',
      doc: 'The numbers of the ring; only `ring-fraction` when there is none.',
      numbers: [
        'diameter',
        'width',
        'asymmetry',
        'position-angle',
        'central-depression',
        'roundness',
        'thin-ring-diameter',
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
