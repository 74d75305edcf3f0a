/** Cubic B-spline interpolation of an image: passes through every pixel, two continuous derivatives, error O(h^4).
 *  Source: Unser, Aldroubi and Eden 1993, IEEE Trans. Signal Process. 41, 821 (prefilter with the pole sqrt(3) - 2,
 *  mirror boundary). Pixel coordinates: column and row index, pixel centres at integers. */

export interface SplineImage {
  readonly nx: number;
  readonly ny: number;
  /** B-spline coefficients, x fastest, length nx*ny. */
  readonly coefficients: Float64Array;
  /** ceilings[j*nx + i]: no value with column in [i, i+1) and row in [j, j+1) is larger; infinite beside the edge. */
  readonly ceilings: Float64Array;
}

const POLE = Math.sqrt(3) - 2;
/** |POLE|^28 < 1e-16: terms further from the boundary do not change a double. */
const HORIZON = 28;

/** Returns the interpolating spline of an image. @param pixels length nx*ny, x fastest. Cost O(nx ny). */
export function makeSplineImage(pixels: Float64Array, nx: number, ny: number): SplineImage {
  if (!(nx >= 2 && ny >= 2 && pixels.length === nx * ny)) {
    throw new RangeError(`makeSplineImage: ${pixels.length} pixels do not make an image of ${nx} by ${ny}`);
  }
  const coefficients = Float64Array.from(pixels);
  for (let row = 0; row < ny; row++) filterLine(coefficients, row * nx, 1, nx);
  for (let column = 0; column < nx; column++) filterLine(coefficients, column, nx, ny);
  return { nx, ny, coefficients, ceilings: largestNearby(coefficients, nx, ny) };
}

/** More than what rounding adds to a sum of sixteen terms, relative to the largest coefficient. */
const ROUNDING = 1e-13;

/** A value is a mean of the 4 by 4 coefficients about it, with weights that are not negative and add up to 1 (the
 *  convex hull of B-splines: de Boor, A Practical Guide to Splines, ch. IX), so it is no larger than the largest. */
function largestNearby(coefficients: Float64Array, nx: number, ny: number): Float64Array {
  const ceilings = new Float64Array(nx * ny).fill(Number.POSITIVE_INFINITY);
  const inRow = new Float64Array(nx * ny);
  let largest = 0;
  for (let k = 0; k < coefficients.length; k++) largest = Math.max(largest, Math.abs(coefficients[k]));
  for (let k = 1; k + 2 < coefficients.length; k++) {
    inRow[k] = largestOf(coefficients[k - 1], coefficients[k], coefficients[k + 1], coefficients[k + 2]);
  }
  for (let j = 1; j + 2 < ny; j++) {
    for (let i = 1; i + 2 < nx; i++) {
      const k = j * nx + i;
      const value = largestOf(inRow[k - nx], inRow[k], inRow[k + nx], inRow[k + 2 * nx]);
      ceilings[k] = value + ROUNDING * largest;
    }
  }
  return ceilings;
}

function largestOf(a: number, b: number, c: number, d: number): number {
  const ab = Math.max(a, b);
  const cd = Math.max(c, d);
  return Math.max(ab, cd);
}

/** A value that none between this place and the next column and row exceeds; see ceilings. */
export function splineCeiling({ nx, ceilings }: SplineImage, column: number, row: number): number {
  return ceilings[Math.floor(row) * nx + Math.floor(column)];
}

/** Turns samples of one line into spline coefficients, in place. */
function filterLine(line: Float64Array, first: number, stride: number, n: number): void {
  let sum = line[first];
  let power = POLE;
  for (let k = 1; k < Math.min(n, HORIZON); k++) {
    sum += power * line[first + k * stride];
    power *= POLE;
  }
  let before = 6 * sum;
  line[first] = before;
  for (let k = 1; k < n; k++) {
    before = 6 * line[first + k * stride] + POLE * before;
    line[first + k * stride] = before;
  }
  const last = first + (n - 1) * stride;
  let after = (POLE / (POLE * POLE - 1)) * (line[last] + POLE * line[last - stride]);
  line[last] = after;
  for (let k = n - 2; k >= 0; k--) {
    after = POLE * (after - line[first + k * stride]);
    line[first + k * stride] = after;
  }
}

/** Returns the spline's value at a column and row. Both must lie in [0, n-1]; the image is mirrored at its edge.
 *  Allocates nothing. */
export function splineValue(spline: SplineImage, column: number, row: number): number {
  const { nx, ny, coefficients } = spline;
  const i = Math.floor(column);
  const j = Math.floor(row);
  const s = column - i;
  const t = row - j;
  const a0 = ((1 - s) * (1 - s) * (1 - s)) / 6;
  const a1 = 2 / 3 - (s * s * (2 - s)) / 2;
  const a3 = (s * s * s) / 6;
  const a2 = 1 - a0 - a1 - a3;
  const b0 = ((1 - t) * (1 - t) * (1 - t)) / 6;
  const b1 = 2 / 3 - (t * t * (2 - t)) / 2;
  const b3 = (t * t * t) / 6;
  const b2 = 1 - b0 - b1 - b3;
  if (i >= 1 && j >= 1 && i + 2 < nx && j + 2 < ny) {
    const c = coefficients;
    const k = (j - 1) * nx + i - 1;
    const [l, m, n] = [k + nx, k + 2 * nx, k + 3 * nx];
    return (
      b0 * (a0 * c[k] + a1 * c[k + 1] + a2 * c[k + 2] + a3 * c[k + 3]) +
      b1 * (a0 * c[l] + a1 * c[l + 1] + a2 * c[l + 2] + a3 * c[l + 3]) +
      b2 * (a0 * c[m] + a1 * c[m + 1] + a2 * c[m + 2] + a3 * c[m + 3]) +
      b3 * (a0 * c[n] + a1 * c[n + 1] + a2 * c[n + 2] + a3 * c[n + 3])
    );
  }
  const x0 = mirror(i - 1, nx);
  const x1 = mirror(i, nx);
  const x2 = mirror(i + 1, nx);
  const x3 = mirror(i + 2, nx);
  let value = 0;
  for (let m = 0; m < 4; m++) {
    const start = mirror(j - 1 + m, ny) * nx;
    const weight = m === 0 ? b0 : m === 1 ? b1 : m === 2 ? b2 : b3;
    value +=
      weight *
      (a0 * coefficients[start + x0] +
        a1 * coefficients[start + x1] +
        a2 * coefficients[start + x2] +
        a3 * coefficients[start + x3]);
  }
  return value;
}

function mirror(index: number, n: number): number {
  if (index < 0) return -index;
  return index >= n ? 2 * (n - 1) - index : index;
}
