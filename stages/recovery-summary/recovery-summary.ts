/** Declaration of the kind `recovery-summary`: whether the method's numbers can be believed. */

import type { StageKind } from '../kind.ts';

export const recoverySummary = {
  kind: 'recovery-summary',
  version: 2,
  doc:
    'Brings the observations of stages of kind `truth-recovery` together, family by family: bias and scatter of every quantity, ' +
    'how often the intervals hold the truth, with binomial bounds, whether the ranks of the truths are uniform, how often ' +
    'what is no ring is called one, and how far the library pulls. Holds each against its target, and names what misses it.',
  source:
    'Bounds of a proportion: Wilson 1927, J. Am. Stat. Assoc. 22, 209. Uniformity of ranks: chi-square of ten bins, Talts, ' +
    'Betancourt, Simpson, Vehtari & Gelman 2018, arXiv:1804.06788.',
  inputs: {
    trials: { format: 'json', many: true, doc: 'Outputs `trials` of stages of kind `truth-recovery`.' },
  },
  parameters: {
    biasTarget: {
      type: 'number',
      from: 0,
      to: 1,
      default: 0.02,
      doc: 'Largest mean error of a diameter, as a part of it.',
      why: 'Below it a diameter is as good as its interval says.',
    },
    least: {
      type: 'integer',
      from: 2,
      default: 8,
      doc: 'A family with fewer observations is shown and not judged.',
      why: 'A proportion of fewer says nothing.',
    },
  },
  outputs: {
    numbers: {
      format: 'numbers',
      doc: 'Of all rings together, and by family `diameter-bias-FAMILY`, `coverage-68-FAMILY` and so on.',
    },
    report: {
      format: 'json',
      doc: 'Everything by family and quantity, and the targets with what misses them.',
    },
  },
  load: () => import('./compute.ts'),
} as const satisfies StageKind;
