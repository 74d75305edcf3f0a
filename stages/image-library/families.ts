/** The families of images that a library can hold: how many of each by default, and the ranges from which their sizes
 *  are drawn. Position angles are drawn from the whole circle in every family. How each is built: family-models.ts.
 *
 *  The ranges fit a field of 160 uas and a source of 20 to 80 uas, such as the ring of a supermassive black hole seen
 *  at 1.3 mm. More than half of the images are no ring, and some are of shapes that theory does not allow: a library
 *  of rings alone would find a ring in any data. */

export interface SizeRange {
  readonly unit: 'uas' | 'deg' | '';
  /** The default range. */
  readonly low: number;
  readonly high: number;
  /** What a recipe may ask for. */
  readonly from: number;
  readonly to: number;
  readonly doc: string;
}

export interface Family {
  readonly count: number;
  readonly doc: string;
  readonly ranges: Readonly<Record<string, SizeRange>>;
}

function size(low: number, high: number, doc: string): SizeRange {
  return { unit: 'uas', low, high, from: 0, to: 1e6, doc };
}

function ratio(low: number, high: number, doc: string, to = 1): SizeRange {
  return { unit: '', low, high, from: 0, to, doc };
}

const RING_DIAMETER = 'Diameter of the thin ring.';
const RING_WIDTH = 'Full width at half maximum of the Gaussian that blurs it.';
const ASYMMETRY = 'b of the brightness 1 + 2 b cos(phi - phi0) along the ring.';

export const FAMILIES = {
  ring: {
    count: 300,
    doc: 'A blurred ring, brighter on one side.',
    ranges: {
      diameter: size(20, 75, RING_DIAMETER),
      width: size(5, 20, RING_WIDTH),
      asymmetry: ratio(0, 0.45, ASYMMETRY, 0.5),
    },
  },
  crescent: {
    count: 300,
    doc: 'A disc with a round hole off its centre, blurred.',
    ranges: {
      diameter: size(30, 75, 'Diameter of the disc.'),
      hole: ratio(0.4, 0.9, "Diameter of the hole, as a fraction of the disc's.", 0.99),
      offset: ratio(0, 1, 'Offset of the hole: 0 in the middle, 1 touching the edge.'),
      width: size(0, 10, 'Full width of the blur.'),
    },
  },
  'elliptical-ring': {
    count: 200,
    doc: 'A blurred ring, stretched.',
    ranges: {
      diameter: size(25, 75, 'Long diameter of the thin ring.'),
      axisRatio: ratio(0.4, 0.9, 'Short diameter over the long one.'),
      width: size(5, 15, RING_WIDTH),
      asymmetry: ratio(0, 0.3, ASYMMETRY, 0.5),
    },
  },
  'ring-with-spot': {
    count: 200,
    doc: 'A blurred ring with a Gaussian spot on it.',
    ranges: {
      diameter: size(25, 70, RING_DIAMETER),
      width: size(5, 15, RING_WIDTH),
      spotFlux: ratio(0.05, 0.5, "The spot's part of the flux."),
      spotWidth: size(5, 15, 'Full width of the spot, before the blur.'),
    },
  },
  'filled-ring': {
    count: 150,
    doc: 'A blurred ring around a disc of the same diameter: a centre that is not dark.',
    ranges: {
      diameter: size(25, 75, RING_DIAMETER),
      width: size(5, 15, RING_WIDTH),
      filling: ratio(0.1, 0.7, "The disc's part of the flux."),
    },
  },
  'ring-with-core': {
    count: 150,
    doc: 'A blurred ring with a Gaussian at its centre.',
    ranges: {
      diameter: size(30, 75, RING_DIAMETER),
      width: size(5, 15, RING_WIDTH),
      coreFlux: ratio(0.1, 0.6, "The core's part of the flux."),
      coreWidth: size(5, 15, 'Full width of the core, before the blur.'),
    },
  },
  'ring-in-halo': {
    count: 150,
    doc: 'A blurred ring on a wide Gaussian.',
    ranges: {
      diameter: size(20, 60, RING_DIAMETER),
      width: size(5, 15, RING_WIDTH),
      haloFlux: ratio(0.2, 0.7, "The halo's part of the flux."),
      haloWidth: size(30, 48, 'Full width of the halo, before the blur.'),
    },
  },
  arc: {
    count: 150,
    doc: 'A part of a blurred ring, of even brightness.',
    ranges: {
      diameter: size(25, 70, 'Diameter of the ring that it is a part of.'),
      length: { unit: 'deg', low: 60, high: 270, from: 0, to: 360, doc: 'Angle that the arc spans.' },
      width: size(5, 15, 'Full width of the blur.'),
    },
  },
  disc: {
    count: 150,
    doc: 'A uniform ellipse.',
    ranges: {
      diameter: size(15, 80, 'Long diameter.'),
      axisRatio: ratio(0.5, 1, 'Short diameter over the long one.'),
    },
  },
  gaussian: {
    count: 150,
    doc: 'An elliptical Gaussian.',
    ranges: {
      width: size(12, 45, 'Full width along the long axis.'),
      axisRatio: ratio(0.4, 1, 'Full width along the short axis over the long one.'),
    },
  },
  double: {
    count: 200,
    doc: 'Two Gaussians.',
    ranges: {
      separation: size(15, 50, 'Distance of the two.'),
      fluxRatio: ratio(0.1, 1, 'Flux of the second over that of the first.'),
      width: size(8, 20, 'Full width of each, drawn for each.'),
    },
  },
  clumps: {
    count: 250,
    doc: 'Several Gaussians without order.',
    ranges: {
      number: { unit: '', low: 3, high: 8, from: 1, to: 100, doc: 'How many; rounded down.' },
      extent: size(20, 56, 'Diameter of the circle in which they lie.'),
      width: size(6, 15, 'Full width, drawn for each.'),
    },
  },
  'square-ring': {
    count: 100,
    doc: 'The frame of a square; theory does not allow it.',
    ranges: {
      side: size(25, 65, 'Outer side.'),
      hole: ratio(0.4, 0.85, 'Inner side over the outer one.', 0.99),
    },
  },
  'spot-triangle': {
    count: 100,
    doc: 'Three equal Gaussians at the corners of an equilateral triangle.',
    ranges: {
      side: size(20, 60, 'Side of the triangle.'),
      width: size(6, 15, 'Full width of a spot.'),
    },
  },
  spiral: {
    count: 100,
    doc: 'A spiral line from the centre outwards; theory does not allow it.',
    ranges: {
      diameter: size(30, 70, 'Twice the radius of its outer end.'),
      turns: { unit: '', low: 0.75, high: 2, from: 0.1, to: 10, doc: 'Number of turns.' },
      width: size(5, 10, 'Full width of the line.'),
    },
  },
  bar: {
    count: 150,
    doc: 'A uniform rectangle.',
    ranges: {
      length: size(20, 80, 'Long side.'),
      breadth: size(4, 20, 'Short side.'),
    },
  },
  'two-rings': {
    count: 100,
    doc: 'Two blurred rings beside or across each other.',
    ranges: {
      diameter: size(15, 40, 'Diameter, drawn for each.'),
      separation: size(10, 40, 'Distance of their centres.'),
      fluxRatio: ratio(0.3, 1, 'Flux of the second over that of the first.'),
      width: size(5, 12, RING_WIDTH),
    },
  },
  cross: {
    count: 100,
    doc: 'Two equal bars across each other; theory does not allow it.',
    ranges: {
      length: size(25, 70, 'Long side of a bar.'),
      breadth: size(4, 12, 'Short side of a bar.'),
    },
  },
} as const satisfies Readonly<Record<string, Family>>;

export type FamilyName = keyof typeof FAMILIES;
