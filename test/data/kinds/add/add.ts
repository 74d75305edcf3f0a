import type { StageKind } from '../../../../stages/kind.ts';

export const add: StageKind = {
  kind: 'add',
  version: 1,
  doc: 'Adds a number to the numbers that come in.',
  source: 'common practice',
  inputs: { data: { format: ['json', 'file'], doc: 'Numbers.', many: true } },
  parameters: {
    term: { type: 'number', default: 1, doc: 'What is added.' },
    length: { type: 'quantity', unit: 'm', default: '1 km', doc: 'Added too, in metres.' },
  },
  outputs: { sum: { format: 'json', doc: 'The sum.' } },
  load: () => import('./compute.ts'),
};
