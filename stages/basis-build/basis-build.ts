/** Declaration of the kind `basis-build`: mean and principal components of a library of images. */

import type { StageKind } from '../kind.ts';

export const basisBuild = {
  kind: 'basis-build',
  version: 1,
  doc:
    'Mean image and leading principal components of a library, at the resolution of the instrument. Every image is ' +
    'brought to unit flux and convolved with a circular Gaussian. That is done on the sines and cosines of the ' +
    'field: they are orthonormal and the Gaussian is diagonal in them, so the components found from the ' +
    'coefficients are exactly those of the convolved images. Frequencies of which the Gaussian leaves less than 1 % ' +
    'are nothing here. The library is read as a stream; memory does not grow with it but for the scores. Images ' +
    'held out of the basis tell how well it describes what it has not seen, family by family.',
  source:
    'Jolliffe, Principal Component Analysis, 2nd ed., ch. 1 and 3; sums about the first image: Chan, Golub & LeVeque ' +
    '1983, Am. Stat. 37, 242.',
  inputs: {
    library: { format: 'fits-cube', doc: 'The images, all on one grid.' },
    manifest: { format: 'json', doc: 'Families of the images, as image-library writes them.' },
  },
  parameters: {
    components: {
      type: 'integer',
      from: 1,
      to: 400,
      default: 40,
      doc: 'Leading components to keep.',
      why: 'With 20 a ring of real data came out too small; with 30 to 40 its diameter stood still and chi-square was 1.',
    },
    resolution: {
      type: 'quantity',
      unit: 'uas',
      from: 0,
      to: 1e6,
      default: '12 uas',
      doc: 'Full width at half maximum of the Gaussian; 0 for none.',
      why:
        'Half the beam of an array as large as the Earth at 1.3 mm: finer detail is not measured and would cost ' +
        'components, a coarser limit would blur the ring.',
    },
    heldOut: {
      type: 'number',
      from: 0,
      to: 0.5,
      default: 0.1,
      doc: 'Part of the images held out of the basis, evenly over the library.',
      why: 'A tenth of the default library are ten images or more of each family.',
    },
  },
  outputs: {
    basis: {
      format: 'basis',
      doc: 'Mean, components, their variances, and the scores of the images in the basis.',
    },
    report: {
      format: 'json',
      doc:
        'Explained variance by number of components; what is left unexplained of the images in the basis and of those ' +
        'held out; relative errors of the held-out images by family.',
    },
  },
  load: () => import('./compute.ts'),
} as const satisfies StageKind;
