import type { StageKind } from '../kind.ts';

/** Draws what the other stages found. Every output is one self-contained SVG picture; which are made depends on which
 *  inputs are given. */
export const figure = {
  kind: 'figure',
  version: 8,
  doc: 'Draws coverage, data, image, profile, components, spectrum, posterior and calibration as SVG.',
  source:
    'Colours: CIE 15:2004 and IEC 61966-2-1, maps of our own. Interpolation: Keys 1981, IEEE Trans. ASSP 29, 1153. ' +
    'Bins: Freedman and Diaconis 1981, Z. Wahrscheinlichkeitstheorie 57, 453.',
  inputs: {
    visibilities: {
      format: 'visibilities',
      optional: true,
      doc: 'For the coverage, and the beam in the image.',
    },
    image: { format: 'fits-image', optional: true, doc: 'The reconstruction, Jy per pixel.' },
    basis: { format: 'basis', optional: true, doc: 'For components, scree, and the posterior.' },
    samples: { format: 'fits-table', optional: true, doc: 'Draws of the posterior, as fit writes them.' },
    residuals: { format: 'json', optional: true, doc: "Data with the model's values, as fit writes them." },
    ring: { format: 'numbers', optional: true, doc: 'Numbers of the ring, drawn over image and profile.' },
    features: {
      format: 'json',
      optional: true,
      doc: 'The report of features: the posterior shows the rings that it measured, not some measured anew.',
    },
    truth: {
      format: 'fits-image',
      optional: true,
      doc: 'The truth of synthetic data, drawn beside the image.',
    },
    calibration: {
      format: 'json',
      optional: true,
      doc: 'The report of the calibration check: drawn, and named under the data.',
    },
  },
  parameters: {
    field: {
      type: 'quantity',
      unit: 'uas',
      from: 1e-3,
      to: 1e9,
      optional: true,
      doc: 'Width of the part of the sky that the image shows; all of it when absent.',
    },
    figures: {
      type: 'list',
      of: {
        type: 'word',
        words: ['coverage', 'data', 'image', 'profile', 'components', 'scree', 'posterior', 'calibration'],
        doc: 'Name of a figure.',
      },
      least: 1,
      optional: true,
      doc: 'Which figures to draw; all that the inputs allow when absent.',
    },
    shown: {
      type: 'integer',
      from: 1,
      to: 12,
      default: 12,
      doc: 'Components to show.',
      why: 'Twelve fill the page; those behind hold little of the variance.',
    },
    draws: {
      type: 'integer',
      from: 16,
      to: 20000,
      default: 400,
      doc: 'Draws, evenly taken from the posterior, in which the ring is measured for its histograms when the report of features is not given.',
      why: 'The 68 % interval of 400 draws is known to about 5 % of its length; a draw takes some milliseconds.',
    },
  },
  outputs: {
    coverage: {
      format: 'svg',
      chosenBy: 'figures',
      needs: ['visibilities'],
      doc: 'Points of the Fourier plane that were measured.',
    },
    data: {
      format: 'svg',
      chosenBy: 'figures',
      needs: ['residuals'],
      doc: 'Amplitudes and closure phases against baseline length, with model and residuals.',
    },
    image: {
      format: 'svg',
      chosenBy: 'figures',
      needs: ['image'],
      doc: 'The image in false colour, beside it the truth if there is one.',
    },
    profile: {
      format: 'svg',
      chosenBy: 'figures',
      needs: ['image'],
      doc: 'Brightness against radius, with the band of the posterior.',
    },
    components: {
      format: 'svg',
      chosenBy: 'figures',
      needs: ['basis'],
      doc: 'Mean and leading components of the library.',
    },
    scree: {
      format: 'svg',
      chosenBy: 'figures',
      needs: ['basis'],
      doc: 'Variance of each component and explained variance.',
    },
    posterior: {
      format: 'svg',
      chosenBy: 'figures',
      needs: ['samples', 'basis'],
      doc: 'Histograms of flux, ring and leading coefficients over the posterior.',
    },
    calibration: {
      format: 'svg',
      chosenBy: 'figures',
      needs: ['calibration'],
      doc: 'Every check with its value, limits and finding; gains against time.',
    },
  },
  load: () => import('./compute.ts'),
} as const satisfies StageKind;
