/** Two invented kinds that use every type of declaration, for the tests of recipes. */

import type { StageKind } from '../../../stages/kind.ts';

const load = async () => {
  throw new Error('these kinds compute nothing');
};

const observe: StageKind = {
  kind: 'observe',
  version: 3,
  doc: 'Makes data. Invented for tests.',
  source: 'Nowhere.',
  inputs: { image: { format: 'fits-image', doc: 'The truth.', optional: true } },
  parameters: {
    stations: {
      type: 'map',
      of: {
        type: 'group',
        fields: {
          sefd: { type: 'quantity', unit: 'Jy', from: 0, doc: 'Sensitivity.' },
          limit: {
            type: 'quantity',
            unit: 'deg',
            from: 0,
            to: 90,
            default: '10 deg',
            doc: 'Lowest elevation.',
          },
        },
        doc: 'One station.',
      },
      default: {},
      doc: 'Stations by name.',
    },
    noise: {
      type: 'group',
      fields: {
        seed: { type: 'integer', from: 0, default: 1, doc: 'Seed.' },
        level: { type: 'number', from: 0, to: 1, default: 0.5, doc: 'Level.' },
      },
      default: { level: 0.25 },
      doc: 'Noise.',
    },
    clock: {
      type: 'group',
      fields: { offset: { type: 'quantity', unit: 's', default: '0 s', doc: 'Offset.' } },
      doc: 'Clock, made up of its fields.',
    },
    polarised: { type: 'boolean', default: false, doc: 'Whether hands differ.' },
    title: { type: 'text', pattern: '^[A-Z]', optional: true, doc: 'A title.' },
  },
  outputs: {
    data: { format: 'uv-fits', doc: 'Data.' },
    truth: { format: 'numbers', doc: 'Truth.', needs: ['image'] },
  },
  load,
};

const fit: StageKind = {
  kind: 'fit',
  version: 1,
  doc: 'Fits.',
  source: 'Nowhere.',
  inputs: {
    data: { format: ['uv-fits', 'oifits'], doc: 'Data.' },
    extra: { format: 'json', many: true, optional: true, doc: 'Remarks.' },
  },
  parameters: {
    field: { type: 'quantity', unit: 'uas', from: 1, to: 1000, doc: 'Field of view.' },
    components: {
      type: 'either',
      of: [
        { type: 'integer', from: 1, to: 400, doc: '' },
        { type: 'word', words: ['by-data', 'all'], doc: '' },
      ],
      default: 20,
      doc: 'Components.',
      why: 'Enough for these tests.',
    },
    terms: {
      type: 'list',
      of: { type: 'word', words: ['visibilities', 'closure-phases'], doc: '' },
      least: 1,
      default: ['visibilities'],
      doc: 'Data terms.',
    },
  },
  outputs: {
    ring: { format: 'numbers', doc: 'The ring.' },
    picture: { format: 'svg', doc: 'A picture.' },
    report: { format: 'json', doc: 'What was done.' },
  },
  load,
};

export const sampleKinds: readonly StageKind[] = [observe, fit];
