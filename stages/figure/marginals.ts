/** What the posterior plot shows: the flux, the numbers of the rings that were measured, and the leading coefficients. */

import type { Basis, Posterior, SkyImage } from '../data.ts';
import { angleDifference, circularMean } from '../numerics/statistics.ts';
import { type MeasuredRings, type RingValues, ringOf } from './measured-rings.ts';
import type { Marginal } from './posterior-plot.ts';

interface RingNumber {
  readonly name: string;
  readonly unit: string;
  readonly of: (ring: RingValues) => number | null;
}

const ringNumbers: readonly RingNumber[] = [
  { name: 'ring diameter', unit: 'µas', of: (ring) => ring.diameter },
  { name: 'ring width', unit: 'µas', of: (ring) => ring.width },
  { name: 'asymmetry', unit: '', of: (ring) => ring.asymmetry },
  { name: 'position angle', unit: '°', of: (ring) => ring.positionAngle },
  { name: 'central depression', unit: '', of: (ring) => ring.centralDepression },
];

/** Least share of draws with a ring for the ring's histograms to be drawn. */
const LEAST_RINGS = 0.5;
/** Leading coefficients shown: with the ring they fill three rows of three, without it two. */
const COEFFICIENTS = { beside: 3, alone: 5 };

/** Returns the marginals and a sentence on them. @param truth  at the resolution of the images, or null */
export function posteriorMarginals(
  basis: Basis,
  posterior: Posterior,
  { draws, rings }: MeasuredRings,
  truth: SkyImage | null,
): { readonly marginals: Marginal[]; readonly note: string } {
  const flux: Marginal = {
    name: 'flux of the image',
    unit: 'Jy',
    values: posterior.flux,
    ...truthOf(totalFlux(truth)),
  };
  if (!(rings.length >= LEAST_RINGS * draws)) {
    const note = `${posterior.count} draws; a ring in ${rings.length} of ${draws} looked at, too few to show`;
    return { marginals: [flux, ...coefficients(basis, posterior, COEFFICIENTS.alone)], note };
  }
  const trueRing = truth === null ? null : ringOf(truth);
  const ring = ringNumbers.map((number) => ringMarginal(number, rings, trueRing));
  const note = `${posterior.count} draws; ring measured in ${draws}, found in ${rings.length}; bias not corrected`;
  return { marginals: [flux, ...ring, ...coefficients(basis, posterior, COEFFICIENTS.beside)], note };
}

function ringMarginal(number: RingNumber, rings: readonly RingValues[], truth: RingValues | null): Marginal {
  const { name, unit } = number;
  const found = rings.map(number.of).filter((value) => value !== null);
  const trueValue = truth === null ? null : number.of(truth);
  if (unit !== '°') return { name, unit, values: Float64Array.from(found), ...truthOf(trueValue) };
  // Angles are shown about their circular mean, so that a histogram is not torn at north.
  const mean = circularMean(found).degrees;
  const near = (angle: number) => mean + angleDifference(angle, mean);
  return {
    name,
    unit,
    values: Float64Array.from(found, near),
    ...truthOf(trueValue === null ? null : near(trueValue)),
  };
}

/** Coefficients over the flux, in standard deviations of the library, where 1 is what the library shows. */
function coefficients(basis: Basis, posterior: Posterior, most: number): Marginal[] {
  const count = Math.min(most, posterior.components);
  return Array.from({ length: count }, (_, k) => ({
    name: `component ${k + 1}`,
    unit: 'σ of the library',
    values: posterior.flux.map((flux, s) => {
      const scale = flux * Math.sqrt(basis.eigenvalues[k]);
      return posterior.coefficients[s * posterior.components + k] / scale;
    }),
  }));
}

function totalFlux(image: SkyImage | null): number | null {
  return image === null ? null : image.pixels.reduce((sum, value) => sum + value, 0);
}

function truthOf(value: number | null): { truth?: number } {
  return value === null ? {} : { truth: value };
}
