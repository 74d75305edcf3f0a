/** Stations that stand at one place, and what they see: the same source on every baseline to a third station. */

import type { Visibilities } from '../data.ts';
import { type Closure, independentClosures, scanNumbers, trianglesOf } from '../numerics/closures.ts';

/** Baselines below this length, wavelengths, see a compact source as a point. */
const SHORT_BASELINE = 1e8;

export interface Pair {
  /** Station indices, a < b. */
  readonly a: number;
  readonly b: number;
  readonly distance: number;
}

/** Pairs of stations closer than `within` metres, and on a baseline below 0.1 Gλ. A station at (0, 0, 0) has no known
 *  position and stands beside none. */
export function colocatedPairs(visibilities: Visibilities, within: number): Pair[] {
  const { stations, wavelengthMetres } = visibilities;
  const pairs: Pair[] = [];
  for (let a = 0; a < stations.length; a++) {
    for (let b = a + 1; b < stations.length; b++) {
      const [p, q] = [stations[a].xyz, stations[b].xyz];
      if (isUnknown(p) || isUnknown(q)) continue;
      const [dx, dy, dz] = [p[0] - q[0], p[1] - q[1], p[2] - q[2]];
      const distance = Math.sqrt(dx * dx + dy * dy + dz * dz);
      if (distance <= within && distance < SHORT_BASELINE * wavelengthMetres) pairs.push({ a, b, distance });
    }
  }
  return pairs;
}

function isUnknown(xyz: readonly number[]): boolean {
  return xyz.every((coordinate) => coordinate === 0);
}

/** Triangles that must close to zero: those that hold both stations of a pair, an independent set for every scan. */
export function trivialTriangles(
  visibilities: Visibilities,
  pairs: readonly Pair[],
  minimumSnr: number,
): Closure[] {
  const isPair = new Set(pairs.map(({ a, b }) => `${a}-${b}`));
  const { station1, station2 } = visibilities;
  const variance = visibilities.sigmaPhase.map((value) => value * value);
  return scanNumbers(visibilities).flatMap((scan) => {
    const all = trianglesOf(visibilities, scan, { minimumSnr });
    const trivial = all.filter(({ rows }) =>
      rows.some((row) => isPair.has(`${station1[row]}-${station2[row]}`)),
    );
    return independentClosures(trivial, variance);
  });
}

/** One far station as both stations of a pair see it in one scan. */
export interface SharedBaseline {
  readonly far: number;
  /** Rows of the visibilities, baselines a–far and b–far. */
  readonly rowA: number;
  readonly rowB: number;
}

/** What a pair shares in one scan; at least one far station. */
export interface SharedScan {
  readonly pair: Pair;
  readonly scan: number;
  readonly baselines: readonly SharedBaseline[];
}

/** Far baselines that both stations of a pair see, by pair and scan, every visibility above the limit. A station that
 *  is co-located with the pair is no far station. */
export function sharedBaselines(
  visibilities: Visibilities,
  pairs: readonly Pair[],
  minimumSnr: number,
): SharedScan[] {
  const rows = rowsByBaseline(visibilities, minimumSnr);
  const near = (i: number, j: number) =>
    pairs.some(({ a, b }) => (a === i && b === j) || (a === j && b === i));
  const found: SharedScan[] = [];
  for (const pair of pairs) {
    for (const scan of scanNumbers(visibilities)) {
      const baselines: SharedBaseline[] = [];
      for (let far = 0; far < visibilities.stations.length; far++) {
        if (far === pair.a || far === pair.b || near(far, pair.a) || near(far, pair.b)) continue;
        const rowA = rows.get(baselineKey(scan, pair.a, far));
        const rowB = rows.get(baselineKey(scan, pair.b, far));
        if (rowA !== undefined && rowB !== undefined) baselines.push({ far, rowA, rowB });
      }
      if (baselines.length > 0) found.push({ pair, scan, baselines });
    }
  }
  return found;
}

/** Rows at or above a signal-to-noise ratio, by scan and baseline. */
export function rowsByBaseline(visibilities: Visibilities, minimumSnr: number): Map<string, number> {
  const { re, im, sigma, scan, station1, station2 } = visibilities;
  const rows = new Map<string, number>();
  for (let k = 0; k < visibilities.count; k++) {
    const square = re[k] * re[k] + im[k] * im[k];
    const least = minimumSnr * sigma[k];
    if (square > 0 && square >= least * least) rows.set(baselineKey(scan[k], station1[k], station2[k]), k);
  }
  return rows;
}

export function baselineKey(scan: number, i: number, j: number): string {
  return `${scan} ${Math.min(i, j)} ${Math.max(i, j)}`;
}
