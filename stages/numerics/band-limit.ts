/** The lowest frequencies of a field as an orthonormal basis, with a circular Gaussian taper: an image seen with the
 *  resolution of an instrument, as a short vector.
 *
 *  The basis functions are products f_a(i) g_b(j) of 1/sqrt(n), sqrt(2/n) cos(2 pi k t / n) and
 *  sqrt(2/n) sin(2 pi k t / n), t counted from the centre of the field, 0 < k < n/2. They are orthonormal over the
 *  pixels, so lengths, angles and principal components of the short vectors are those of the images that they stand
 *  for. A circular convolution is diagonal in them: the Gaussian of full width F multiplies the coefficient of
 *  frequency (u,v) by exp(-(pi F)^2 (u^2 + v^2) / (4 ln 2)) (Bracewell, ch. 6 and 11). The convolution is
 *  periodic: what is smeared across the edge of the field comes in at the other side.
 *
 *  Frequencies whose taper is not above `cut` are left out. The constant function is left out too: its coefficient is
 *  the flux over the root of the number of pixels, the same for all images of unit flux, and `synthesize` adds it. */

import { cos, sin } from './elementary.ts';
import type { PixelGrid } from './fourier.ts';
import { gaussianTaper } from './models.ts';

export interface Modes {
  /** Number of basis functions. */
  readonly count: number;
  /** Writes the coefficients of the tapered image: out of length count, pixels of length nx*ny. Cost about
   *  kx nx ny multiply-adds, kx the highest frequency along x. @throws RangeError on a length mismatch */
  project(out: Float64Array, pixels: Float64Array): void;
  /** Writes the pixels that have these coefficients and this total flux. */
  synthesize(outPixels: Float64Array, coefficients: Float64Array, flux: number): void;
}

/** Makes the basis of a field.
 *  @param fwhmRadians  full width of the Gaussian on the sky; 0 for none
 *  @param cut          0 to 1 */
export function makeModes(grid: PixelGrid, fwhmRadians: number, cut: number): Modes {
  const plan = makePlan(grid, fwhmRadians, cut);
  const count = plan.taper.length;
  return {
    count,
    project(out, pixels) {
      requireLengths(plan, out, pixels);
      projectOnPlan(plan, out, pixels);
    },
    synthesize(outPixels, coefficients, flux) {
      requireLengths(plan, coefficients, outPixels);
      outPixels.fill(flux / outPixels.length);
      addSynthesis(plan, outPixels, coefficients);
    },
  };
}

interface Plan {
  readonly nx: number;
  readonly ny: number;
  /** Functions along each axis: 0 the constant, 2k-1 the cosine and 2k the sine of frequency k. */
  readonly X: readonly Float64Array[];
  readonly Y: readonly Float64Array[];
  /** Basis function m is X[a[m]] times Y[b[m]]. */
  readonly a: Int32Array;
  readonly b: Int32Array;
  readonly taper: Float64Array;
  /** Scratch: a line of x, and one line of y for every function along x. */
  readonly line: Float64Array;
  readonly columns: Float64Array;
}

function makePlan({ nx, ny, pixelRadians }: PixelGrid, fwhmRadians: number, cut: number): Plan {
  if (!(fwhmRadians >= 0 && cut >= 0 && cut < 1)) throw new RangeError(`width ${fwhmRadians}, cut ${cut}`);
  const modes: { a: number; b: number; u2: number; taper: number }[] = [];
  for (let b = 0; frequency(b) < ny / 2; b++) {
    for (let a = 0; frequency(a) < nx / 2; a++) {
      const u = frequency(a) / (nx * pixelRadians);
      const v = frequency(b) / (ny * pixelRadians);
      const u2 = u * u + v * v;
      const taper = gaussianTaper(u2, fwhmRadians);
      if (a + b > 0 && taper > cut) modes.push({ a, b, u2, taper });
    }
  }
  modes.sort((one, other) => one.u2 - other.u2 || one.b - other.b || one.a - other.a);
  const X = axisFunctions(nx, Math.max(0, ...modes.map(({ a }) => a)));
  const Y = axisFunctions(ny, Math.max(0, ...modes.map(({ b }) => b)));
  return {
    nx,
    ny,
    X,
    Y,
    a: Int32Array.from(modes, ({ a }) => a),
    b: Int32Array.from(modes, ({ b }) => b),
    taper: Float64Array.from(modes, ({ taper }) => taper),
    line: new Float64Array(nx),
    columns: new Float64Array(X.length * ny),
  };
}

/** Frequency of function a of an axis, in cycles per field. */
function frequency(a: number): number {
  return (a + 1) >> 1;
}

function isOdd(a: number): boolean {
  return a > 0 && a % 2 === 0;
}

function axisFunctions(n: number, last: number): Float64Array[] {
  const centre = (n - 1) / 2;
  return Array.from({ length: last + 1 }, (_, a) => {
    if (a === 0) return new Float64Array(n).fill(1 / Math.sqrt(n));
    const wave = isOdd(a) ? sin : cos;
    return Float64Array.from(
      { length: n },
      (_, i) => Math.sqrt(2 / n) * wave((2 * Math.PI * frequency(a) * (i - centre)) / n),
    );
  });
}

function projectOnPlan(plan: Plan, out: Float64Array, pixels: Float64Array): void {
  const { nx, ny, X, Y, a, b, taper, line, columns } = plan;
  for (let j = 0; j < ny; j++) {
    for (let i = 0; i < nx; i++) line[i] = pixels[j * nx + i] as number;
    fold(line, 0, nx);
    columns[j] = foldedDot(X[0] as Float64Array, false, line, 0);
    for (let f = 1; f < X.length; f += 2) {
      waveDots(columns, f * ny + j, ny, X[f] as Float64Array, X[f + 1] as Float64Array, line);
    }
  }
  for (let f = 0; f < X.length; f++) fold(columns, f * ny, ny);
  for (let m = 0; m < out.length; m++) {
    const g = b[m] as number;
    const sum = foldedDot(Y[g] as Float64Array, isOdd(g), columns, (a[m] as number) * ny);
    out[m] = (taper[m] as number) * sum;
  }
}

/** Replaces each pair of mirrored values by its sum (first place) and difference (second place): an even function
 *  meets only the sums, an odd one only the differences. */
function fold(values: Float64Array, from: number, n: number): void {
  for (let i = 0, j = n - 1; i < j; i++, j--) {
    const one = values[from + i] as number;
    const other = values[from + j] as number;
    values[from + i] = one + other;
    values[from + j] = one - other;
  }
}

/** Sum over the pixels of a function with a folded line that begins at `from`. */
function foldedDot(f: Float64Array, odd: boolean, folded: Float64Array, from: number): number {
  const n = f.length;
  let sum = 0;
  if (odd) {
    const last = from + n - 1;
    for (let i = 0; 2 * i < n - 1; i++) sum += (folded[last - i] as number) * (f[i] as number);
  } else {
    for (let i = 0; 2 * i < n; i++) sum += (folded[from + i] as number) * (f[i] as number);
  }
  return sum;
}

/** The sums over a folded line of a cosine and the sine of the same frequency, to out[at] and out[at + step]. Two sums
 *  side by side: an addition need not wait for the one before it. */
function waveDots(
  out: Float64Array,
  at: number,
  step: number,
  cosine: Float64Array,
  sine: Float64Array,
  folded: Float64Array,
): void {
  const n = folded.length;
  const pairs = n >> 1;
  let even = 0;
  let odd = 0;
  for (let i = 0; i < pairs; i++) {
    even += (folded[i] as number) * (cosine[i] as number);
    odd += (folded[n - 1 - i] as number) * (sine[i] as number);
  }
  if (n % 2 === 1) even += (folded[pairs] as number) * (cosine[pairs] as number);
  out[at] = even;
  out[at + step] = odd;
}

function addSynthesis(plan: Plan, outPixels: Float64Array, coefficients: Float64Array): void {
  const { nx, ny, X, Y, a, b, columns } = plan;
  columns.fill(0);
  for (let m = 0; m < coefficients.length; m++) {
    addScaled(columns, (a[m] as number) * ny, coefficients[m] as number, Y[b[m] as number] as Float64Array);
  }
  for (let j = 0; j < ny; j++) {
    for (let f = 0; f < X.length; f++) {
      addScaled(outPixels, j * nx, columns[f * ny + j] as number, X[f] as Float64Array);
    }
  }
}

function addScaled(out: Float64Array, from: number, factor: number, values: Float64Array): void {
  for (let i = 0; i < values.length; i++) {
    out[from + i] = (out[from + i] as number) + factor * (values[i] as number);
  }
}

function requireLengths({ nx, ny, taper }: Plan, coefficients: Float64Array, pixels: Float64Array): void {
  if (!(coefficients.length === taper.length && pixels.length === nx * ny)) {
    throw new RangeError(
      `${coefficients.length} coefficients for ${taper.length} modes, ${pixels.length} pixels for ${nx} by ${ny}`,
    );
  }
}
