import type { StageKind } from '../../../../stages/kind.ts';

export const linger: StageKind = {
  kind: 'linger',
  version: 1,
  doc: 'Waits.',
  source: 'common practice',
  inputs: {},
  parameters: { time: { type: 'quantity', unit: 's', default: '60 s', doc: 'How long.' } },
  outputs: { nothing: { format: 'file', doc: 'A word.' } },
  load: () => import('./compute.ts'),
};
