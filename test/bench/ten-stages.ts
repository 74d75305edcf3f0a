/** The ten stages of the benchmark's invented recipe: kinds, inputs and outputs as those of the demonstration's recipe,
 *  parameters after defaults as its entries record them. Values change from run to run, sets of them come back. */

import type { Json, RecordedFinding } from '../../ledger/entry.ts';

export type StageName =
  | 'visibilities'
  | 'calibration'
  | 'library'
  | 'basis'
  | 'fit'
  | 'ring-model'
  | 'features'
  | 'pictures'
  | 'diagnostics'
  | 'combination';

export interface BenchStage {
  readonly name: StageName;
  readonly kind: string;
  /** Input, and the stage and output from which it comes. */
  readonly inputs: readonly (readonly [input: string, stage: StageName, output: string])[];
  readonly outputs: readonly (readonly [output: string, format: string])[];
  readonly findings?: readonly RecordedFinding[];
}

const finding = (
  check: string,
  value: number,
  marginal: number,
  limit: number,
  detail: string,
): RecordedFinding => ({
  check,
  finding: value < marginal ? 'within limits' : 'marginal',
  value,
  marginal,
  limit,
  detail,
});

/** In the order in which they are computed. */
export const STAGES: readonly BenchStage[] = [
  {
    name: 'visibilities',
    kind: 'ingest',
    inputs: [],
    outputs: [
      ['report', 'json'],
      ['visibilities', 'visibilities'],
    ],
    findings: [
      finding(
        'u and v against station positions',
        5.131772353242258e-8,
        0.001,
        0.005,
        'Largest difference over the longest baseline, 696 rows: the sign is that of the format; coordinates as they stand; sidereal time of the file.',
      ),
    ],
  },
  {
    name: 'calibration',
    kind: 'calibration-check',
    inputs: [['visibilities', 'visibilities', 'visibilities']],
    outputs: [
      ['report', 'json'],
      ['visibilities', 'visibilities'],
    ],
    findings: [
      finding(
        'closureScatter',
        0.9926533127572625,
        1.5,
        2.5,
        'Scatter over the stated errors of 55 independent closure phases of triangles with two co-located stations; largest for WICK-A–WICK-B–TALLOW, 1.36 in 8 scans; median closure phase 0.93 deg.',
      ),
      finding(
        'redundantPhases',
        1.0319032942492616,
        1.5,
        2.5,
        'Scatter over the stated errors of 45 independent phase differences on far baselines of co-located stations; largest for FLINT-A, FLINT-B to EMBER, 1.47 in 5 scans.',
      ),
      finding(
        'redundantAmplitudes',
        0.8926088427849149,
        1.5,
        2.5,
        'Scatter over the stated errors of 45 independent closure amplitudes that must be 1; largest for FLINT-A, FLINT-B to GLIM, 1.16 in 5 scans.',
      ),
      finding(
        'gainOffset',
        0.2736631621824687,
        0.2,
        0.6,
        'Largest mean log gain ratio of 2 co-located pairs: WICK-A and WICK-B, 0.274 over 8 scans; farthest from the others is WICK-B, 0.291 low in ln.',
      ),
    ],
  },
  {
    name: 'library',
    kind: 'image-library',
    inputs: [],
    outputs: [
      ['images', 'fits-cube'],
      ['manifest', 'json'],
    ],
  },
  {
    name: 'basis',
    kind: 'basis-build',
    inputs: [
      ['library', 'library', 'images'],
      ['manifest', 'library', 'manifest'],
    ],
    outputs: [
      ['basis', 'basis'],
      ['report', 'json'],
    ],
  },
  {
    name: 'fit',
    kind: 'fit',
    inputs: [
      ['basis', 'basis', 'basis'],
      ['visibilities', 'calibration', 'visibilities'],
    ],
    outputs: [
      ['flux', 'numbers'],
      ['image', 'fits-image'],
      ['report', 'json'],
      ['residuals', 'json'],
      ['samples', 'fits-table'],
    ],
  },
  {
    name: 'ring-model',
    kind: 'fit',
    inputs: [['visibilities', 'calibration', 'visibilities']],
    outputs: [
      ['flux', 'numbers'],
      ['image', 'fits-image'],
      ['report', 'json'],
      ['residuals', 'json'],
      ['samples', 'fits-table'],
    ],
  },
  {
    name: 'features',
    kind: 'features',
    inputs: [
      ['basis', 'basis', 'basis'],
      ['image', 'fit', 'image'],
      ['samples', 'fit', 'samples'],
    ],
    outputs: [
      ['report', 'json'],
      ['ring', 'numbers'],
    ],
  },
  {
    name: 'pictures',
    kind: 'figure',
    inputs: [
      ['basis', 'basis', 'basis'],
      ['image', 'fit', 'image'],
      ['ring', 'features', 'ring'],
      ['samples', 'fit', 'samples'],
      ['visibilities', 'calibration', 'visibilities'],
    ],
    outputs: [
      ['components', 'svg'],
      ['image', 'svg'],
      ['profile', 'svg'],
    ],
  },
  {
    name: 'diagnostics',
    kind: 'figure',
    inputs: [
      ['basis', 'basis', 'basis'],
      ['calibration', 'calibration', 'report'],
      ['residuals', 'fit', 'residuals'],
      ['samples', 'fit', 'samples'],
      ['visibilities', 'calibration', 'visibilities'],
    ],
    outputs: [
      ['coverage', 'svg'],
      ['data', 'svg'],
      ['posterior', 'svg'],
      ['scree', 'svg'],
    ],
  },
  {
    name: 'combination',
    kind: 'features',
    inputs: [
      ['image', 'fit', 'image'],
      ['model', 'ring-model', 'image'],
      ['ring', 'features', 'ring'],
    ],
    outputs: [
      ['report', 'json'],
      ['ring', 'numbers'],
    ],
  },
];

const quantity = (value: number, unit: string): Json => ({ value, unit });
const span = (from: number, to: number, unit: string): Json => [quantity(from, unit), quantity(to, unit)];
const limits = (marginal: number, limit: number): Json => ({ marginal, limit });

/** What the image-library records: one group of ranges for each of 17 families. */
const FAMILIES: Json = Object.fromEntries(
  [
    'arc',
    'bar',
    'clumps',
    'crescent',
    'cross',
    'disc',
    'double',
    'elliptical-ring',
    'filled-ring',
    'gaussian',
    'ring',
    'ring-in-halo',
    'ring-with-core',
    'ring-with-spot',
    'spiral',
    'square-ring',
    'two-rings',
  ].map((family, i) => [
    family,
    {
      count: 5 * (1 + (i % 8)),
      asymmetry: [0, 0.45],
      diameter: span(20 + i, 75, 'uas'),
      width: span(5, 15 + i, 'uas'),
    },
  ]),
);

/** A stage's parameters in a run. */
export function parametersOf(stage: StageName, run: number): { readonly [name: string]: Json } {
  switch (stage) {
    case 'visibilities':
      return {
        averaging: 'scan',
        checksums: 'verify',
        completeness: 0.5,
        gap: quantity(60, 's'),
        leaveOut: [],
        polarisation: 'stokes-i',
        timeOrigin: 0,
        uvSign: 'check',
      };
    case 'calibration':
      return {
        amplitudeBudget: 'estimate',
        closureScatter: limits(1.5, 2.5),
        colocated: quantity(10_000, 'm'),
        gainOffset: limits(0.2, 0.6),
        gainScatter: limits(0.25, 0.5),
        least: 10,
        minimumSnr: 5,
        outOfLimits: 'stop',
        phaseBudget: 'estimate',
        redundantAmplitudes: limits(1.5, 2.5),
        redundantPhases: limits(1.5, 2.5),
        statedNoise: limits(1.5, 2.5),
      };
    case 'library':
      return {
        copies: 10,
        copyScale: [0.8, 1.25],
        families: FAMILIES,
        field: quantity(160, 'uas'),
        pixels: 64,
        seed: run,
      };
    case 'basis':
      return { components: 12 + 4 * (run % 8), heldOut: 0.1, resolution: quantity(10 + (run % 5), 'uas') };
    case 'fit':
      return {
        components: 10 + 4 * (run % 16),
        data: 'closure-phases-and-amplitudes',
        fluxPrior: 0.5,
        gainPriors: { stations: { 'WICK-B': 0.5 }, usual: 0.1 },
        minimumSnr: 2.5 + 0.25 * (Math.floor(run / 16) % 4),
        positivity: 1,
        priorWidth: 1 + 0.5 * (Math.floor(run / 64) % 5),
        samples: 60,
        seed: 1 + (Math.floor(run / 320) % 40),
        shortest: 0.1,
        starts: 4,
      };
    case 'ring-model':
      return {
        components: 0,
        data: 'closure-phases-and-amplitudes',
        fluxPrior: 0.5,
        minimumSnr: 2.5,
        model: 'ring',
        positivity: 1,
        priorWidth: 2,
        samples: 60,
        seed: 1 + (run % 40),
        shortest: 0.1,
        starts: 4,
      };
    case 'features':
    case 'combination':
      return { angles: 72, radii: quantity(0.5 + 0.25 * (run % 3), 'uas') };
    case 'pictures':
    case 'diagnostics':
      return { draws: 60, shown: 12 };
  }
}

/** What a stage warned of in a run. */
export function warningsOf(stage: StageName, run: number): readonly string[] {
  if (stage !== 'fit' || run % 3 !== 0) return [];
  return [
    'the implied compact flux of 0.768 Jy exceeds the 0.689 Jy that the shortest baselines measure in all: the image holds flux that is not there',
    'reduced chi-square of the closure phases is 3.79: too few components, errors stated too small, or a source that the library does not hold',
  ];
}
