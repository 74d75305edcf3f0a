/** Closures of one set of visibilities less those of another. Station gains and phases of neither enter; the source
 *  drops out where both see it alike. What is left is noise and the errors of baselines.
 *
 *  The differences of an independent set give one scatter for all. To find a baseline that is off, each baseline's own
 *  difference is estimated in every scan as the weighted mean over all closures that hold it, taken in its direction;
 *  with c_r the mean's coefficient of row r its variance is sum c_r² var_r. An error of baseline ab stands in full in the
 *  mean of ab and by a part of 1/(N-2) in those of its neighbours.
 *
 *  Scatter is robust and about zero, where differences must lie: median |z| / 0.6745 for normalised z. */

import {
  type Closure,
  closurePhase,
  closureVariance,
  independentClosures,
  logClosureAmplitude,
  quadranglesOf,
  scanNumbers,
  trianglesOf,
  wrapPhase,
} from '../numerics/closures.ts';
import { exp, ln } from '../numerics/elementary.ts';
import { median, normalQuantile } from '../numerics/statistics.ts';
import { binomialTail, normalTail } from '../numerics/tails.ts';
import { closureGroup, type Group, whitened } from './agreement.ts';
import type { CommonRows } from './common-rows.ts';

/** What differs from scan to scan on one baseline, over its error. */
export interface BaselineDifference {
  readonly baseline: string;
  readonly normalised: readonly number[];
  /** About zero, over the stated errors. */
  readonly scatter: number;
}

export interface Differences {
  /** Independent closures, one group for every scan, as the error budget takes them. */
  readonly groups: readonly Group[];
  /** How many these are. */
  readonly independent: number;
  /** Of all, freed of what they share. */
  readonly scatter: number;
  /** Median of the differences, radians or log amplitude. */
  readonly offset: number;
  /** Baselines that two closures or more hold in at least LEAST_SCANS scans, in the order of their names. */
  readonly baselines: readonly BaselineDifference[];
}

/** How closures of one kind are formed and compared. */
interface Quantity {
  readonly closures: (rows: CommonRows, scan: number) => Closure[];
  readonly value: (closure: Closure, re: Float64Array, im: Float64Array) => number;
  /** Of one visibility, both errors in quadrature. */
  readonly variance: (rows: CommonRows, row: number) => number;
  readonly wraps: boolean;
}

/** Fewer scans say nothing of one baseline. */
export const LEAST_SCANS = 5;
const ALL = { minimumSnr: 0 };

const PHASES: Quantity = {
  closures: ({ first }, scan) => trianglesOf(first, scan, ALL),
  value: closurePhase,
  variance: ({ first, other }, row) => square(first.sigmaPhase[row]) + square(other.sigmaPhase[row]),
  wraps: true,
};

const AMPLITUDES: Quantity = {
  closures: ({ first }, scan) => quadranglesOf(first, scan, ALL),
  value: logClosureAmplitude,
  variance: ({ first, other }, row) => logVariance(first, row) + logVariance(other, row),
  wraps: false,
};

export function phaseDifferences(rows: CommonRows): Differences {
  return differences(rows, PHASES);
}

export function logAmplitudeDifferences(rows: CommonRows): Differences {
  return differences(rows, AMPLITUDES);
}

function differences(rows: CommonRows, quantity: Quantity): Differences {
  const variance = Float64Array.from({ length: rows.first.count }, (_, row) => quantity.variance(rows, row));
  const difference = (closure: Closure) => {
    const { first, other } = rows;
    const raw = quantity.value(closure, first.re, first.im) - quantity.value(closure, other.re, other.im);
    return quantity.wraps ? wrapPhase(raw) : raw;
  };
  const byScan = scanNumbers(rows.first).map((scan) => quantity.closures(rows, scan));
  const groups = byScan.flatMap((closures) => {
    const independent = independentClosures(closures, variance);
    if (independent.length === 0) return [];
    const labels = independent.map((closure) => stationNames(rows, closure));
    const values = independent.map(difference);
    return [{ ...closureGroup(independent, variance, 2), values, wraps: quantity.wraps, labels }];
  });
  const values = groups.flatMap((group) => group.values);
  return {
    groups,
    independent: values.length,
    scatter: scatterAboutZero(groups.flatMap((group) => [...whitened(group, group.values)])),
    offset: values.length > 0 ? median(values) : 0,
    baselines: baselineDifferences(rows, byScan, difference, variance),
  };
}

function baselineDifferences(
  rows: CommonRows,
  byScan: readonly (readonly Closure[])[],
  difference: (closure: Closure) => number,
  variance: Float64Array,
): BaselineDifference[] {
  const found = new Map<string, number[]>();
  for (const closures of byScan) {
    const holding = new Map<number, Closure[]>();
    for (const closure of closures) {
      for (const row of closure.rows) holding.set(row, [...(holding.get(row) ?? []), closure]);
    }
    for (const [row, own] of holding) {
      // One closure alone does not tell its baselines apart.
      if (own.length < 2) continue;
      const name = baselineName(rows, row);
      found.set(name, [...(found.get(name) ?? []), ownDifference(row, own, difference, variance)]);
    }
  }
  return [...found]
    .filter(([, normalised]) => normalised.length >= LEAST_SCANS)
    .map(([baseline, normalised]) => ({ baseline, normalised, scatter: scatterAboutZero(normalised) }))
    .sort((a, b) => (a.baseline < b.baseline ? -1 : 1));
}

/** The weighted mean of a baseline's closures in its direction, over its error. */
function ownDifference(
  row: number,
  closures: readonly Closure[],
  difference: (closure: Closure) => number,
  variance: Float64Array,
): number {
  const coefficients = new Map<number, number>();
  let sum = 0;
  for (const closure of closures) {
    const weight = closure.signs[closure.rows.indexOf(row)] / closureVariance(closure, variance);
    sum += weight * difference(closure);
    closure.rows.forEach((each, m) => {
      coefficients.set(each, (coefficients.get(each) ?? 0) + weight * closure.signs[m]);
    });
  }
  let square = 0;
  for (const [each, coefficient] of coefficients) square += coefficient * coefficient * variance[each];
  return sum / Math.sqrt(square);
}

/** Standard deviation of normalised values about zero by their median size; 0 without any. */
function scatterAboutZero(values: readonly number[]): number {
  return values.length > 0 ? median(values.map(Math.abs)) / normalQuantile(0.75) : 0;
}

/** The probability that n independent normal values scatter so by their median size: that half of them or more lie beyond
 *  the median size which gives that scatter. */
function scatterTail(scatter: number, n: number): number {
  const beyond = 2 * normalTail(scatter * normalQuantile(0.75));
  return binomialTail(n / 2, n, beyond);
}

export interface WorstBaseline extends BaselineDifference {
  /** Below this the largest scatter of so many baselines stays by chance in nine cases of ten. */
  readonly expected: number;
  /** The scatter less what `expected` has above 1: sound data stay near 1 or below. */
  readonly value: number;
}

/** How often the largest of all baselines of sound data stays below `expected`. */
const CONFIDENCE = 0.9;

/** The baseline whose scatter exceeds most what the largest of all has by chance; undefined without any.
 *
 *  The scatter of n Gaussian values about zero by their median size has the standard deviation 1.166/sqrt(n) (of the
 *  median of |z|: 1/(2 f sqrt(n)) with the density f = 0.6356 there); the largest of m normal values stays below
 *  Phi^-1(p^(1/m)) with probability p. */
export function worstBaseline({ baselines }: Differences): WorstBaseline | undefined {
  return baselines
    .map((each) => {
      const chance = chanceOf(each, baselines.length);
      return { ...each, expected: 1 + chance, value: each.scatter - chance };
    })
    .reduce<WorstBaseline | undefined>(
      (worst, each) => (worst === undefined || each.value > worst.value ? each : worst),
      undefined,
    );
}

/** How far above 1 the largest of m baselines like this one may lie by chance. */
function chanceOf({ normalised }: BaselineDifference, m: number): number {
  return (1.166 / Math.sqrt(normalised.length)) * normalQuantile(exp(ln(CONFIDENCE) / m));
}

/** The probability that of sound data either the scatter of all, or that of a baseline less its allowance, exceeds a value. */
export function differencesTail({ independent, baselines }: Differences, value: number): number {
  const each = baselines.map((baseline) =>
    scatterTail(value + chanceOf(baseline, baselines.length), baseline.normalised.length),
  );
  return [scatterTail(value, independent), ...each].reduce((sum, p) => sum + p - sum * p, 0);
}

function baselineName({ first: { stations, station1, station2 } }: CommonRows, row: number): string {
  return `${stations[station1[row]].name}–${stations[station2[row]].name}`;
}

function stationNames({ first: { stations, station1, station2 } }: CommonRows, { rows }: Closure): string {
  const all = rows.flatMap((row) => [station1[row], station2[row]]);
  return [...new Set(all)]
    .sort((a, b) => a - b)
    .map((station) => stations[station].name)
    .join('–');
}

function logVariance(
  { re, im, sigma }: { readonly re: Float64Array; readonly im: Float64Array; readonly sigma: Float64Array },
  row: number,
): number {
  return square(sigma[row]) / (square(re[row]) + square(im[row]));
}

function square(value: number): number {
  return value * value;
}
