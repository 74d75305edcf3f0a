/** Geometric models of a source, each with parameters x that are near standard normal for any sensible source: logarithms
 *  of lengths about a quarter of the field, logits of fractions, vectors for what has a direction. The first is the flux.
 *
 *    length      L = L0 exp(x s)                fraction   f = 1 / (1 + e^-(m + x))
 *    direction   b = most * w / sqrt(1 + |w|^2), w the two parameters: |b| < most
 *
 *  All models have their centroid at the origin and unit flux before the factor. A ring is a thin ring, brighter on one
 *  side, around a disc of the same diameter with a part of the flux (its floor), all convolved with a Gaussian: shapes and
 *  transforms in numerics/models.ts. */

import { atan2, cos as cosineOf, exp, sin as sineOf } from '../../numerics/elementary.ts';
import { centredModel, type Model, makePart } from '../../numerics/models.ts';
import { ellipticalGaussian } from '../../numerics/named-models.ts';

export interface Measure {
  readonly name: string;
  readonly unit: 'uas' | 'deg' | '';
  readonly value: number;
}

export interface ModelKind {
  readonly model: string;
  /** Whether it is dark inside. */
  readonly isRing: boolean;
  /** Parameters besides the flux. */
  readonly size: number;
  /** The source at unit flux. @param x  without the flux  @param length  L0, radians */
  build(x: Float64Array, length: number): Model;
  /** Its sizes in the units of reports. */
  measures(x: Float64Array, length: number): Measure[];
  /** Brightness at the centre over that on the ridge, roughly: what decides whether it is dark. 1 for models without ridge. */
  centre(x: Float64Array, length: number): number;
  /** Where searches start, without the flux. */
  readonly starts: readonly (readonly number[])[];
}

/** Integral of a Gaussian of unit peak over its full width at half maximum, sqrt(pi / (4 ln 2)). */
const GAUSSIAN_AREA = Math.sqrt(Math.PI / (4 * Math.LN2));
const UAS = (180 * 3600e6) / Math.PI;
/** Standard deviation of the logarithm of a length: from a third to three times L0 within two of them. */
const LOG_WIDTH = 0.6;
/** Of a ring's flux, what its floor may hold at most: with more it is a disc. */
const MOST_FLOOR = 0.5;

const lengthOf = (x: number, length: number) => length * exp(LOG_WIDTH * x);
const fraction = (x: number, from: number, to: number) => from + (to - from) / (1 + exp(-x));

function direction(a: number, b: number, most: number): { readonly size: number; readonly angle: number } {
  const w = Math.sqrt(a * a + b * b);
  return { size: (most * w) / Math.sqrt(1 + w * w), angle: w === 0 ? 0 : atan2(a, b) };
}

const degrees = (radians: number, turn: number) => {
  const d = (radians * 180) / Math.PI;
  return d - turn * Math.floor(d / turn);
};

/** Sizes that are tried first, from a third of the field to a twelfth. */
const SIZES = [0.6, 0, -0.6, -1.2];
const AROUND = [
  [0.5, 0],
  [-0.5, 0],
  [0, 0.5],
  [0, -0.5],
] as const;

/** x: diameter, width, two of asymmetry, floor; of an ellipse the axis ratio's two as well. */
function ringKind(isElliptical: boolean): ModelKind {
  const build: ModelKind['build'] = (x, length) => {
    const diameter = lengthOf(x[0], length);
    const { size: b, angle } = direction(x[2], x[3], 0.5);
    const floor = fraction(x[4] - 2, 0, MOST_FLOOR);
    const shape = isElliptical ? direction(x[5], x[6], 0.6) : { size: 0, angle: 0 };
    // An axis has no sense of direction: half the angle of its vector.
    const ellipse = { length: diameter, breadth: diameter * (1 - shape.size), axis: shape.angle / 2 };
    return centredModel({
      parts: [
        makePart('ring', { ...ellipse, flux: 1 - floor, asymmetry: b, brightest: angle }),
        makePart('disc', { ...ellipse, flux: floor }),
      ],
      blur: lengthOf(x[1] - 2, length),
    });
  };
  return {
    model: isElliptical ? 'elliptical ring' : 'ring',
    isRing: true,
    size: isElliptical ? 7 : 5,
    build,
    measures(x, length) {
      const { size, angle } = direction(x[2], x[3], 0.5);
      return [
        { name: 'diameter', unit: 'uas', value: UAS * lengthOf(x[0], length) },
        { name: 'width', unit: 'uas', value: UAS * lengthOf(x[1] - 2, length) },
        { name: 'asymmetry', unit: '', value: size },
        { name: 'position-angle', unit: 'deg', value: degrees(angle, 360) },
        { name: 'floor', unit: '', value: fraction(x[4] - 2, 0, MOST_FLOOR) },
        ...(isElliptical
          ? [{ name: 'axis-ratio', unit: '' as const, value: 1 - direction(x[5], x[6], 0.6).size }]
          : []),
      ];
    },
    centre(x, length) {
      const [diameter, width] = [lengthOf(x[0], length), lengthOf(x[1] - 2, length)];
      const floor = fraction(x[4] - 2, 0, MOST_FLOOR);
      // Of the disc; of a ring whose cross-section is a Gaussian of that full width; half of the disc lies below it.
      const inside = (4 * floor) / (diameter * diameter);
      const ridge = (1 - floor) / (GAUSSIAN_AREA * diameter * width) + inside / 2;
      return inside / ridge;
    },
    starts: SIZES.flatMap((d) =>
      AROUND.map(([a, b]) => [d, 0.3, a, b, 0, ...(isElliptical ? [0.1, 0.1] : [])]),
    ),
  };
}

/** A disc with a round hole off its centre, blurred. x: diameter, hole's share of it, two of its offset, blur. */
const crescentKind: ModelKind = {
  model: 'crescent',
  isRing: true,
  size: 5,
  build(x, length) {
    const outer = lengthOf(x[0], length);
    const inner = outer * fraction(x[1] + 1, 0.3, 0.95);
    const { size, angle } = direction(x[2], x[3], 1);
    // From the middle to touching the edge.
    const offset = (size * (outer - inner)) / 2;
    const area = outer * outer - inner * inner;
    const model: Model = {
      parts: [
        makePart('disc', { length: outer, flux: (outer * outer) / area }),
        makePart('disc', {
          length: inner,
          flux: (-inner * inner) / area,
          x: offset * sineOf(angle),
          y: offset * cosineOf(angle),
        }),
      ],
      blur: lengthOf(x[4] - 2, length),
    };
    return centredModel(model);
  },
  measures(x, length) {
    const { angle, size } = direction(x[2], x[3], 1);
    return [
      { name: 'diameter', unit: 'uas', value: UAS * lengthOf(x[0], length) },
      { name: 'hole', unit: '', value: fraction(x[1] + 1, 0.3, 0.95) },
      { name: 'offset', unit: '', value: size },
      { name: 'position-angle', unit: 'deg', value: degrees(angle + Math.PI, 360) },
      { name: 'width', unit: 'uas', value: UAS * lengthOf(x[4] - 2, length) },
    ];
  },
  centre: () => 0,
  starts: SIZES.flatMap((d) => AROUND.map(([a, b]) => [d + 0.4, 0, a, b, 0])),
};

/** A uniform ellipse, blurred. x: long diameter, two of the axis ratio, blur. */
const discKind: ModelKind = {
  model: 'disc',
  isRing: false,
  size: 4,
  build(x, length) {
    const long = lengthOf(x[0], length);
    const { size, angle } = direction(x[1], x[2], 0.9);
    const part = makePart('disc', { length: long, breadth: long * (1 - size), axis: angle / 2 });
    return { parts: [part], blur: lengthOf(x[3] - 2, length) };
  },
  measures: (x, length) => [
    { name: 'diameter', unit: 'uas', value: UAS * lengthOf(x[0], length) },
    { name: 'axis-ratio', unit: '', value: 1 - direction(x[1], x[2], 0.9).size },
    { name: 'axis', unit: 'deg', value: degrees(direction(x[1], x[2], 0.9).angle / 2, 180) },
    { name: 'width', unit: 'uas', value: UAS * lengthOf(x[3] - 2, length) },
  ],
  centre: () => 1,
  starts: SIZES.flatMap((d) => AROUND.map(([a, b]) => [d + 0.4, a, b, -0.5])),
};

/** x: long full width, two of the axis ratio. */
const gaussianKind: ModelKind = {
  model: 'gaussian',
  isRing: false,
  size: 3,
  build(x, length) {
    const long = lengthOf(x[0], length);
    const { size, angle } = direction(x[1], x[2], 0.95);
    return ellipticalGaussian(long, long * (1 - size), angle / 2);
  },
  measures: (x, length) => [
    { name: 'width', unit: 'uas', value: UAS * lengthOf(x[0], length) },
    { name: 'axis-ratio', unit: '', value: 1 - direction(x[1], x[2], 0.95).size },
    { name: 'axis', unit: 'deg', value: degrees(direction(x[1], x[2], 0.95).angle / 2, 180) },
  ],
  centre: () => 1,
  starts: SIZES.flatMap((d) => AROUND.map(([a, b]) => [d, a, b])),
};

/** Two round Gaussians: x: separation east and north over L0, the second's part of the flux, both widths. With no
 *  separation a core in a halo. */
const doubleKind: ModelKind = {
  model: 'double',
  isRing: false,
  size: 5,
  build(x, length) {
    const second = fraction(x[2], 0, 1);
    return centredModel({
      parts: [
        makePart('gaussian', { length: lengthOf(x[3] - 1, length), flux: 1 - second }),
        makePart('gaussian', {
          length: lengthOf(x[4] - 1, length),
          flux: second,
          x: x[0] * length,
          y: x[1] * length,
        }),
      ],
      blur: 0,
    });
  },
  measures: (x, length) => [
    { name: 'separation', unit: 'uas', value: UAS * length * Math.sqrt(x[0] * x[0] + x[1] * x[1]) },
    { name: 'position-angle', unit: 'deg', value: degrees(atan2(x[0], x[1]), 360) },
    { name: 'second-flux', unit: '', value: fraction(x[2], 0, 1) },
    { name: 'width', unit: 'uas', value: UAS * lengthOf(x[3] - 1, length) },
    { name: 'second-width', unit: 'uas', value: UAS * lengthOf(x[4] - 1, length) },
  ],
  centre: () => 1,
  starts: [
    ...[0.5, 0.8, 1.2].flatMap((d) =>
      Array.from({ length: 8 }, (_, k) => {
        const angle = (k * Math.PI) / 4;
        return [d * sineOf(angle), d * cosineOf(angle), -0.3, 0, 0];
      }),
    ),
    [0.05, 0.05, 0, -0.5, 1],
    [0.05, 0.05, 0, 0, 1.5],
  ],
};

export const MODEL_KINDS: readonly ModelKind[] = [
  ringKind(false),
  ringKind(true),
  crescentKind,
  discKind,
  gaussianKind,
  doubleKind,
];
