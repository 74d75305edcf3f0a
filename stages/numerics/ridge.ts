/** The ridge of a ring: along rays from a centre, where the brightness is largest; and the centre itself. Works in
 *  pixels: columns rise to the west, rows to the north; ray k has the position angle 2 pi k / count, north through
 *  east. Used by ring.ts, which has the definitions. */

import { cos, sin } from './elementary.ts';
import { type SplineImage, splineCeiling, splineValue } from './spline-image.ts';

/** Steps of the search for the centre; 10 are enough for any ring, images without a ring may wander. */
const MOST_STEPS = 30;
/** Steps without less scatter after which the search ends. */
const MOST_IDLE_STEPS = 4;
/** Pixels; the centre's error that is let stand. */
const CENTRE_TOLERANCE = 1e-4;
/** A ridge whose radii scatter by less needs no second search: the limit of what is called a ring. */
const EVEN = 0.1;
/** The grid of the second search: places to either side, their distance as a part of the image, rays from each. */
const GRID_STEPS = 2;
const GRID_DIVISOR = 14;
const FEW_RAYS = 16;
/** Pixels between samples along a ray. */
export const RAY_STEP = 0.5;
/** The same while the centre is searched: the parabolas that follow find the top as well. */
const SEARCH_STEP = 1;

export interface Ridge {
  readonly radii: Float64Array;
  readonly brightness: Float64Array;
  readonly mean: number;
  /** Standard deviation, pixels. */
  readonly scatter: number;
}

export interface Rays {
  readonly sines: Float64Array;
  readonly cosines: Float64Array;
}

export function makeRays(count: number): Rays {
  if (!(count >= 8)) throw new RangeError(`measureRing: ${count} rays are too few, at least 8`);
  const angle = (k: number) => (2 * Math.PI * k) / count;
  return {
    sines: Float64Array.from({ length: count }, (_, k) => sin(angle(k))),
    cosines: Float64Array.from({ length: count }, (_, k) => cos(angle(k))),
  };
}

/** Where the search for the centre starts: centroid of the positive brightness. */
export function brightnessCentroid(nx: number, ny: number, pixels: Float64Array): [number, number] {
  let sum = 0;
  let sumX = 0;
  let sumY = 0;
  for (let j = 0; j < ny; j++) {
    for (let i = 0; i < nx; i++) {
      const value = Math.max(0, pixels[j * nx + i]);
      sum += value;
      sumX += i * value;
      sumY += j * value;
    }
  }
  return [sumX / sum, sumY / sum];
}

/** A centre with the ridge about it. */
export interface Centre {
  readonly column: number;
  readonly row: number;
  readonly ridge: Ridge;
}

/** The centre about which the ridge is most even: searched from a start, and where that ends at an uneven ridge, as it may
 *  where one side is much brighter, from other places as well. */
export function findCentre(spline: SplineImage, start: [number, number], rays: Rays): Centre {
  const found = searchCentre(spline, start, rays);
  if (unevenness(found.ridge) < EVEN) return found;
  const other = searchCentre(spline, mostEvenPlace(spline, start), rays);
  return unevenness(other.ridge) < unevenness(found.ridge) ? other : found;
}

/** Scatter of the radii over their mean; 1 where there is no ridge but a peak. */
function unevenness({ mean, scatter }: Ridge): number {
  return mean > RAY_STEP ? Math.min(1, scatter / mean) : 1;
}

/** Of a grid of places about a start, that with the most even ridge by few rays. */
function mostEvenPlace(spline: SplineImage, [column, row]: [number, number]): [number, number] {
  const rays = makeRays(FEW_RAYS);
  const step = Math.min(spline.nx, spline.ny) / GRID_DIVISOR;
  let best: [number, number] = [column, row];
  let least = Number.POSITIVE_INFINITY;
  for (let j = -GRID_STEPS; j <= GRID_STEPS; j++) {
    for (let i = -GRID_STEPS; i <= GRID_STEPS; i++) {
      const at: [number, number] = [
        clamp(column + i * step, 2, spline.nx - 3),
        clamp(row + j * step, 2, spline.ny - 3),
      ];
      const uneven = unevenness(findRidge(spline, at[0], at[1], rays, SEARCH_STEP));
      if (uneven < least) {
        least = uneven;
        best = at;
      }
    }
  }
  return best;
}

/** Moves the centre by the first Fourier mode of the ridge radii (the Gauss-Newton step of a circle through the ridge)
 *  and keeps the centre of least scatter. */
function searchCentre(spline: SplineImage, start: [number, number], rays: Rays): Centre {
  let [column, row] = start;
  let best: Centre | undefined;
  let idle = 0;
  for (let step = 0; step < MOST_STEPS; step++) {
    const ridge = findRidge(spline, column, row, rays, SEARCH_STEP);
    if (!best || unevenness(ridge) < unevenness(best.ridge)) {
      best = { column, row, ridge };
      idle = 0;
    } else if (++idle >= MOST_IDLE_STEPS) break;
    const east = 2 * correlate(ridge.radii, rays.sines);
    const north = 2 * correlate(ridge.radii, rays.cosines);
    if (east * east + north * north < CENTRE_TOLERANCE * CENTRE_TOLERANCE) break;
    column = clamp(column - east, 2, spline.nx - 3);
    row = clamp(row + north, 2, spline.ny - 3);
  }
  const centre = best as Centre;
  return { ...centre, ridge: findRidge(spline, centre.column, centre.row, rays, RAY_STEP) };
}

/** @param step  pixels between samples */
function findRidge(spline: SplineImage, column: number, row: number, rays: Rays, step: number): Ridge {
  const count = rays.sines.length;
  const reach = reachFrom(spline, column, row);
  const radii = new Float64Array(count);
  const brightness = new Float64Array(count);
  let likely = 0;
  for (let k = 0; k < count; k++) {
    const along = ray(spline, column, row, rays, k);
    likely = brightestSample(spline, column, row, rays.sines[k], rays.cosines[k], reach, step, likely);
    radii[k] = radiusOfTop(along, likely, reach, step);
    brightness[k] = along(radii[k]);
  }
  const mean = average(radii);
  let squares = 0;
  for (const radius of radii) squares += (radius - mean) * (radius - mean);
  return { radii, brightness, mean, scatter: Math.sqrt(squares / count) };
}

/** Brightness along ray k as a function of the radius in pixels. */
export function ray(spline: SplineImage, column: number, row: number, rays: Rays, k: number) {
  const east = rays.sines[k];
  const north = rays.cosines[k];
  return (radius: number) => splineValue(spline, column - radius * east, row + radius * north);
}

/** Radius of the largest of the samples along a ray, the first of equal ones. A sample that cannot be the largest is
 *  passed over: one below that at `likely`, such as the largest of the ray beside this. */
function brightestSample(
  spline: SplineImage,
  column: number,
  row: number,
  east: number,
  north: number,
  reach: number,
  step: number,
  likely: number,
): number {
  let best = 0;
  let brightest = splineValue(spline, column, row);
  let enough = brightest;
  if (likely <= reach) enough = splineValue(spline, column - likely * east, row + likely * north);
  for (let radius = step; radius <= reach; radius += step) {
    const x = column - radius * east;
    const y = row + radius * north;
    const ceiling = splineCeiling(spline, x, y);
    if (ceiling < enough || ceiling <= brightest) continue;
    const value = splineValue(spline, x, y);
    if (value > brightest) {
      brightest = value;
      best = radius;
    }
  }
  return best;
}

/** Radius of the largest brightness near the largest sample: two parabolas, the second through points close by. */
function radiusOfTop(along: (radius: number) => number, best: number, reach: number, step: number): number {
  if (best < step || best > reach - step) return best;
  const first = parabolaTop(along, best, step);
  return first < RAY_STEP ? first : parabolaTop(along, first, RAY_STEP / 8);
}

function parabolaTop(along: (radius: number) => number, middle: number, step: number): number {
  const before = along(middle - step);
  const after = along(middle + step);
  const curvature = before - 2 * along(middle) + after;
  return curvature < 0 ? middle + clamp((step * (before - after)) / (2 * curvature), -step, step) : middle;
}

/** Distance in pixels from a place to the nearest edge of the image. */
export function reachFrom(spline: SplineImage, column: number, row: number): number {
  return Math.min(column, row, spline.nx - 1 - column, spline.ny - 1 - row);
}

export function correlate(values: Float64Array, weights: Float64Array): number {
  let sum = 0;
  for (let k = 0; k < values.length; k++) sum += values[k] * weights[k];
  return sum / values.length;
}

export function average(values: Float64Array): number {
  let sum = 0;
  for (const value of values) sum += value;
  return sum / values.length;
}

function clamp(value: number, low: number, high: number): number {
  return Math.min(high, Math.max(low, value));
}
