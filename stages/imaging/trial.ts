/** A trial: a known source is observed through the rows of given data, fitted and measured as those were. What comes out,
 *  less what went in, is the method's error. */

import type { Basis, Posterior, SkyImage, Visibilities } from '../data.ts';
import { makeDrawing } from '../numerics/draw.ts';
import type { Model } from '../numerics/models.ts';
import { measureRing, type RingMeasurement } from '../numerics/ring.ts';
import { circularMean, median, quantiles } from '../numerics/statistics.ts';
import { UAS_PER_RADIAN } from './intervals.ts';
import { measureDraws } from './measure-draws.ts';
import { drawPosterior } from './posterior-draws.ts';
import { type FitHints, type FitResult, runFit } from './run-fit.ts';
import type { FitSettings } from './settings.ts';
import { observe } from './synthetic.ts';

/** Quantities of a ring: lengths in uas, angles in degrees. */
export const QUANTITIES = ['diameter', 'width', 'asymmetry', 'position-angle', 'central-depression'] as const;
export type Quantity = (typeof QUANTITIES)[number];

/** Median and half of the 68 % interval over the draws with a ring; for the position angle about its circular mean. */
export type Measured = Readonly<Record<Quantity, { readonly value: number; readonly deviation: number }>>;

export interface Trial {
  /** The truth at the basis's resolution; null where it has no ring. */
  readonly truth: Readonly<Record<Quantity, number>> | null;
  readonly measured: Measured | null;
  readonly ringFraction: number;
  /** By quantity, of every draw with a ring. */
  readonly draws: Readonly<Record<Quantity, readonly number[]>>;
  readonly result: FitResult;
}

/** Part of the draws that have a ring, from which on they are enough. */
const MOSTLY = 0.9;

export interface TrialOptions {
  readonly seed: number;
  readonly gainDeviations: Float64Array;
  /** Draws of the Gaussian posterior; twice as many where some have no ring. */
  readonly draws: number;
  readonly noiseFactor?: number;
  readonly hints?: FitHints;
}

/** @param source  of the flux that is wanted, Jy; its centroid at the origin */
export function runTrial(
  template: Visibilities,
  basis: Basis,
  source: Model,
  settings: FitSettings,
  { seed, gainDeviations, draws: count, noiseFactor = 1, hints }: TrialOptions,
): Trial {
  const data = observe(template, source, { gainDeviations, seed, noiseFactor });
  const result = runFit(data, basis, settings, () => {}, hints);
  const { model } = result.problem;
  const { x, curvature } = result.best;
  // Pairs hold the median where both have a ring; where many have none it takes more draws.
  const posterior = drawPosterior(model, x, curvature, 2 * count, seed, true);
  const first = measureDraws(basis, partOf(posterior, 0, count));
  const isClear = first.rings.length >= MOSTLY * count;
  const rest = isClear ? null : measureDraws(basis, partOf(posterior, count, 2 * count));
  const rings = [...first.rings, ...(rest?.rings ?? [])];
  const draws = Object.fromEntries(
    QUANTITIES.map((name) => [name, rings.flatMap((ring) => quantityOf(ring, name) ?? [])]),
  ) as unknown as Trial['draws'];
  const truth = measureRing(imageAtResolution(source, basis));
  return {
    truth: truth.ring ? truthOf(truth) : null,
    measured: rings.length >= 2 ? (summary(draws) as Measured) : null,
    ringFraction: rings.length / (count + (rest?.count ?? 0)),
    draws,
    result,
  };
}

/** Some of the draws, in their order. */
function partOf({ components, flux, coefficients }: Posterior, from: number, to: number): Posterior {
  return {
    count: to - from,
    components,
    flux: flux.subarray(from, to),
    coefficients: coefficients.subarray(from * components, to * components),
  };
}

/** A model as the basis would show it: on its grid, at its resolution. */
export function imageAtResolution(source: Model, basis: Basis): SkyImage {
  const { nx, ny, pixelRadians, resolutionRadians } = basis;
  const pixels = new Float64Array(nx * ny);
  const blur = Math.sqrt(source.blur * source.blur + resolutionRadians * resolutionRadians);
  makeDrawing({ nx, ny, pixelRadians })(pixels, { ...source, blur });
  return { nx, ny, pixelRadians, pixels };
}

/** Null where a measurement lacks it. */
export function quantityOf(ring: RingMeasurement, name: Quantity): number | null {
  switch (name) {
    case 'diameter':
      return ring.diameter * UAS_PER_RADIAN;
    case 'width':
      return ring.width === null ? null : ring.width * UAS_PER_RADIAN;
    case 'asymmetry':
      return ring.asymmetry;
    case 'position-angle':
      return ring.positionAngleDegrees;
    case 'central-depression':
      return ring.centralDepression;
  }
}

function truthOf(ring: RingMeasurement): Record<Quantity, number> {
  return Object.fromEntries(QUANTITIES.map((name) => [name, quantityOf(ring, name) ?? 0])) as Record<
    Quantity,
    number
  >;
}

function summary(draws: Trial['draws']) {
  return Object.fromEntries(
    QUANTITIES.map((name) => {
      const values = draws[name];
      if (name !== 'position-angle') {
        const [low, high] = quantiles(values, [0.16, 0.84]);
        return [name, { value: median(values), deviation: (high - low) / 2 }];
      }
      const { degrees, deviationDegrees } = circularMean(values);
      return [name, { value: degrees, deviation: deviationDegrees }];
    }),
  );
}
