/** Models of models.ts by their names in the trade, each of unit flux. Lengths in radians, position angles in radians
 *  from north through east. */

import { cos, sin } from './elementary.ts';
import { type Model, type ModelPart, makePart } from './models.ts';

/** A ring of zero width. */
export function thinRing(diameter: number): Model {
  return { parts: [makePart('ring', { length: diameter })], blur: 0 };
}

/** A thin ring with brightness 1 + 2 b cos(phi - brightest), convolved with a Gaussian of full width `width`.
 *  @param b  0 to 0.5 */
export function blurredRing(diameter: number, width: number, b = 0, brightest = 0): Model {
  return { parts: [makePart('ring', { length: diameter, asymmetry: b, brightest })], blur: width };
}

/** A uniform disc. */
export function uniformDisc(diameter: number): Model {
  return { parts: [makePart('disc', { length: diameter })], blur: 0 };
}

/** A Gaussian of full widths `major` (along the axis) and `minor`. */
export function ellipticalGaussian(major: number, minor = major, axis = 0): Model {
  return { parts: [makePart('gaussian', { length: major, breadth: minor, axis })], blur: 0 };
}

/** A uniform disc with a round hole of the diameter `inner`, the hole's centre at (x, y) from the disc's: a crescent,
 *  or an annulus when the hole is in the middle. Its centroid is off the origin (centredModel shifts it). */
export function crescent(outer: number, inner: number, x = 0, y = 0): Model {
  const area = outer * outer - inner * inner;
  return {
    parts: [
      makePart('disc', { length: outer, flux: (outer * outer) / area }),
      makePart('disc', { length: inner, flux: (-inner * inner) / area, x, y }),
    ],
    blur: 0,
  };
}

/** Two points: one at the origin, one of `ratio` times its flux at (x, y). */
export function double(ratio: number, x: number, y: number): Model {
  const parts = [
    makePart('point', { flux: 1 / (1 + ratio) }),
    makePart('point', { flux: ratio / (1 + ratio), x, y }),
  ];
  return { parts, blur: 0 };
}

/** The frame of a square, sides `outer` and `inner`. */
export function squareRing(outer: number, inner: number, axis = 0): Model {
  const area = outer * outer - inner * inner;
  return {
    parts: [
      makePart('box', { length: outer, axis, flux: (outer * outer) / area }),
      makePart('box', { length: inner, axis, flux: (-inner * inner) / area }),
    ],
    blur: 0,
  };
}

/** Offset of `radius` at a position angle, east and north. */
export function polar(radius: number, angle: number): { readonly x: number; readonly y: number } {
  return { x: radius * sin(angle), y: radius * cos(angle) };
}

/** Equal points on a curve, unit flux in all: with a blur wider than their distance, a line.
 *  @param at  place for a fraction from 0 to 1 */
export function curve(count: number, at: (fraction: number) => { x: number; y: number }): ModelPart[] {
  return Array.from({ length: count }, (_, k) => {
    const fraction = count === 1 ? 0.5 : k / (count - 1);
    return makePart('point', { flux: 1 / count, ...at(fraction) });
  });
}
