/** Rings to inject, about one that was measured: known size, width, asymmetry, floor; round or nearly, some with a spot. None
 *  of them is in a library. */

import { centredModel, type Model, makePart } from '../numerics/models.ts';
import { polar } from '../numerics/named-models.ts';
import { randomStream } from '../numerics/random.ts';

export interface AboutRing {
  /** Of the thin ring, radians. */
  readonly diameter: number;
  /** Before any convolution with the basis's resolution, radians. */
  readonly width: number;
  readonly asymmetry: number;
}

/** How far sizes are drawn from what was measured. */
const [DIAMETERS, WIDTHS] = [0.15, 0.25];
/** Of all, those that have a spot. */
const WITH_SPOT = 1 / 3;

/** Returns models of a flux, Jy. Sizes are spread evenly over their ranges, so that few do. */
export function injectedRings(about: AboutRing, flux: number, count: number, seed: number): Model[] {
  const random = randomStream(seed, 'injected rings');
  const order = shuffled(count, random);
  return Array.from({ length: count }, (_, k) => {
    const even = (place: number) => (2 * (place + random.uniform())) / count - 1;
    const diameter = about.diameter * (1 + DIAMETERS * even(k));
    const width = about.width * (1 + WIDTHS * even(order[k]));
    const spot = random.uniform() < WITH_SPOT ? random.between(0.05, 0.15) : 0;
    const floor = random.between(0, 0.1);
    const axis = random.between(0, Math.PI);
    const size = { length: diameter, breadth: diameter * random.between(0.92, 1), axis };
    const asymmetry = Math.min(0.4, about.asymmetry * random.between(0.6, 1.3) + random.between(0, 0.05));
    const brightest = random.between(0, 2 * Math.PI);
    const parts = [
      makePart('ring', { ...size, flux: 1 - floor - spot, asymmetry, brightest }),
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
