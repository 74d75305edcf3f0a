/** Discrete Fourier transforms of one and two dimensions, any length.
 *
 *    X[k] = sum_n x[n] exp(-2 pi i k n / N),   no factor                         (Bracewell, ch. 11)
 *
 *  The inverse without its factor 1/N is the same call with the real and the imaginary part exchanged, in and out.
 *  Lengths that are powers of two go through fft.js, N log N; others through the sum as it stands, N^2. fft.js fills
 *  its table of phases with the platform's sine and cosine; it is filled anew from elementary.ts. */

import FFT from 'fft.js';
import { cos, sin } from './elementary.ts';

/** Transforms one line: reads and overwrites interleaved re, im, length 2N. */
type LineTransform = (line: Float64Array) => void;

/** Makes the transform of lines of one length; its tables are made here, once. */
export function makeLineTransform(length: number): LineTransform {
  if (!(Number.isInteger(length) && length >= 1)) throw new RangeError(`a transform of length ${length}`);
  if (length === 1) return () => {};
  return (length & (length - 1)) === 0 ? fastLineTransform(length) : directLineTransform(length);
}

function fastLineTransform(length: number): LineTransform {
  const fft = new FFT(length);
  const { cosines, sines } = phaseTable(length * 2);
  const table = new Float64Array(2 * length);
  for (let i = 0; i < length; i++) {
    table[2 * i] = cosines[2 * i] as number;
    table[2 * i + 1] = -(sines[2 * i] as number);
  }
  fft.table = table;
  const out = new Float64Array(2 * length);
  return (line) => {
    fft.transform(out, line);
    line.set(out);
  };
}

function directLineTransform(length: number): LineTransform {
  const { cosines, sines } = phaseTable(length);
  const out = new Float64Array(2 * length);
  return (line) => {
    for (let k = 0; k < length; k++) {
      let re = 0;
      let im = 0;
      for (let n = 0, at = 0; n < length; n++) {
        const c = cosines[at] as number;
        const s = sines[at] as number;
        const a = line[2 * n] as number;
        const b = line[2 * n + 1] as number;
        re += a * c + b * s;
        im += b * c - a * s;
        at = (at + k) % length;
      }
      out[2 * k] = re;
      out[2 * k + 1] = im;
    }
    line.set(out);
  };
}

/** cos and sin of 2 pi i / n. */
function phaseTable(n: number): { cosines: Float64Array; sines: Float64Array } {
  const cosines = new Float64Array(n);
  const sines = new Float64Array(n);
  for (let i = 0; i < n; i++) {
    const phase = (2 * Math.PI * i) / n;
    cosines[i] = cos(phase);
    sines[i] = sin(phase);
  }
  return { cosines, sines };
}

/** Makes the two-dimensional transform of arrays of nx by ny, x fastest; the transform works in place on the real and
 *  the imaginary part. Exchange the two arguments for the inverse times nx*ny. */
export function makeTransform2d(nx: number, ny: number): (re: Float64Array, im: Float64Array) => void {
  const alongX = makeLineTransform(nx);
  const alongY = nx === ny ? alongX : makeLineTransform(ny);
  const row = new Float64Array(2 * nx);
  const column = new Float64Array(2 * ny);
  return (re, im) => {
    if (!(re.length === nx * ny && im.length === nx * ny)) {
      throw new RangeError(`${re.length} and ${im.length} values for a transform of ${nx} by ${ny}`);
    }
    for (let j = 0; j < ny; j++) transformStrided(alongX, row, re, im, j * nx, 1);
    for (let i = 0; i < nx; i++) transformStrided(alongY, column, re, im, i, nx);
  };
}

function transformStrided(
  transform: LineTransform,
  line: Float64Array,
  re: Float64Array,
  im: Float64Array,
  from: number,
  step: number,
): void {
  for (let n = 0, at = from; n < line.length; n += 2, at += step) {
    line[n] = re[at] as number;
    line[n + 1] = im[at] as number;
  }
  transform(line);
  for (let n = 0, at = from; n < line.length; n += 2, at += step) {
    re[at] = line[n] as number;
    im[at] = line[n + 1] as number;
  }
}
