/** Declaration of the kind `combine`: one number from several. */

import type { StageKind } from '../kind.ts';

export const combine = {
  kind: 'combine',
  version: 3,
  doc:
    'Brings numbers of several bands, days or recipes together: weighted mean with a variance between the sets, so that sets ' +
    'which disagree beyond their errors widen the result, the more the fewer they are; whether they are consistent. Angles ' +
    'are taken round the circle.',
  source:
    'Between-set variance: DerSimonian & Laird 1986, Controlled Clinical Trials 7, 177; intervals: Hartung & Knapp 2001, Stat. ' +
    'Med. 20, 3875; Knapp & Hartung 2003, Stat. Med. 22, 2693; consistency: Cochran 1954, Biometrics 10, 101. Circular statistics: Mardia & Jupp, Directional Statistics, section 2.2.',
  inputs: {
    numbers: {
      format: 'numbers',
      many: true,
      doc: 'Documents of numbers, one of each set; two or more.',
    },
  },
  parameters: {
    names: {
      type: 'list',
      of: { type: 'text', doc: 'Name of a number that every document has, with an interval.' },
      least: 1,
      doc: 'Which numbers to combine.',
    },
  },
  outputs: {
    numbers: { format: 'numbers', doc: 'The combined numbers, under the same names.' },
    report: {
      format: 'json',
      doc: 'Of each number: the sets, their weights, the variance between them, consistency.',
    },
  },
  load: () => import('./compute.ts'),
} as const satisfies StageKind;
