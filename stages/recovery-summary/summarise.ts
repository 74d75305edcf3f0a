/** From observations beside their truths to bias, scatter, coverage, ranks; and the targets that these are held against. */

import { gammaIncomplete } from '../numerics/gamma.ts';
import { mean, standardDeviation } from '../numerics/statistics.ts';

export interface SuiteQuantity {
  readonly truth: number;
  readonly measured: number;
  readonly spread: number;
  readonly corrected: number;
  readonly low: number;
  readonly high: number;
  readonly low95: number;
  readonly high95: number;
  readonly rank: number;
}

export interface SuiteTrial {
  readonly family: string;
  readonly isRing: boolean;
  readonly verdict: 'ring' | 'undecided' | 'no ring';
  readonly hasTruth: boolean;
  readonly quantities: Readonly<Record<string, SuiteQuantity>> | null;
}

export interface Suite {
  readonly trials: readonly SuiteTrial[];
  readonly pulls: readonly {
    readonly family: string;
    readonly truth: number | null;
    readonly withRings: number | null;
    readonly withoutRings: number | null;
  }[];
}

/** A proportion with the bounds of 68 %. */
export interface Proportion {
  readonly value: number;
  readonly low: number;
  readonly high: number;
  readonly of: number;
}

export interface QuantitySummary {
  /** Mean of corrected less true, and its standard error. */
  readonly bias: number;
  readonly error: number;
  readonly scatter: number;
  /** The same without correction. */
  readonly uncorrectedBias: number;
  /** Mean of corrected over true, less 1. */
  readonly relativeBias: number;
  /** Means of half the 68 % intervals, and of those of the posteriors. */
  readonly half: number;
  readonly spread: number;
  /** Standard deviation of the errors in units of half the interval: 1.006 were they normal and the intervals right. */
  readonly inHalves: number;
  readonly coverage68: Proportion;
  readonly coverage95: Proportion;
}

export interface FamilySummary {
  readonly family: string;
  readonly count: number;
  readonly found: Proportion;
  readonly quantities: Readonly<Record<string, QuantitySummary>>;
}

const BINS = 10;

/** Summary of all stages together. Only rings that are found and that the resolution shows enter bias and coverage. */
export function summarise(suites: readonly Suite[]) {
  const trials = suites.flatMap((suite) => suite.trials);
  const rings = trials.filter(({ isRing, hasTruth }) => isRing && hasTruth);
  const others = trials.filter(({ isRing }) => !isRing);
  const names = [...new Set(rings.map(({ family }) => groupOf(family)))];
  const ranks = rings.flatMap(({ verdict, quantities }) =>
    verdict === 'ring' && quantities ? [quantities.diameter.rank] : [],
  );
  const denied = (of: readonly SuiteTrial[]) =>
    of.length === 0
      ? null
      : proportionOf(of.filter(({ verdict }) => verdict === 'no ring').length, of.length);
  return {
    observations: trials.length,
    unresolved: trials.filter(({ isRing, hasTruth }) => isRing && !hasTruth).length,
    all: summaryOf('all', rings),
    families: names.map((name) =>
      summaryOf(
        name,
        rings.filter(({ family }) => groupOf(family) === name),
      ),
    ),
    noRing: denied(others),
    ringsDenied: denied(rings),
    uniformity: uniformityOf(ranks),
    pull: pullOf(suites),
  };
}

/** Rings of one diameter count together, whatever their width; those of one width too are in no group of their own. */
function groupOf(family: string): string {
  return family.replace(/^(ring-\d+)-\d+$/, '$1').replace(/^crescent-\d+$/, 'crescent');
}

function summaryOf(family: string, trials: readonly SuiteTrial[]): FamilySummary {
  const used = trials.filter(({ verdict, quantities }) => verdict === 'ring' && quantities !== null);
  const of = (name: string) =>
    used.map(({ quantities }) => (quantities as Record<string, SuiteQuantity>)[name]);
  const names = used.length < 2 ? [] : Object.keys(used[0].quantities ?? {});
  return {
    family,
    count: used.length,
    found: proportionOf(trials.filter(({ verdict }) => verdict === 'ring').length, trials.length),
    quantities: Object.fromEntries(names.map((name) => [name, quantitySummary(of(name))])),
  };
}

function quantitySummary(values: readonly SuiteQuantity[]): QuantitySummary {
  const errors = values.map(({ corrected, truth }) => corrected - truth);
  const scatter = standardDeviation(errors);
  const halves = values.map(({ low, high }) => (high - low) / 2);
  const inside = (low: 'low' | 'low95', high: 'high' | 'high95') =>
    proportionOf(values.filter((v) => v.truth >= v[low] && v.truth <= v[high]).length, values.length);
  return {
    bias: mean(errors),
    error: scatter / Math.sqrt(errors.length),
    scatter,
    uncorrectedBias: mean(values.map(({ measured, truth }) => measured - truth)),
    relativeBias: mean(values.map(({ corrected, truth }) => corrected / truth - 1)),
    half: mean(halves),
    spread: mean(values.map(({ spread }) => spread)),
    inHalves: standardDeviation(errors.map((error, k) => error / halves[k])),
    coverage68: inside('low', 'high'),
    coverage95: inside('low95', 'high95'),
  };
}

/** Wilson's bounds of one standard deviation. */
export function proportionOf(hits: number, of: number): Proportion {
  if (of === 0) return { value: 0, low: 0, high: 1, of };
  const p = hits / of;
  const centre = (p + 1 / (2 * of)) / (1 + 1 / of);
  const half = Math.sqrt((p * (1 - p)) / of + 1 / (4 * of * of)) / (1 + 1 / of);
  return { value: p, low: centre - half, high: centre + half, of };
}

/** Chi-square of ten bins. Null with fewer than five ranks a bin. */
export function uniformityOf(ranks: readonly number[]) {
  if (ranks.length < 5 * BINS) return null;
  const histogram = new Array<number>(BINS).fill(0);
  for (const rank of ranks) histogram[Math.min(BINS - 1, Math.floor(rank * BINS))]++;
  const expected = ranks.length / BINS;
  const chiSquare = histogram.reduce(
    (sum, found) => sum + ((found - expected) * (found - expected)) / expected,
    0,
  );
  return { histogram, chiSquare, probability: 1 - gammaIncomplete(chiSquare / 2, (BINS - 1) / 2) };
}

function pullOf(suites: readonly Suite[]) {
  const shifts = suites
    .flatMap(({ pulls }) => pulls)
    .flatMap(({ withRings, withoutRings }) =>
      withRings === null || withoutRings === null ? [] : [withoutRings - withRings],
    );
  const asked = suites.flatMap(({ pulls }) => pulls).length;
  if (shifts.length < 2) return null;
  return {
    mean: mean(shifts),
    error: standardDeviation(shifts) / Math.sqrt(shifts.length),
    count: shifts.length,
    asked,
  };
}

export interface Verdict {
  readonly target: string;
  readonly found: string;
  /** Null where there are too few observations to judge. */
  readonly met: boolean | null;
}

/** Parts that the intervals of the diameter should hold, from and to. */
const WANTED_68 = [0.6, 0.76] as const;
const WANTED_95 = 0.9;

/** The targets: diameters within 2 %, 68 % intervals that hold 60 to 76 %, 95 % intervals that hold 90 % and more, for every
 *  family of rings; what is no ring is called so in 99 %, and what is one in at most 1 %. Each is held against what was found, not against its binomial bounds,
 *  which stand beside it. */
export function judge(summary: ReturnType<typeof summarise>, biasTarget: number, least: number): Verdict[] {
  const verdicts = summary.families.flatMap(({ family, quantities: { diameter } }): Verdict[] => {
    if (diameter === undefined) return [];
    const { relativeBias, coverage68, coverage95 } = diameter;
    const count = coverage68.of;
    const judged = (met: boolean) => (count >= least ? met : null);
    return [
      {
        target: `${family}: diameter bias below ${percent(biasTarget)}`,
        found: `${percent(relativeBias)} of ${count}`,
        met: judged(Math.abs(relativeBias) < biasTarget),
      },
      {
        target: `${family}: 68 % intervals hold 60 to 76 %`,
        found: shown(coverage68),
        met: judged(coverage68.value >= WANTED_68[0] && coverage68.value <= WANTED_68[1]),
      },
      {
        target: `${family}: 95 % intervals hold at least 90 %`,
        found: shown(coverage95),
        met: judged(coverage95.value >= WANTED_95),
      },
    ];
  });
  const { noRing, ringsDenied } = summary;
  if (ringsDenied !== null) {
    verdicts.push({
      target: 'at most 1 % of the rings called `no ring`',
      found: shown(ringsDenied),
      met: ringsDenied.of >= least ? ringsDenied.value <= 0.01 : null,
    });
  }
  if (noRing !== null) {
    verdicts.push({
      target: 'no ring right in at least 99 %',
      found: shown(noRing),
      met: noRing.of >= least ? noRing.value >= 0.99 : null,
    });
  }
  return verdicts;
}

function shown({ value, low, high, of }: Proportion): string {
  return `${percent(value)} of ${of}, bounds ${percent(low)} and ${percent(high)}`;
}

function percent(value: number): string {
  return `${(100 * value).toFixed(1)} %`;
}
