/** Declaration of the kind `simulate`: a synthetic observation of an invented or given truth. */

import type { StageKind } from '../kind.ts';
import { ringTruth, station } from './declared-groups.ts';

export const simulate = {
  kind: 'simulate',
  version: 5,
  doc:
    'A synthetic observation: visibilities of a blurred ring or of an image, along the tracks that the rotation of the ' +
    'Earth gives an array, with thermal noise, station gains, station phases and, if asked for, errors that do not ' +
    'close. Writes FITS random groups as real data come. Every product says that the data are invented. Seeded.',
  source:
    'Thompson, Moran & Swenson, Interferometry and Synthesis in Radio Astronomy, 3rd ed.: eq. 4.1 for (u,v,w), section ' +
    '6.2 for the noise. Sidereal time: IAU 1982. The ring’s visibilities are exact, those of an image a direct sum.',
  inputs: {
    image: {
      format: 'fits-image',
      optional: true,
      doc: 'The truth, Jy per pixel, in place of the parameter `truth`.',
    },
  },
  parameters: {
    target: {
      type: 'group',
      doc: 'What is observed. The coordinates are taken as those of the date.',
      fields: {
        name: {
          type: 'text',
          pattern: '^[\\x20-\\x7e]{1,16}$',
          doc: 'Name of the target, at most 16 characters.',
        },
        ra: { type: 'quantity', unit: 'deg', from: 0, to: 360, doc: 'Right ascension.' },
        dec: { type: 'quantity', unit: 'deg', from: -90, to: 90, doc: 'Declination.' },
      },
    },
    band: {
      type: 'group',
      doc: 'Where in frequency.',
      fields: {
        frequency: { type: 'quantity', unit: 'Hz', from: 1e6, to: 1e13, doc: 'Middle of the band.' },
        bandwidth: { type: 'quantity', unit: 'Hz', from: 1, to: 1e12, doc: 'Width of the band.' },
      },
    },
    array: {
      type: 'text',
      pattern: '^[\\x20-\\x7e]{1,16}$',
      default: 'INVENTED',
      doc: 'Name of the array, at most 16 characters.',
      why: 'Says what it is.',
    },
    stations: {
      type: 'list',
      least: 2,
      most: 60,
      doc: 'The stations, each with a position either as `xyz` or as `longitude`, `latitude` and `height`.',
      of: station,
    },
    start: { type: 'text', doc: 'Start of the first scan, UTC, such as 2031-04-07T21:00:00Z.' },
    duration: {
      type: 'quantity',
      unit: 's',
      from: 1,
      to: 864000,
      doc: 'No scan ends later than this after the start.',
    },
    record: {
      type: 'quantity',
      unit: 's',
      from: 0.01,
      to: 3600,
      default: '10 s',
      doc: 'Integration of one record.',
      why: 'What files of millimetre arrays hold.',
    },
    scan: {
      type: 'quantity',
      unit: 's',
      from: 0.01,
      to: 86400,
      default: '5 min',
      doc: 'Length of a scan.',
      why: 'As above.',
    },
    interval: {
      type: 'quantity',
      unit: 's',
      from: 0.01,
      to: 86400,
      default: '20 min',
      doc: 'From the start of a scan to the start of the next.',
      why: 'Leaves time for calibrators.',
    },
    quantisationEfficiency: {
      type: 'number',
      from: 0.1,
      to: 1,
      default: 0.88,
      doc: 'Part of the signal-to-noise ratio that quantisation leaves.',
      why: 'Two bits, sampled at twice the bandwidth (Thompson, Moran & Swenson, chapter 8).',
    },
    phaseErrors: {
      type: 'word',
      words: ['unknown', 'none'],
      default: 'unknown',
      doc: 'Phases of stations: drawn evenly from the whole circle for every scan, or zero.',
      why: 'At millimetre wavelengths nobody knows them.',
    },
    nonClosing: {
      type: 'group',
      default: {},
      doc: 'Errors of baselines that no station accounts for, drawn anew for every baseline and scan.',
      fields: {
        amplitude: {
          type: 'number',
          from: 0,
          to: 1,
          default: 0,
          doc: 'Standard deviation of the logarithm of the amplitude.',
          why: 'Errors are in the data only when asked for.',
        },
        phase: {
          type: 'quantity',
          unit: 'deg',
          from: 0,
          to: 180,
          default: '0 deg',
          doc: 'Standard deviation of the phase.',
          why: 'Errors are in the data only when asked for.',
        },
      },
    },
    noiseFactor: {
      type: 'number',
      from: 0,
      to: 100,
      default: 1,
      doc: 'Noise in the data over the noise that the weights state.',
      why: 'Above 1 the stated noise is too small: a fault to be found.',
    },
    truth: ringTruth,
    extended: {
      type: 'group',
      optional: true,
      doc: 'A large Gaussian around the target that only the shortest baselines see; it is not in the truth image.',
      fields: {
        flux: { type: 'quantity', unit: 'Jy', from: 0, to: 1e9, doc: 'Flux density.' },
        fwhm: { type: 'quantity', unit: 'uas', from: 1, to: 1e12, doc: 'Full width at half maximum.' },
      },
    },
    resolution: {
      type: 'quantity',
      unit: 'uas',
      from: 0,
      to: 1e9,
      default: '0 uas',
      doc:
        'The numbers of the truth are measured on the truth convolved with a Gaussian of this FWHM, as a fit with a basis ' +
        'of that resolution shows it. The data and the truth image are not convolved.',
      why: 'Without it the truth is measured as it is.',
    },
    faults: {
      type: 'list',
      of: {
        type: 'group',
        doc: 'A fault to plant, to see whether the checks find it.',
        fields: {
          fault: {
            type: 'word',
            words: [
              'gain-drop',
              'non-closing-phase',
              'noise-understated',
              'stations-swapped',
              'clock-offset',
            ],
            doc:
              '`gain-drop`: the gain of `station` times `value` for a while. `non-closing-phase`: `value` degrees on the baseline ' +
              'of `station` and `other`. `noise-understated`: the noise `value` times what the weights say, on all ' +
              'baselines, those of `station`, or the one of `station` and `other`. `stations-swapped`: the positions of ' +
              'the two exchanged in the antenna table. `clock-offset`: all times late by `value` seconds.',
          },
          station: { type: 'text', optional: true, doc: 'Name of a station.' },
          other: { type: 'text', optional: true, doc: 'Name of a second one.' },
          from: {
            type: 'quantity',
            unit: 'h',
            from: 0,
            to: 1000,
            default: '0 h',
            doc: 'Since the start.',
            why: 'From the start.',
          },
          duration: {
            type: 'quantity',
            unit: 'h',
            from: 0,
            to: 1000,
            default: '1000 h',
            doc: 'How long.',
            why: 'To the end.',
          },
          value: {
            type: 'number',
            from: -1e4,
            to: 1e4,
            default: 1,
            doc: 'How much.',
            why: 'A gain of 1 is no fault.',
          },
        },
      },
      default: [],
      doc: 'Faults that are planted.',
      why: 'A sound observation has none.',
    },
    seed: {
      type: 'integer',
      from: 0,
      to: 2147483647,
      default: 1,
      doc: 'Seed of gains, phases and noise.',
      why: 'Any will do.',
    },
  },
  outputs: {
    data: { format: 'uv-fits', doc: 'The observation, FITS random groups.' },
    truth: {
      format: 'numbers',
      doc: 'Numbers of the truth at the declared resolution: diameter, width, asymmetry and so on, and the flux.',
      numbers: [
        'diameter',
        'width',
        'asymmetry',
        'position-angle',
        'central-depression',
        'roundness',
        'thin-ring-diameter',
        'flux',
      ],
    },
    image: { format: 'fits-image', doc: 'The truth, without extended flux, Jy per pixel.' },
  },
  load: () => import('./compute.ts'),
} as const satisfies StageKind;
