import type { StageKind } from '../../../../stages/kind.ts';

export const trespass: StageKind = {
  kind: 'trespass',
  version: 1,
  doc: 'Touches what it did not declare.',
  source: 'common practice',
  inputs: {},
  parameters: {
    path: { type: 'text', doc: 'What is touched.' },
    how: { type: 'word', words: ['read', 'write', 'start', 'worker'], default: 'read', doc: 'In which way.' },
  },
  outputs: { loot: { format: 'file', doc: 'What was found.' } },
  load: () => import('./compute.ts'),
};
