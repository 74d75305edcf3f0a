/** Rings to inject, about one that was measured: known size, width, asymmetry, floor; round or nearly, some with a spot. None
 *  of them is in a library. */

import type { SkyImage } from '../data.ts';
import { thinRingDiameter } from '../numerics/blurred-ring.ts';
import { centredModel, type Model, makePart } from '../numerics/models.ts';
import { polar } from '../numerics/named-models.ts';
import { randomStream } from '../numerics/random.ts';
import { measureRing } from '../numerics/ring.ts';
import { mean } from '../numerics/statistics.ts';
import { deepestDepression, type Grid } from './deepest-depression.ts';
import { UAS_PER_RADIAN } from './intervals.ts';
import type { Quantity, Trial } from './trial.ts';

export interface AboutRing {
  /** Of the thin ring, radians. */
  readonly diameter: number;
  /** Before any convolution with the basis's resolution, radians. */
  readonly width: number;
  readonly asymmetry: number;
  /** Part of the flux that lies evenly over the disc inside. */
  readonly floor: number;
}

/** How far sizes are drawn from what was measured: as far as that may be off, since what is measured of rings farther away tells
 *  less of this one. A diameter is off by 5 %; the width, of which the blur leaves a part, by a quarter. */
const [DIAMETERS, WIDTHS] = [0.1, 0.25];
/** A depression is off by 0.05, which is a floor of a thirtieth. */
const [FLOORS, MOST_FLOOR] = [0.03, 0.1];
/** Of a Gaussian of unit height and FWHM: sqrt(pi / (4 ln 2)). */
const GAUSSIAN_AREA = 1.0644670194312262;
/** Short over long axis: the least that may pass for round. */
const LEAST_RATIO = 0.86;
/** Of all, those that have a spot. */
const WITH_SPOT = 1 / 3;

/** A ring as it shows at the resolution of a basis, lengths in radians. */
export type SeenRing = Readonly<Record<'diameter' | 'width' | 'asymmetry' | 'centralDepression', number>>;

/** Null where an image has no ring. */
export function ringIn(image: SkyImage): SeenRing | null {
  if (!image.pixels.some((value) => value > 0)) return null;
  const { ring, width, diameter, asymmetry, centralDepression } = measureRing(image);
  return ring && width !== null ? { diameter, width, asymmetry, centralDepression } : null;
}

/** The ring with what trials of rings like it came out wrong by taken out: of a ring that comes out too small and too wide,
 *  rings about what was seen would come out smaller and wider still, and be lost where it was not. */
export function withoutBias(seen: SeenRing, trials: readonly Pick<Trial, 'truth' | 'measured'>[]): SeenRing {
  const told = trials.flatMap(({ truth, measured }) => (truth && measured ? [{ truth, measured }] : []));
  const off = (name: Quantity) =>
    told.length === 0 ? 0 : mean(told.map(({ truth, measured }) => measured[name].value - truth[name]));
  return {
    diameter: seen.diameter - off('diameter') / UAS_PER_RADIAN,
    width: Math.max(seen.width / 2, seen.width - off('width') / UAS_PER_RADIAN),
    asymmetry: Math.max(0, seen.asymmetry - off('asymmetry')),
    centralDepression: Math.max(0, seen.centralDepression - off('central-depression')),
  };
}

/** The thin ring behind one that is seen, and its width without the resolution of the basis. */
export function aboutRing(seen: SeenRing, basis: Grid & { readonly resolutionRadians: number }): AboutRing {
  const { width, asymmetry, centralDepression } = seen;
  const resolution = basis.resolutionRadians;
  const sharp = Math.sqrt(Math.max(width * width - resolution * resolution, (width * width) / 9));
  const diameter = thinRingDiameter(seen.diameter, width) ?? seen.diameter;
  // On the ridge of a Gaussian of this width 1 / (pi d w) of the flux over sqrt(pi / (4 ln 2)), on the disc 4 / (pi d^2).
  const ofDisc = (4 * GAUSSIAN_AREA * width) / diameter;
  const lit = centralDepression - deepestDepression(diameter, width, basis);
  return { diameter, width: sharp, asymmetry, floor: Math.min(MOST_FLOOR, Math.max(0, lit / ofDisc)) };
}

/** Returns models of a flux, Jy. Sizes are spread evenly over their ranges, so that few do. */
export function injectedRings(about: AboutRing, flux: number, count: number, seed: number): Model[] {
  const random = randomStream(seed, 'injected rings');
  const order = shuffled(count, random);
  return Array.from({ length: count }, (_, k) => {
    const even = (place: number) => (2 * (place + random.uniform())) / count - 1;
    const diameter = about.diameter * (1 + DIAMETERS * even(k));
    const width = about.width * (1 + WIDTHS * even(order[k]));
    const spot = random.uniform() < WITH_SPOT ? random.between(0.05, 0.15) : 0;
    const floor = Math.max(0, about.floor + random.between(-FLOORS, FLOORS));
    const axis = random.between(0, Math.PI);
    const size = { length: diameter, breadth: diameter * random.between(LEAST_RATIO, 1), axis };
    const asymmetry = about.asymmetry * random.between(0.8, 1.2) + random.between(-0.03, 0.03);
    const brightest = random.between(0, 2 * Math.PI);
    const parts = [
      makePart('ring', {
        ...size,
        flux: 1 - floor - spot,
        asymmetry: Math.min(0.4, Math.max(0, asymmetry)),
        brightest,
      }),
      makePart('disc', { ...size, flux: floor }),
      makePart('gaussian', {
        length: width,
        flux: spot,
        ...polar(diameter / 2, random.between(0, 2 * Math.PI)),
      }),
    ];
    const model = centredModel({ parts: spot > 0 ? parts : parts.slice(0, 2), blur: width });
    return { ...model, parts: model.parts.map((part) => ({ ...part, flux: flux * part.flux })) };
  });
}

function shuffled(count: number, random: { integer(low: number, high: number): number }): number[] {
  const order = Array.from({ length: count }, (_, k) => k);
  for (let k = count - 1; k > 0; k--) {
    const other = random.integer(0, k);
    [order[k], order[other]] = [order[other], order[k]];
  }
  return order;
}
