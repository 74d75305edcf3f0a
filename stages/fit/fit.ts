/** Declaration of the kind `fit`: an image from visibilities, in the space of a basis. */

import type { StageKind } from '../kind.ts';

export const fit = {
  kind: 'fit',
  version: 6,
  doc:
    'Fits flux and coefficients of a basis to visibilities in the Fourier plane: image = flux * mean + sum of ' +
    'coefficient * component, the source at the resolution of the basis; the transform of its Gaussian is taken out of ' +
    'the model. The optimum is searched by damped Gauss-Newton steps from several starts; the posterior ' +
    'is sampled by Hamiltonian chains over flux, coefficients and gains. For complex visibilities with a fixed centroid ' +
    'and without positivity it is a Gaussian in closed form.',
  source:
    'Thompson, Moran & Swenson, 3rd ed., sections 9.3 (amplitudes under noise), 10.3 (closures) and 11.4; squared ' +
    'visibilities and triple products: Duvert, Young & Hummel 2017, Astron. Astrophys. 597, A8; marginalised ' +
    'nuisances: Golub & Pereyra 1973, SIAM J. Numer. Anal. 10, 413; choice by held-out data: Hastie, Tibshirani & ' +
    'Friedman, The Elements of Statistical Learning, 2nd ed., section 7.10; sampler: Neal 2011, Handbook of Markov Chain ' +
    'Monte Carlo, ch. 5; its diagnostics: Vehtari et al. 2021, Bayesian Analysis 16, 667.',
  inputs: {
    visibilities: {
      format: 'visibilities',
      doc: 'Scan averages, with the error budget of the calibration check.',
    },
    basis: { format: 'basis', doc: 'Mean image and components of a library.' },
  },
  parameters: {
    data: {
      type: 'either',
      of: [
        {
          type: 'word',
          words: [
            'closure-phases-and-amplitudes',
            'complex-visibilities',
            'closure-phases-and-log-closure-amplitudes',
          ],
          doc: 'A usual combination.',
        },
        {
          type: 'list',
          of: {
            type: 'word',
            words: [
              'complex-visibilities',
              'amplitudes',
              'closure-phases',
              'log-closure-amplitudes',
              'squared-visibilities',
              'triple-phases',
              'triple-amplitudes',
            ],
            doc: 'One term.',
          },
          least: 1,
          most: 2,
          doc:
            'One term that takes phases (closure phases, triple phases), one that takes amplitudes, or one of both: what ' +
            'would count a measurement twice is refused. Optical data (squared visibilities, triple products) are normalised ' +
            'and need a stated flux, such as 1 Jy.',
        },
      ],
      default: 'closure-phases-and-amplitudes',
      doc: 'Data terms. Amplitudes come with one gain per station and scan as a nuisance.',
      why: 'Closures alone see neither the flux nor a broad pedestal; phases of real data are those of the stations.',
    },
    components: {
      type: 'either',
      of: [
        { type: 'integer', from: 1, to: 400, doc: 'So many.' },
        { type: 'word', words: ['by-data'], doc: 'Chosen by scans that are held out of the fit.' },
      ],
      default: 'by-data',
      doc: 'Leading components to fit, or `by-data`.',
      why: 'Too few components give a wrong diameter, and how many are enough differs from data to data.',
    },
    priorWidth: {
      type: 'number',
      from: 0.01,
      to: 1000,
      default: 2,
      doc: 'Prior standard deviation of each coefficient, in standard deviations of the library.',
      why: 'The source need not be typical of the library; twice its spread lets the data decide.',
    },
    flux: {
      type: 'quantity',
      unit: 'Jy',
      from: 1e-6,
      to: 1e6,
      optional: true,
      doc:
        'Prior mean of the compact flux; estimated from amplitudes when absent. Needed where no data term sees the flux ' +
        '(closures alone): the image then has that flux; 1 Jy with optical data alone, which are normalised.',
    },
    fluxPrior: {
      type: 'number',
      from: 0.001,
      to: 10,
      default: 0.5,
      doc: 'Prior standard deviation of the compact flux, relative to its mean.',
      why: 'The flux is measured by the amplitudes; the prior only keeps it in the right decade.',
    },
    shortest: {
      type: 'number',
      from: 0,
      to: 20,
      default: 0.1,
      doc: 'Shortest baseline that enters the image fit, in units of 1e9 wavelengths.',
      why: 'Stations on one site see flux that all other baselines resolve out.',
    },
    gainPriors: {
      type: 'group',
      doc:
        'Prior standard deviations of the logarithm of the gains. A station that is not named here and lies far off ' +
        'in most scans is reported, and its prior widened.',
      fields: {
        usual: {
          type: 'number',
          from: 0.001,
          to: 3,
          default: 0.1,
          doc: 'For stations not named below.',
          why: '10 % is what a good station of a millimetre array reaches.',
        },
        stations: {
          type: 'map',
          of: { type: 'number', from: 0.001, to: 3, doc: 'Prior standard deviation of the log gain.' },
          default: {},
          doc: 'By name of station, such as 0.5 for a bad one.',
        },
      },
      default: {},
    },
    minimumSnr: {
      type: 'number',
      from: 0,
      to: 100,
      default: 2.5,
      doc:
        'Least signal-to-noise of visibilities in closure phases; at least 4 in log closure amplitudes. Triple phases enter up ' +
        'to an error of its inverse in radians. The report counts what each cut takes out.',
      why: 'Below it phase errors are no longer Gaussian, and log amplitudes are biased by the cut itself.',
    },
    centroid: {
      type: 'word',
      words: ['free', 'fixed'],
      default: 'free',
      doc:
        "Where the source stands, for complex visibilities. `free`: the centroid's offsets from the phase centre are two " +
        'parameters more, each with a Gaussian prior as wide as the field of the basis, and are looked for so far. ' +
        '`fixed`: at the phase centre. The other data do not see it, and nothing changes for them.',
      why: 'A source off the phase centre by a small part of the beam spoils a fit that holds it there.',
    },
    positivity: {
      type: 'number',
      from: 0,
      to: 1e6,
      default: 1,
      doc: 'Weight of the soft penalty on negative pixels; 0 for none.',
      why: 'Without it the centre of a ring goes negative and the diameter comes out small.',
    },
    starts: {
      type: 'integer',
      from: 1,
      to: 100,
      default: 4,
      doc: 'Starts of the search: the mean of the prior, and the library images that agree best with the data.',
      why: 'Closure phases have false minima; starts that end elsewhere are reported.',
    },
    posterior: {
      type: 'word',
      words: ['sampled', 'gaussian'],
      default: 'sampled',
      doc:
        '`sampled`: by a Hamiltonian sampler over flux, coefficients and gains. `gaussian`: the Gaussian of the curvature at ' +
        'the optimum, quick and too narrow where the posterior is bent. Where that is exact it is taken in any case.',
      why: 'Positivity and amplitudes make the posterior no Gaussian.',
    },
    sampler: {
      type: 'group',
      doc: 'Chains of the sampler. It goes on in rounds until the targets are met, or says that they are not.',
      default: {},
      fields: {
        chains: {
          type: 'integer',
          from: 2,
          to: 64,
          default: 4,
          doc: 'Chains, from starts wider than the posterior.',
          why: 'Four show whether they agree.',
        },
        warmUp: {
          type: 'integer',
          from: 20,
          to: 100000,
          default: 100,
          doc: 'Trajectories of each chain before any counts.',
          why: 'The coordinates are whitened beforehand, so that there is little to learn.',
        },
        draws: {
          type: 'integer',
          from: 10,
          to: 100000,
          default: 100,
          doc: 'Trajectories of each chain in a round.',
          why: 'Well-mixed chains meet the targets in some four rounds, and are asked after each.',
        },
        most: {
          type: 'integer',
          from: 10,
          to: 1000000,
          default: 1200,
          doc: 'Trajectories of each chain at most.',
          why: 'Chains that do not agree by then have more than one mode to visit.',
        },
        rHat: {
          type: 'number',
          from: 1,
          to: 2,
          default: 1.01,
          doc: 'Largest rank-normalised R-hat of flux and coefficients.',
          why: 'What Vehtari et al. 2021 recommend.',
        },
        ess: {
          type: 'number',
          from: 1,
          to: 1e6,
          default: 400,
          doc: 'Least effective number of draws, of the bulk and of the tails, of the flux and of each coefficient.',
          why: 'What Vehtari et al. 2021 recommend for four chains.',
        },
      },
    },
    samples: {
      type: 'integer',
      from: 2,
      to: 100000,
      default: 400,
      doc: 'Draws that are written, evenly out of those of all chains.',
      why: 'The ends of a 68 % interval are then known to a tenth of a standard deviation.',
    },
    seed: { type: 'integer', from: 0, to: 2147483647, default: 1, doc: 'Seed of the draws.' },
  },
  outputs: {
    image: {
      format: 'fits-image',
      doc:
        'The image at the maximum of the posterior, at the resolution of the basis, Jy per pixel. It is shown with its ' +
        'centroid moved to the origin, where the images of a library have theirs; output `flux` has the centroid.',
    },
    samples: {
      format: 'fits-table',
      doc: 'Draws of flux and coefficients, over all places of the centroid.',
    },
    residuals: { format: 'json', doc: 'Data with model and error, row by row and closure by closure.' },
    report: {
      format: 'json',
      doc:
        'Chi-squares by term and by station, choice of components with its curve, gains, starts and the minima they found, what ' +
        'cuts took out, the fit without each station, held-out baselines, the sampler, what was assumed.',
    },
    models: {
      format: 'json',
      doc:
        'Geometric models fitted to the same data terms (ring, elliptical ring, crescent, disc, Gaussian, double), compared by ' +
        'an information criterion and by held-out scans: whether the data prefer a dark centre.',
    },
    flux: {
      format: 'numbers',
      doc:
        'Total compact flux with its credible intervals; where complex visibilities fit the centroid, its offsets from ' +
        'the phase centre.',
      numbers: ['flux', 'centroid-east', 'centroid-north'],
    },
  },
  load: () => import('./compute.ts'),
} as const satisfies StageKind;
