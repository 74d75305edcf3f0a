/** Colours in CIELAB and two perceptually even colour maps made from it.
 *
 *    L* = 116 f(Y/Yn) − 16,  a* = 500 [f(X/Xn) − f(Y/Yn)],  b* = 200 [f(Y/Yn) − f(Z/Zn)],
 *    f(t) = t^(1/3) for t > (6/29)^3, else (841/108) t + 4/29                  CIE 15:2004, section 8.2.1
 *    linear RGB = M^-1 XYZ; encoding with exponent 1/2.4                       IEC 61966-2-1, section 5
 *
 *  The white point is D65 as IEC 61966-2-1 gives it. A map runs through L* evenly and through the (a*, b*) plane at
 *  even speed, so that equal steps of the data are equal colour differences (CIE 1976), and its grey copy rises evenly
 *  as well. */

import { pow } from '../../numerics/elementary.ts';

export type Triple = readonly [number, number, number];

/** Colours 0 to 255 in steps; `entries` holds red, green, blue of each, 768 bytes. */
export interface ColourMap {
  readonly entries: Uint8Array;
}

// IEC 61966-2-1: chromaticities x, y of red, green, blue (0.64, 0.33), (0.30, 0.60), (0.15, 0.06), white
// (0.3127, 0.3290); the matrices to four decimals as the standard prints them.
const TO_XYZ: readonly Triple[] = [
  [0.4124, 0.3576, 0.1805],
  [0.2126, 0.7152, 0.0722],
  [0.0193, 0.1192, 0.9505],
];
const WHITE: Triple = [0.9505, 1, 1.089];
const FROM_XYZ = inverse(TO_XYZ);
const BREAK = 6 / 29;

/** Returns L*, a*, b* of sRGB components in [0, 1]. */
export function labOfRgb(rgb: Triple): Triple {
  const linear = rgb.map((c) => (c <= 0.04045 ? c / 12.92 : pow((c + 0.055) / 1.055, 2.4)));
  const [x, y, z] = multiply(TO_XYZ, linear as unknown as Triple);
  const f = (t: number) => (t > BREAK * BREAK * BREAK ? pow(t, 1 / 3) : (841 / 108) * t + 4 / 29);
  const [fx, fy, fz] = [f(x / WHITE[0]), f(y / WHITE[1]), f(z / WHITE[2])];
  return [116 * fy - 16, 500 * (fx - fy), 200 * (fy - fz)];
}

/** Returns sRGB components of L*, a*, b*; outside [0, 1] when the colour lies outside the gamut. */
export function rgbOfLab([L, a, b]: Triple): Triple {
  const fy = (L + 16) / 116;
  const g = (t: number) => (t > BREAK ? t * t * t : (108 / 841) * (t - 4 / 29));
  const xyz: Triple = [WHITE[0] * g(fy + a / 500), g(fy), WHITE[2] * g(fy - b / 200)];
  const encode = (c: number) => (c <= 0.0031308 ? 12.92 * c : 1.055 * pow(c, 1 / 2.4) - 0.055);
  const [red, green, blue] = multiply(FROM_XYZ, xyz);
  return [encode(red), encode(green), encode(blue)];
}

/** Returns `#rrggbb` of L*, a*, b*, clipped to the gamut. */
export function hexOfLab(lab: Triple): string {
  return `#${rgbOfLab(lab)
    .map(byteOf)
    .map((byte) => byte.toString(16).padStart(2, '0'))
    .join('')}`;
}

/** Brightness, as of a blueprint: from the blue of the ground to the ivory of the paper. L* from 6 to 97. The path in
 *  (a*, b*) is a cubic Bézier curve chosen here for its look and to stay inside the gamut. */
export const brightness: ColourMap = makeMap(
  [6, 97],
  [
    [10, -22],
    [20, -54],
    [-14, -30],
    [-2, 14],
  ],
);

/** Signed values, from deep blue by a neutral grey at nought to pale yellow. L* from 22 to 95: the sign is still seen
 *  in a grey copy. */
export const signed: ColourMap = makeMap(
  [28, 88],
  [
    [2, -32],
    [-4, -12],
    [2, 11.5],
    [9, 33],
  ],
);

/** Returns a map of 256 entries: L* in even steps between two values, (a*, b*) in even steps of length along the cubic
 *  Bézier curve of four control points. */
export function makeMap(
  lightness: readonly [number, number],
  points: readonly (readonly [number, number])[],
): ColourMap {
  const path = evenPath(points, 256);
  const entries = new Uint8Array(768);
  for (let i = 0; i < 256; i++) {
    const [a, b] = path[i] as [number, number];
    const L = lightness[0] + ((lightness[1] - lightness[0]) * i) / 255;
    entries.set(rgbOfLab([L, a, b]).map(byteOf), 3 * i);
  }
  return { entries };
}

/** Returns `#rrggbb` at a fraction 0 to 1 of a map. */
export function colourAt(map: ColourMap, fraction: number): string {
  const i = 3 * Math.round(255 * Math.min(1, Math.max(0, fraction)));
  return `#${[0, 1, 2].map((k) => map.entries[i + k].toString(16).padStart(2, '0')).join('')}`;
}

/** Points at even distances along a cubic Bézier curve, by its length in short chords. */
function evenPath(points: readonly (readonly [number, number])[], count: number): [number, number][] {
  const chords = 4096;
  const at = (t: number, k: 0 | 1) => {
    const s = 1 - t;
    const [p, q, r, w] = points.map((point) => point[k]) as [number, number, number, number];
    return s * s * s * p + 3 * s * s * t * q + 3 * s * t * t * r + t * t * t * w;
  };
  const lengths = new Float64Array(chords + 1);
  for (let i = 1; i <= chords; i++) {
    const da = at(i / chords, 0) - at((i - 1) / chords, 0);
    const db = at(i / chords, 1) - at((i - 1) / chords, 1);
    lengths[i] = lengths[i - 1] + Math.sqrt(da * da + db * db);
  }
  const total = lengths[chords];
  const path: [number, number][] = [];
  for (let i = 0, k = 0; i < count; i++) {
    const wanted = (total * i) / (count - 1);
    while (k < chords - 1 && lengths[k + 1] < wanted) k++;
    const [from, to] = [lengths[k], lengths[k + 1]];
    const t = (k + (wanted - from) / (to - from)) / chords;
    path.push([at(t, 0), at(t, 1)]);
  }
  return path;
}

function byteOf(component: number): number {
  return Math.round(255 * Math.min(1, Math.max(0, component)));
}

function multiply(m: readonly Triple[], v: Triple): Triple {
  return m.map((row) => row[0] * v[0] + row[1] * v[1] + row[2] * v[2]) as unknown as Triple;
}

/** Inverse of a 3 by 3 matrix by cofactors. */
function inverse(m: readonly Triple[]): readonly Triple[] {
  const [[a, b, c], [d, e, f], [g, h, i]] = m as readonly [Triple, Triple, Triple];
  const determinant = a * (e * i - f * h) - b * (d * i - f * g) + c * (d * h - e * g);
  return [
    [(e * i - f * h) / determinant, (c * h - b * i) / determinant, (b * f - c * e) / determinant],
    [(f * g - d * i) / determinant, (a * i - c * g) / determinant, (c * d - a * f) / determinant],
    [(d * h - e * g) / determinant, (b * g - a * h) / determinant, (a * e - b * d) / determinant],
  ];
}
