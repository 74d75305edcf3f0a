/** The group's own images on the library's grid, each once as it is and then turned and scaled at random.
 *
 *  Every pixel of a source is a small square of even brightness. It is cut into pieces no larger than half a pixel of
 *  the grid, and each piece is shared among the four nearest pixels in proportion to nearness (cloud in cell: Hockney
 *  and Eastwood 1988, ch. 5). That keeps the flux and the centroid exactly, whatever the turn and the scale, and
 *  smooths by less than a pixel. Flux beyond the field is lost; the rest is brought back to unit flux. */

import { cos, sin } from '../numerics/elementary.ts';
import type { PixelGrid, PixelImage } from '../numerics/fourier.ts';
import { randomStream } from '../numerics/random.ts';
import { InputProblem } from '../problem.ts';

/** Largest side of a piece in pixels of the grid: at a half, the grid does not show between the pieces. */
const PIECE = 0.5;

/** The part of the flux that may lie beyond the field. With more, the image is another one. */
const MOST_LOST = 0.02;

export interface Placement {
  /** Turn from north through east, radians. */
  readonly turn: number;
  /** Size on the grid over size in the source. */
  readonly scale: number;
}

/** Placements of the copies of one image: the first as it is. */
export function placementsOf(
  copies: number,
  [smallest, largest]: readonly [number, number],
  seed: number,
  name: string,
): Placement[] {
  const random = randomStream(seed, `image-library own ${name}`);
  return Array.from({ length: copies }, (_, k) => {
    const turn = random.between(0, 2 * Math.PI);
    const scale = random.between(smallest, largest);
    return k === 0 ? { turn: 0, scale: 1 } : { turn, scale };
  });
}

/** Draws an image with its centroid at the origin and unit flux.
 *  @param outPixels  written; length nx*ny of the grid
 *  @param place      how a message names the image
 *  @throws InputProblem for an image of no flux, or of which more than 2 % lies beyond the field
 *  Cost: about 10 ns per piece. */
export function drawOwnImage(
  outPixels: Float64Array,
  grid: PixelGrid,
  image: PixelImage,
  { turn, scale }: Placement,
  place: string,
): void {
  const { flux, x, y } = momentsOf(image, place);
  const pieces = Math.max(1, Math.ceil((image.pixelRadians * scale) / (grid.pixelRadians * PIECE)));
  // Offsets of the source, in pixels from its centroid, to offsets in pixels of the grid. x rises to the east.
  const perPixel = (image.pixelRadians * scale) / grid.pixelRadians;
  const c = cos(turn) * perPixel;
  const s = sin(turn) * perPixel;
  outPixels.fill(0);
  for (let j = 0; j < image.ny; j++) {
    for (let i = 0; i < image.nx; i++) {
      const value = image.pixels[j * image.nx + i] as number;
      if (value === 0) continue;
      const share = value / flux / (pieces * pieces);
      for (let m = 0; m < pieces * pieces; m++) {
        const east = (image.nx - 1) / 2 - i + pieceOffset(m % pieces, pieces) - x;
        const north = j - (image.ny - 1) / 2 + pieceOffset(Math.floor(m / pieces), pieces) - y;
        // A turn from north through east takes north to (sin, cos).
        addShare(outPixels, grid, c * east + s * north, c * north - s * east, share);
      }
    }
  }
  normalize(outPixels, place);
}

function pieceOffset(k: number, pieces: number): number {
  return (k + 0.5) / pieces - 0.5;
}

/** Shares a piece at (east, north), in pixels from the origin, among the four nearest pixels. */
function addShare(
  out: Float64Array,
  { nx, ny }: PixelGrid,
  east: number,
  north: number,
  share: number,
): void {
  const column = (nx - 1) / 2 - east;
  const row = (ny - 1) / 2 + north;
  const i = Math.floor(column);
  const j = Math.floor(row);
  if (!(i >= 0 && i + 1 < nx && j >= 0 && j + 1 < ny)) return;
  const fx = column - i;
  const fy = row - j;
  const at = j * nx + i;
  out[at] = (out[at] as number) + share * (1 - fx) * (1 - fy);
  out[at + 1] = (out[at + 1] as number) + share * fx * (1 - fy);
  out[at + nx] = (out[at + nx] as number) + share * (1 - fx) * fy;
  out[at + nx + 1] = (out[at + nx + 1] as number) + share * fx * fy;
}

/** Flux, and centroid in pixels east and north of the centre of the array. */
function momentsOf({ nx, ny, pixels }: PixelImage, place: string): { flux: number; x: number; y: number } {
  let flux = 0;
  let size = 0;
  let x = 0;
  let y = 0;
  for (let j = 0; j < ny; j++) {
    for (let i = 0; i < nx; i++) {
      const value = pixels[j * nx + i] as number;
      flux += value;
      size += Math.abs(value);
      x += value * ((nx - 1) / 2 - i);
      y += value * (j - (ny - 1) / 2);
    }
  }
  if (!(flux > 0 && flux > 1e-6 * size)) {
    throw new InputProblem({
      code: 'no-flux',
      place,
      expected: 'an image of positive total flux',
      found: `${flux}`,
      advice: 'Leave this image out, or give its total intensity.',
    });
  }
  return { flux, x: x / flux, y: y / flux };
}

function normalize(pixels: Float64Array, place: string): void {
  const sum = pixels.reduce((total, value) => total + value, 0);
  if (!(Math.abs(1 - sum) <= MOST_LOST)) {
    throw new InputProblem({
      code: 'beyond-field',
      place,
      expected: `at least ${100 * (1 - MOST_LOST)} % of the flux within the field`,
      found: `${(100 * sum).toFixed(1)} %`,
      advice: 'Enlarge the field, or narrow copyScale.',
    });
  }
  for (let k = 0; k < pixels.length; k++) pixels[k] = (pixels[k] as number) / sum;
}
