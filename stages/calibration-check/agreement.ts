/** How well things agree that must agree: values with their errors, from which a scatter and, with an unknown further
 *  error, a budget follow. */

import type { Visibilities } from '../data.ts';
import { type Closure, closurePhase, closureVariance, wrapPhase } from '../numerics/closures.ts';
import { atan2, cos, ln, sin } from '../numerics/elementary.ts';
import type { SharedScan } from './colocated.ts';

/** Values that differ from a common value only by their errors. `parts` is how many visibilities each is made of, so
 *  that an error e of each adds parts·e² to the variance. */
export interface Group {
  readonly values: readonly number[];
  readonly variances: readonly number[];
  readonly parts: number;
  /** Whether the common value is known to be zero, or fitted. */
  readonly common: 'zero' | 'fitted';
  /** Whether values are angles. */
  readonly wraps: boolean;
  /** What each value is, for reports. */
  readonly labels: readonly string[];
}

/** Closure phases of triangles that must close, one group each. */
export function triangleGroups(visibilities: Visibilities, triangles: readonly Closure[]): Group[] {
  const variance = visibilities.sigmaPhase.map((value) => value * value);
  return triangles.map((triangle) => ({
    values: [closurePhase(triangle, visibilities.re, visibilities.im)],
    variances: [closureVariance(triangle, variance)],
    parts: 3,
    common: 'zero',
    wraps: true,
    labels: [triangleName(visibilities, triangle)],
  }));
}

function triangleName({ stations, station1, station2 }: Visibilities, { rows }: Closure): string {
  return [station1[rows[0]], station2[rows[0]], station2[rows[1]]].map((k) => stations[k].name).join('–');
}

/** Phase differences a–far less b–far: one group per pair and scan, with the stations' own phases in common. */
export function phaseGroup(visibilities: Visibilities, shared: SharedScan): Group {
  const { re, im, sigmaPhase, station1 } = visibilities;
  const phase = (row: number, near: number) => (station1[row] === near ? 1 : -1) * atan2(im[row], re[row]);
  const { a, b } = shared.pair;
  return {
    ...groupOf(visibilities, shared),
    values: shared.baselines.map(({ rowA, rowB }) => wrapPhase(phase(rowA, a) - phase(rowB, b))),
    variances: shared.baselines.map(({ rowA, rowB }) => square(sigmaPhase[rowA]) + square(sigmaPhase[rowB])),
    wraps: true,
  };
}

/** Log amplitude ratios a–far over b–far, the stations' gain ratio in common. */
export function amplitudeGroup(visibilities: Visibilities, shared: SharedScan): Group {
  const { re, im, sigma } = visibilities;
  const power = (row: number) => re[row] * re[row] + im[row] * im[row];
  return {
    ...groupOf(visibilities, shared),
    values: shared.baselines.map(({ rowA, rowB }) => 0.5 * (ln(power(rowA)) - ln(power(rowB)))),
    variances: shared.baselines.map(
      ({ rowA, rowB }) => square(sigma[rowA]) / power(rowA) + square(sigma[rowB]) / power(rowB),
    ),
    wraps: false,
  };
}

function groupOf({ stations }: Visibilities, { pair, baselines }: SharedScan) {
  const near = `${stations[pair.a].name}, ${stations[pair.b].name}`;
  return {
    parts: 2,
    common: 'fitted' as const,
    labels: baselines.map(({ far }) => `${near} to ${stations[far].name}`),
  };
}

export interface Agreement {
  /** Independent values: those measured less those fitted. */
  readonly degrees: number;
  readonly chiSquare: number;
  /** Squared normalised deviations by label, scaled so that 1 is expected of each. */
  readonly byLabel: ReadonlyMap<string, readonly number[]>;
}

/** Chi-square of groups about their common values, with `extra` added in quadrature to every visibility. */
export function agreement(groups: readonly Group[], extra = 0): Agreement {
  const byLabel = new Map<string, number[]>();
  let degrees = 0;
  let chiSquare = 0;
  for (const group of groups) {
    const variances = group.variances.map((variance) => variance + group.parts * extra * extra);
    const free = group.values.length - (group.common === 'fitted' ? 1 : 0);
    if (free === 0) continue;
    const { value: common } = commonValue(group, variances);
    group.values.forEach((value, k) => {
      const difference = group.wraps ? wrapPhase(value - common) : value - common;
      const deviation = (difference * difference) / variances[k];
      chiSquare += deviation;
      const label = group.labels[k];
      byLabel.set(label, [...(byLabel.get(label) ?? []), (deviation * group.values.length) / free]);
    });
    degrees += free;
  }
  return { degrees, chiSquare, byLabel };
}

/** Weighted mean of a group, and its error; zero without error where that is known. */
export function commonValue(group: Group, variances: readonly number[] = group.variances) {
  if (group.common === 'zero') return { value: 0, sigma: 0 };
  const weights = variances.map((variance) => 1 / variance);
  const total = weights.reduce((sum, weight) => sum + weight, 0);
  const start = group.wraps ? meanDirection(group.values, weights) : 0;
  const mean = group.values.reduce((sum, value, k) => {
    const difference = group.wraps ? wrapPhase(value - start) : value - start;
    return sum + (weights[k] / total) * difference;
  }, 0);
  return { value: start + mean, sigma: 1 / Math.sqrt(total) };
}

function meanDirection(angles: readonly number[], weights: readonly number[]): number {
  let x = 0;
  let y = 0;
  for (let k = 0; k < angles.length; k++) {
    x += weights[k] * cos(angles[k]);
    y += weights[k] * sin(angles[k]);
  }
  return atan2(y, x);
}

/** Root of the chi-square per degree of freedom: 1 for errors that are what they say. */
export function scatter({ chiSquare, degrees }: Agreement): number {
  return Math.sqrt(chiSquare / degrees);
}

/** The error of every visibility that brings the scatter to 1; 0 when it is not above.
 *  @param most  no more than this: beyond, phases are nothing
 *  Bisection to 1e-9 of `most`; the chi-square falls as the error grows. */
export function budget(groups: readonly Group[], most: number): number {
  const excess = (extra: number) => {
    const { chiSquare, degrees } = agreement(groups, extra);
    return chiSquare - degrees;
  };
  if (!(excess(0) > 0)) return 0;
  let [low, high] = [0, most];
  for (let step = 0; step < 30; step++) {
    const middle = (low + high) / 2;
    if (excess(middle) > 0) low = middle;
    else high = middle;
  }
  return (low + high) / 2;
}

function square(value: number): number {
  return value * value;
}
