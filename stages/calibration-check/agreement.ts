/** How well things agree that must agree: values with their errors, from which a scatter and, with an unknown further
 *  error, a budget follow. */

import type { Visibilities } from '../data.ts';
import { chiSquareQuantile } from '../numerics/chi-square.ts';
import {
  type Closure,
  closureCovariance,
  closurePhase,
  closureVariance,
  wrapPhase,
} from '../numerics/closures.ts';
import { atan2, cos, ln, sin } from '../numerics/elementary.ts';
import { choleskyNearby, solveLower } from '../numerics/linear.ts';
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
  /** Where values share visibilities: their covariance, square, with the variance `extra` added to every visibility. */
  readonly covariance?: (extra: number) => Float64Array;
}

/** Closure phases of triangles that must close, one group for every scan, with their covariance. */
export function triangleGroups(visibilities: Visibilities, triangles: readonly Closure[]): Group[] {
  const variance = visibilities.sigmaPhase.map((value) => value * value);
  const scanOf = ({ rows }: Closure) => visibilities.scan[rows[0]];
  return [...new Set(triangles.map(scanOf))].map((scan) => {
    const own = triangles.filter((triangle) => scanOf(triangle) === scan);
    return {
      ...closureGroup(own, variance, 1),
      values: own.map((triangle) => closurePhase(triangle, visibilities.re, visibilities.im)),
      wraps: true,
      labels: own.map((triangle) => triangleName(visibilities, triangle)),
    };
  });
}

/** The part of a group of independent closures of one scan that their variances make.
 *  @param times  how often the further error of a visibility enters: twice in a difference between two inputs */
export function closureGroup(closures: readonly Closure[], variance: Float64Array, times: number) {
  const stated = closureCovariance(closures, variance);
  const shared = closureCovariance(closures, new Float64Array(variance.length).fill(times));
  return {
    variances: closures.map((closure) => closureVariance(closure, variance)),
    parts: times * closures[0].rows.length,
    common: 'zero' as const,
    covariance: (extra: number) => stated.map((value, k) => value + extra * shared[k]),
  };
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
    const differences = group.values.map((value) =>
      group.wraps ? wrapPhase(value - common) : value - common,
    );
    differences.forEach((difference, k) => {
      const deviation = (difference * difference) / variances[k];
      if (!group.covariance) chiSquare += deviation;
      const label = group.labels[k];
      byLabel.set(label, [...(byLabel.get(label) ?? []), (deviation * group.values.length) / free]);
    });
    if (group.covariance) {
      for (const value of whitened(group, differences, extra)) chiSquare += value * value;
    }
    degrees += free;
  }
  return { degrees, chiSquare, byLabel };
}

/** Values freed of what they share, each of unit variance: L⁻¹ d with the covariance L Lᵀ. Those of groups without a
 *  covariance of their own are divided by their errors. */
export function whitened(
  { variances, covariance }: Group,
  differences: readonly number[],
  extra = 0,
): Float64Array {
  const d = Float64Array.from(differences);
  const L = covariance && choleskyNearby(covariance(extra * extra), d.length);
  return L ? solveLower(L, d) : d.map((value, k) => value / Math.sqrt(variances[k]));
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

export interface Budget {
  readonly value: number;
  /** Interval of 68 %: errors at which the chi-square is no more likely than one in six on either side. */
  readonly low: number;
  readonly high: number;
}

/** P(|Z| < 1) of a normal value. */
const WITHIN_ONE_SIGMA = 0.6826894921370859;

/** The error of every visibility that brings the scatter to 1, 0 when it is not above; and its interval, from the
 *  quantiles of chi-square for the degrees of freedom (inversion of the test; Neyman 1937, Phil. Trans. A 236, 333).
 *  @param most  no more than this: beyond, phases are nothing */
export function budget(groups: readonly Group[], most: number): Budget {
  const { degrees } = agreement(groups);
  const at = (level: number) => errorFor(groups, most, level);
  return {
    value: at(degrees),
    low: at(chiSquareQuantile((1 + WITHIN_ONE_SIGMA) / 2, degrees)),
    high: at(chiSquareQuantile((1 - WITHIN_ONE_SIGMA) / 2, degrees)),
  };
}

/** The error at which the chi-square falls to a level. Bisection to 1e-9 of `most`; it falls as the error grows. */
function errorFor(groups: readonly Group[], most: number, level: number): number {
  const excess = (extra: number) => agreement(groups, extra).chiSquare - level;
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
