/** Geometric models of the sky whose visibilities are known in closed form. A model is a sum of parts, each a shape with
 *  a place, a size and a flux, all of it convolved with one circular Gaussian.
 *
 *  With p and q the (u,v) components along and across the part's axis times its length and breadth, rho^2 = p^2 + q^2:
 *
 *    point     1
 *    gaussian  exp(-(pi rho)^2 / (4 ln 2))                  length, breadth: full widths at half maximum
 *    disc      2 J1(pi rho) / (pi rho)                      length, breadth: diameters
 *    ring      J0(pi rho) - 2 i b J1(pi rho) cos(theta)     infinitely thin; brightness 1 + 2 b cos(phi - phi0),
 *                                                           theta between (p,q) and the brightest direction
 *    box       sinc(p) sinc(q)                              length, breadth: sides
 *
 *  times exp(-2 pi i (u x + v y)) for a part at (x, y) (Thompson, Moran and Swenson, 3rd ed., ch. 10; Bracewell, ch. 12
 *  and 13; the ring's asymmetry by the expansion of Jacobi and Anger). Lengths are radians, u and v wavelengths,
 *  angles radians, position angles from north through east, x to the east. A negative flux makes a hole. */

import { besselJ0, besselJ1 } from './bessel.ts';
import { cos, exp, sin } from './elementary.ts';

export type Shape = 'point' | 'gaussian' | 'disc' | 'ring' | 'box';

export interface ModelPart {
  readonly shape: Shape;
  readonly flux: number;
  /** Centre, east and north, radians. */
  readonly x: number;
  readonly y: number;
  /** Size along the axis and across it, radians. */
  readonly length: number;
  readonly breadth: number;
  /** Position angle of the axis. */
  readonly axis: number;
  /** b of the ring, below 0.5 where brightness must not be negative, and the position angle of the brightest point,
   *  both before an elliptical ring is stretched. */
  readonly asymmetry: number;
  readonly brightest: number;
}

/** See `isCircular`. */
export type CircularPart = ModelPart & { readonly shape: Exclude<Shape, 'box'> };

export interface Model {
  readonly parts: readonly ModelPart[];
  /** Full width at half maximum of the Gaussian that all parts are convolved with; 0 for none. */
  readonly blur: number;
}

/** Half of a Gaussian's exponent per squared product of frequency and full width: pi^2 / (4 ln 2). */
const GAUSSIAN_EXPONENT = (Math.PI * Math.PI) / (4 * Math.LN2);

/** A part with what is not given set to nothing: unit flux at the origin, circular, no asymmetry. */
export function makePart(shape: Shape, fields: Partial<Omit<ModelPart, 'shape'>> = {}): ModelPart {
  const { flux = 1, x = 0, y = 0, length = 0, axis = 0, asymmetry = 0, brightest = 0 } = fields;
  return {
    shape,
    flux,
    x,
    y,
    length,
    breadth: fields.breadth ?? length,
    axis,
    asymmetry,
    brightest,
  };
}

/** Transform of a circular Gaussian of unit flux and full width `fwhm` at the distance sqrt(u2) from the origin. The
 *  full widths of the pair have the product 4 ln 2 / pi (Bracewell, ch. 6). */
export function gaussianTaper(u2: number, fwhm: number): number {
  return exp(-GAUSSIAN_EXPONENT * u2 * fwhm * fwhm);
}

/** Writes a part's visibility, without its flux and place, to out[0] (real) and out[1] (imaginary). */
export type ShapeTransform = (out: Float64Array, u: number, v: number) => void;

/** Makes a part's transform about its own centre. */
export function makeShapeTransform(part: ModelPart): ShapeTransform {
  const { shape, length, breadth } = part;
  const { sinAxis, cosAxis, along, across } = directions(part);
  return (out, u, v) => {
    const p = (u * sinAxis + v * cosAxis) * length;
    const q = (u * cosAxis - v * sinAxis) * breadth;
    const rho = Math.sqrt(p * p + q * q);
    out[0] = realTransform(shape, p, q, rho);
    out[1] = imaginary(part, rho) ? (-2 * besselJ1(Math.PI * rho) * (p * along + q * across)) / rho : 0;
  };
}

/** Whether a part looks the same however it is turned, but for a ring's asymmetry, whose direction counts alone. */
export function isCircular(part: ModelPart): part is CircularPart {
  const { shape, length, breadth } = part;
  return length === breadth && shape !== 'box';
}

/** The transform of a circular part by its radial functions: at a point at p = v length and q = u length, rho^2 = p^2 + q^2,
 *  the real part out[0], and the imaginary part out[1] (p along + q across) / rho, nothing at rho = 0. */
export function makeCircularTransform(part: CircularPart): {
  readonly radial: (out: Float64Array, rho: number) => void;
  readonly along: number;
  readonly across: number;
} {
  const { along, across } = directions(part);
  const real = realFunctions[part.shape];
  const radial = (out: Float64Array, rho: number) => {
    out[0] = real(rho);
    out[1] = imaginary(part, rho) ? -2 * besselJ1(Math.PI * rho) : 0;
  };
  return { radial, along, across };
}

/** The part's axis, and its asymmetry along and across it. */
function directions(part: ModelPart) {
  const axis = isCircular(part) ? 0 : part.axis;
  return {
    sinAxis: sin(axis),
    cosAxis: cos(axis),
    along: part.asymmetry * cos(part.brightest - axis),
    across: part.asymmetry * sin(part.brightest - axis),
  };
}

function imaginary({ shape, asymmetry }: ModelPart, rho: number): boolean {
  return shape === 'ring' && asymmetry !== 0 && rho > 0;
}

function realTransform(shape: Shape, p: number, q: number, rho: number): number {
  return shape === 'box' ? sinc(p) * sinc(q) : realFunctions[shape](rho);
}

/** The real parts of shapes that are circular but for their scales. */
const realFunctions = {
  point: () => 1,
  gaussian: (rho: number) => exp(-GAUSSIAN_EXPONENT * rho * rho),
  ring: (rho: number) => besselJ0(Math.PI * rho),
  disc: (rho: number) => (rho === 0 ? 1 : (2 * besselJ1(Math.PI * rho)) / (Math.PI * rho)),
};

/** sin(pi x) / (pi x). */
function sinc(x: number): number {
  return x === 0 ? 1 : sin(Math.PI * x) / (Math.PI * x);
}

/** Visibilities of a model, exact at every point.
 *  @param outRe, outIm  written; length of u; in the unit of the parts' fluxes
 *  @param u, v          wavelengths
 *  @throws RangeError on a length mismatch. NaN in gives NaN out. Cost: one Bessel function or exponential and one
 *          sine and cosine per part and point. */
export function visibilitiesOfModel(
  outRe: Float64Array,
  outIm: Float64Array,
  model: Model,
  u: Float64Array,
  v: Float64Array,
): void {
  if (!(outRe.length === u.length && outIm.length === u.length && v.length === u.length)) {
    throw new RangeError(
      `${u.length} points u, ${v.length} v, outputs of ${outRe.length} and ${outIm.length}`,
    );
  }
  const transforms = model.parts.map(makeShapeTransform);
  const value = new Float64Array(2);
  for (let k = 0; k < u.length; k++) {
    const uk = u[k] as number;
    const vk = v[k] as number;
    let re = 0;
    let im = 0;
    for (let m = 0; m < transforms.length; m++) {
      const part = model.parts[m] as ModelPart;
      (transforms[m] as ShapeTransform)(value, uk, vk);
      const phase = -2 * Math.PI * (uk * part.x + vk * part.y);
      const c = part.flux * cos(phase);
      const s = part.flux * sin(phase);
      re += (value[0] as number) * c - (value[1] as number) * s;
      im += (value[0] as number) * s + (value[1] as number) * c;
    }
    const taper = gaussianTaper(uk * uk + vk * vk, model.blur);
    outRe[k] = taper * re;
    outIm[k] = taper * im;
  }
}

/** Total flux of a model. */
export function fluxOfModel(model: Model): number {
  return model.parts.reduce((sum, part) => sum + part.flux, 0);
}

/** Flux-weighted centre of a model, radians east and north. An asymmetric ring's own centroid lies at b times its
 *  radius towards the brightest point. NaN when the total flux is 0. */
export function centroidOfModel(model: Model): { readonly x: number; readonly y: number } {
  let x = 0;
  let y = 0;
  for (const part of model.parts) {
    const turn = part.brightest - part.axis;
    const own = part.shape === 'ring' ? part.asymmetry / 2 : 0;
    const along = own * part.length * cos(turn);
    const across = own * part.breadth * sin(turn);
    x += part.flux * (part.x + along * sin(part.axis) + across * cos(part.axis));
    y += part.flux * (part.y + along * cos(part.axis) - across * sin(part.axis));
  }
  const flux = fluxOfModel(model);
  return { x: x / flux, y: y / flux };
}

/** The model shifted so that its centroid is the origin, and scaled to unit flux. */
export function centredModel(model: Model): Model {
  const flux = fluxOfModel(model);
  const { x, y } = centroidOfModel(model);
  const parts = model.parts.map((part) => ({
    ...part,
    flux: part.flux / flux,
    x: part.x - x,
    y: part.y - y,
  }));
  return { ...model, parts };
}
