import type { StageKind } from '../../../../stages/kind.ts';

export const callOut: StageKind = {
  kind: 'call-out',
  version: 1,
  doc: 'Tries to reach the network, and shows its environment.',
  source: 'common practice',
  inputs: {},
  parameters: {
    way: { type: 'word', words: ['import', 'builtin', 'fetch', 'none'], default: 'none', doc: 'In which way.' },
  },
  outputs: { environment: { format: 'json', doc: 'The environment.' } },
  load: () => import('./compute.ts'),
};
