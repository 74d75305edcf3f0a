/** False-colour pictures of a pixel array. The array is interpolated to the resolution of the page here, by cubic
 *  convolution, so that every viewer shows the same smooth picture and none adds its own smoothing.
 *
 *    kernel, a = −1/2:  1 − 5/2 |s|² + 3/2 |s|³ for |s| < 1,  2 − 4|s| + 5/2 |s|² − 1/2 |s|³ for |s| < 2
 *    R. G. Keys, IEEE Trans. Acoustics, Speech, Signal Processing 29 (1981), 1153, eq. 15 */

import type { ColourMap } from './colour.ts';
import { dataUri, encodePng } from './png.ts';
import { element } from './svg.ts';

/** A part of the sky or any other plane, x fastest; row 0 is drawn at the bottom. */
export interface Grid {
  readonly nx: number;
  readonly ny: number;
  readonly pixels: Float64Array;
}

/** A window into a grid in pixel units: from the edge `x0` to `x1`, where pixel i reaches from i − 1/2 to i + 1/2. */
export interface Window {
  readonly x0: number;
  readonly x1: number;
  readonly y0: number;
  readonly y1: number;
}

/** Returns an SVG image of a window of a grid at (x, y) with width and height in px, drawn with two samples a px.
 *  @param range  values of the map's first and last colour; values outside take the end colours */
export function rasterImage(
  grid: Grid,
  window: Window,
  range: readonly [number, number],
  map: ColourMap,
  place: { readonly x: number; readonly y: number; readonly width: number; readonly height: number },
): string {
  const [width, height] = [Math.round(2 * place.width), Math.round(2 * place.height)];
  const smooth = interpolate(grid, window, width, height);
  const indices = new Uint8Array(width * height);
  const scale = 255 / (range[1] - range[0]);
  for (let k = 0; k < indices.length; k++) {
    const index = Math.round((smooth[k] - range[0]) * scale);
    indices[k] = Math.min(255, Math.max(0, index));
  }
  const href = dataUri(encodePng(width, height, indices, map));
  return element('image', { ...place, href, preserveAspectRatio: 'none' });
}

/** Returns a window of a grid resampled to width times height points, rows from the top; the edge pixels continue
 *  beyond the grid. Cost 4 (nx height + width height). */
export function interpolate(grid: Grid, window: Window, width: number, height: number): Float64Array {
  const columns = resampling(window.x0, window.x1, width, grid.nx);
  const rows = resampling(window.y1, window.y0, height, grid.ny);
  const tall = new Float64Array(grid.nx * height);
  for (let r = 0; r < height; r++) {
    for (let i = 0; i < grid.nx; i++) {
      let sum = 0;
      for (let k = 4 * r; k < 4 * r + 4; k++) {
        sum += rows.weights[k] * grid.pixels[rows.indices[k] * grid.nx + i];
      }
      tall[r * grid.nx + i] = sum;
    }
  }
  const out = new Float64Array(width * height);
  for (let r = 0; r < height; r++) {
    for (let c = 0; c < width; c++) {
      let sum = 0;
      for (let k = 4 * c; k < 4 * c + 4; k++) {
        sum += columns.weights[k] * tall[r * grid.nx + columns.indices[k]];
      }
      out[r * width + c] = sum;
    }
  }
  return out;
}

/** Four indices and weights per output point along one axis. */
function resampling(from: number, to: number, count: number, n: number) {
  const indices = new Int32Array(4 * count);
  const weights = new Float64Array(4 * count);
  for (let k = 0; k < count; k++) {
    const at = from + ((k + 0.5) / count) * (to - from);
    const first = Math.floor(at) - 1;
    for (let tap = 0; tap < 4; tap++) {
      indices[4 * k + tap] = Math.min(n - 1, Math.max(0, first + tap));
      weights[4 * k + tap] = keys(Math.abs(at - (first + tap)));
    }
  }
  return { indices, weights };
}

function keys(s: number): number {
  if (s < 1) return 1 + s * s * (1.5 * s - 2.5);
  return s < 2 ? 2 + s * (-4 + s * (2.5 - 0.5 * s)) : 0;
}
