/** One random image of a family as a model of geometric parts (numerics/models.ts): sizes drawn from declared ranges,
 *  turned to a random position angle. What the families are: families.ts. */

import { type Model, type ModelPart, makePart } from '../numerics/models.ts';
import {
  blurredRing,
  crescent,
  curve,
  double,
  ellipticalGaussian,
  polar,
  squareRing,
} from '../numerics/named-models.ts';
import type { FamilyName } from './families.ts';

/** Draws the sizes of one image, and keeps what was drawn for the manifest. */
export interface SizeDraw {
  /** A value from the range of that name of the family: radians for lengths and angles. Drawn anew at every call. */
  size(name: string): number;
  /** A position angle from the whole circle, radians, kept under that name. */
  angle(name: string): number;
  /** 1 or -1, kept under that name. */
  sign(name: string): number;
  /** Uniform in [0, 1), not kept. */
  uniform(): number;
}

/** Points per line of an arc or a spiral: at the longest default spiral one for every 3 uas, closer than any width. */
const CURVE_POINTS = 48;

/** Builds a model from drawn sizes, one function per family. Flux and centroid are not yet normalised. */
export const buildModel: Readonly<Record<FamilyName, (draw: SizeDraw) => Model>> = {
  ring: (draw) =>
    blurredRing(draw.size('diameter'), draw.size('width'), draw.size('asymmetry'), draw.angle('brightest')),
  crescent: drawCrescent,
  'elliptical-ring': (draw) => {
    const length = draw.size('diameter');
    const ring = makePart('ring', {
      length,
      breadth: length * draw.size('axisRatio'),
      axis: draw.angle('axis'),
      asymmetry: draw.size('asymmetry'),
      brightest: draw.angle('brightest'),
    });
    return { parts: [ring], blur: draw.size('width') };
  },
  'ring-with-spot': (draw) => {
    const diameter = draw.size('diameter');
    const place = polar(diameter / 2, draw.angle('spotAngle'));
    const spot = makePart('gaussian', { length: draw.size('spotWidth'), ...place });
    return addPart(blurredRing(diameter, draw.size('width')), spot, draw.size('spotFlux'));
  },
  'filled-ring': (draw) => {
    const diameter = draw.size('diameter');
    const disc = makePart('disc', { length: diameter });
    return addPart(blurredRing(diameter, draw.size('width')), disc, draw.size('filling'));
  },
  'ring-with-core': (draw) => {
    const core = makePart('gaussian', { length: draw.size('coreWidth') });
    return addPart(blurredRing(draw.size('diameter'), draw.size('width')), core, draw.size('coreFlux'));
  },
  'ring-in-halo': (draw) => {
    const halo = makePart('gaussian', { length: draw.size('haloWidth') });
    return addPart(blurredRing(draw.size('diameter'), draw.size('width')), halo, draw.size('haloFlux'));
  },
  arc: (draw) => {
    const radius = draw.size('diameter') / 2;
    const length = draw.size('length');
    const middle = draw.angle('middle');
    const parts = curve(CURVE_POINTS, (t) => polar(radius, middle + (t - 0.5) * length));
    return { parts, blur: draw.size('width') };
  },
  disc: (draw) => {
    const length = draw.size('diameter');
    const breadth = length * draw.size('axisRatio');
    return { parts: [makePart('disc', { length, breadth, axis: draw.angle('axis') })], blur: 0 };
  },
  gaussian: (draw) => {
    const major = draw.size('width');
    return ellipticalGaussian(major, major * draw.size('axisRatio'), draw.angle('axis'));
  },
  double: (draw) => {
    const place = polar(draw.size('separation'), draw.angle('axis'));
    const points = double(draw.size('fluxRatio'), place.x, place.y);
    const parts = points.parts.map((part) => ({ ...part, ...gaussianSize(draw.size('width')) }));
    return { parts, blur: 0 };
  },
  clumps: drawClumps,
  'square-ring': (draw) => {
    const side = draw.size('side');
    return squareRing(side, side * draw.size('hole'), draw.angle('axis'));
  },
  'spot-triangle': (draw) => {
    const radius = draw.size('side') / Math.sqrt(3);
    const first = draw.angle('axis');
    const parts = [0, 1, 2].map((k) => makePart('point', polar(radius, first + (k * 2 * Math.PI) / 3)));
    return { parts, blur: draw.size('width') };
  },
  spiral: (draw) => {
    const radius = draw.size('diameter') / 2;
    const turns = draw.size('turns') * draw.sign('sense');
    const first = draw.angle('axis');
    // Points at the roots of even steps lie about evenly along the line.
    const parts = curve(CURVE_POINTS, (t) => {
      const s = Math.sqrt(t);
      return polar(s * radius, first + s * turns * 2 * Math.PI);
    });
    return { parts, blur: draw.size('width') };
  },
  bar: (draw) => ({ parts: [drawBar(draw, draw.angle('axis'))], blur: 0 }),
  'two-rings': (draw) => {
    const place = polar(draw.size('separation'), draw.angle('axis'));
    const first = makePart('ring', { length: draw.size('diameter') });
    const second = makePart('ring', {
      length: draw.size('diameter'),
      flux: draw.size('fluxRatio'),
      ...place,
    });
    return { parts: [first, second], blur: draw.size('width') };
  },
  cross: (draw) => {
    const bar = drawBar(draw, draw.angle('axis'));
    return { parts: [bar, { ...bar, axis: bar.axis + Math.PI / 2 }], blur: 0 };
  },
};

function drawCrescent(draw: SizeDraw): Model {
  const diameter = draw.size('diameter');
  const hole = diameter * draw.size('hole');
  const place = polar(((diameter - hole) / 2) * draw.size('offset'), draw.angle('holeAngle'));
  return { ...crescent(diameter, hole, place.x, place.y), blur: draw.size('width') };
}

function drawClumps(draw: SizeDraw): Model {
  const number = Math.floor(draw.size('number'));
  const radius = draw.size('extent') / 2;
  const parts = Array.from({ length: number }, () => {
    // The root of a uniform number spreads the places evenly over the circle.
    const place = polar(radius * Math.sqrt(draw.uniform()), 2 * Math.PI * draw.uniform());
    return makePart('gaussian', { flux: 0.2 + draw.uniform(), length: draw.size('width'), ...place });
  });
  return { parts, blur: 0 };
}

function drawBar(draw: SizeDraw, axis: number): ModelPart {
  return makePart('box', { length: draw.size('length'), breadth: draw.size('breadth'), axis });
}

function gaussianSize(width: number): Pick<ModelPart, 'shape' | 'length' | 'breadth'> {
  return { shape: 'gaussian', length: width, breadth: width };
}

/** A model of unit flux with one more part, which has the given fraction of the whole. */
function addPart(model: Model, part: ModelPart, fraction: number): Model {
  const parts = model.parts.map((one) => ({ ...one, flux: one.flux * (1 - fraction) }));
  return { ...model, parts: [...parts, { ...part, flux: fraction }] };
}
