/** Declaration of the kind `truth-recovery`: what the whole method makes of sources that are known.
 *
 *  What the ranks are. Strict simulation-based calibration (Talts et al. 2018, theorem 1) draws the truth from the prior; the
 *  ranks of truths among draws of the posterior are then uniform if the computation is right, and tell nothing else. That is
 *  test/long/sampler-coverage.test.ts. Here the truths are rings of families that no prior of the library was made of, and
 *  the ranks are those of true diameters among the corrected draws: the probability integral transform of what is published
 *  (Dawid 1984, J. R. Stat. Soc. A 147, 278; Gneiting, Balabdaoui & Raftery 2007, J. R. Stat. Soc. B 69, 243). Uniform they are if
 *  published values are off as often and as far as their intervals say, over these families; a slope of the histogram is a
 *  bias, a hump in its middle are intervals that are too wide.
 *
 *  Every observation has noise and gains of its own. While the families of a round shared them (until version 1), 75
 *  observations of a stage told of three realisations: their common error stood as a bias of 0.2 uas and as uneven ranks. */

import type { StageKind } from '../kind.ts';

export const truthRecovery = {
  kind: 'truth-recovery',
  version: 4,
  doc:
    'Observes known sources through the rows of given visibilities, fits and measures each as a pipeline would, corrects it ' +
    "for the method's bias from rings injected into the same coverage, and notes what was found beside the truth: rings of " +
    'many sizes and shapes, and sources that are none. With a second basis it fits some of them in that too, which tells how ' +
    'much the library pulls. The posterior is the Gaussian of the curvature: 0.5 s an observation, where chains take 5 s. ' +
    'The summary over many such stages is a stage of kind `recovery-summary`. All sources are invented.',
  source:
    'Common practice: an answer is worth what the same method makes of known sources. Ranks: Talts, Betancourt, Simpson, ' +
    'Vehtari & Gelman 2018, arXiv:1804.06788.',
  inputs: {
    visibilities: { format: 'visibilities', doc: 'Rows, noise and stations to observe through.' },
    basis: { format: 'basis', doc: 'The basis in which is fitted.' },
    otherBasis: {
      format: 'basis',
      optional: true,
      doc: 'A basis from a library without rings: rings are fitted in it too.',
    },
  },
  parameters: {
    each: {
      type: 'integer',
      from: 1,
      to: 1000,
      default: 4,
      doc: 'Observations of every family of truths; of those that are judged by themselves three times as many.',
      why: 'With two coverages and two noise levels that makes 496, at most 48 of what is judged together: a coverage is then known to 7 %.',
    },
    part: {
      type: 'number',
      from: 0.001,
      to: 1,
      default: 1,
      doc: 'Part of all observations that is made, evenly out of them.',
      why: 'A few show that the suite runs.',
    },
    noise: {
      type: 'number',
      from: 0.1,
      to: 100,
      default: 1,
      doc: 'Times the noise of the visibilities.',
      why: 'As observed.',
    },
    flux: {
      type: 'quantity',
      unit: 'Jy',
      from: 1e-6,
      to: 1e6,
      default: '0.8 Jy',
      doc: 'Flux of every source.',
      why: 'As in the demonstration.',
    },
    components: {
      type: 'integer',
      from: 1,
      to: 400,
      default: 40,
      doc: 'Components of every fit.',
      why: 'What the demonstration chooses by its data.',
    },
    gains: {
      type: 'number',
      from: 0.001,
      to: 1,
      default: 0.1,
      doc: 'Standard deviation of the log gains, drawn and believed.',
      why: 'A good station of a millimetre array.',
    },
    injections: {
      type: 'integer',
      from: 1,
      to: 100,
      default: 1,
      doc:
        'Rings that are injected about every ring that is found, and again about it without its bias; each observation is ' +
        'corrected by the twelve that came out most like it, its own and those of its neighbours.',
      why: 'Twelve are what a stage of kind `injection` makes about a ring. With two each of a hundred, few share many.',
    },
    models: {
      type: 'boolean',
      default: true,
      doc:
        'Whether geometric models have a say in what is a ring: for every source that is none, every ring that most draws do ' +
        'not show, and the first of each family.',
      why: 'They have in a pipeline. A second each; of 40 rings that most draws show they contradicted none.',
    },
    seed: { type: 'integer', from: 0, to: 2147483647, default: 1, doc: 'Seed of sources, gains and noise.' },
  },
  outputs: {
    trials: {
      format: 'json',
      doc: 'Every observation: family, truth, what was measured, corrected, and its rank.',
    },
  },
  load: () => import('./compute.ts'),
} as const satisfies StageKind;
