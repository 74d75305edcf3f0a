/** One observation of the suite beside its truth: measured, corrected as `features` does, its intervals and rank. */

import {
  type BiasOfQuantity,
  biasOf,
  correctedDraws,
  isUsable,
  type MethodBias,
} from '../imaging/method-bias.ts';
import { BOUNDS } from '../imaging/ring-numbers.ts';
import { QUANTITIES, type Quantity, type Trial } from '../imaging/trial.ts';
import { randomStream } from '../numerics/random.ts';
import { angleDifference, circularMean, median, quantiles } from '../numerics/statistics.ts';

export interface RecoveredQuantity {
  readonly truth: number;
  readonly measured: number;
  /** Half of the posterior's own 68 % interval. */
  readonly spread: number;
  readonly corrected: number;
  readonly low: number;
  readonly high: number;
  readonly low95: number;
  readonly high95: number;
  /** Of the truth among corrected draws, 0 to 1. */
  readonly rank: number;
}

/** As many as a stage of kind `injection` makes about the ring that was found. */
const NEAREST = 12;
/** What counts as one step of distance between rings: about as far as injections about a ring are drawn. Lengths in uas. */
const STEPS: Partial<Readonly<Record<Quantity, number>>> = { diameter: 5, width: 3, asymmetry: 0.05 };

/** A trial without the fit that made it. */
export type TrialNumbers = Omit<Trial, 'result'>;

/** The bias of the injected rings that came out most like this one; null when there are too few. */
export function nearestBias(injected: readonly TrialNumbers[], trial: TrialNumbers): MethodBias | null {
  return biasOf(nearestTrials(injected, trial, NEAREST));
}

/** Of those that came out as rings the most like this one. */
export function nearestTrials(
  injected: readonly TrialNumbers[],
  { measured }: TrialNumbers,
  count: number,
): TrialNumbers[] {
  if (measured === null) return [];
  const distance = (other: NonNullable<Trial['measured']>) =>
    Object.entries(STEPS).reduce((sum, [name, size]) => {
      const steps = (other[name as Quantity].value - measured[name as Quantity].value) / size;
      return sum + steps * steps;
    }, 0);
  return injected
    .filter(isUsable)
    .map((trial) => ({ trial, at: distance(trial.measured as NonNullable<Trial['measured']>) }))
    .sort((a, b) => a.at - b.at)
    .slice(0, count)
    .map(({ trial }) => trial);
}

/** Null where truth or measurement have no ring, or no bias is known. */
export function correctedTrial(
  { truth, measured, draws }: TrialNumbers,
  bias: MethodBias | null,
): { hasTruth: boolean; quantities: Record<Quantity, RecoveredQuantity> | null } {
  if (truth === null || measured === null || bias === null)
    return { hasTruth: truth !== null, quantities: null };
  return {
    hasTruth: true,
    quantities: Object.fromEntries(
      QUANTITIES.map((name) => [name, recovered(name, draws[name], truth[name], bias[name])]),
    ) as Record<Quantity, RecoveredQuantity>,
  };
}

function recovered(
  name: Quantity,
  draws: readonly number[],
  truth: number,
  bias: BiasOfQuantity,
): RecoveredQuantity {
  // Angles are taken about the truth, so that none is cut at north.
  const isAngle = name === 'position-angle';
  const values = isAngle ? draws.map((angle) => truth + angleDifference(angle, truth)) : draws;
  const measured = isAngle ? truth + angleDifference(circularMean(draws).degrees, truth) : median(values);
  const [lowest, highest] = BOUNDS[name] ?? [-Infinity, Infinity];
  const corrected = correctedDraws(values, bias, randomStream(1, `method bias of the ${name}`)).map((value) =>
    Math.min(highest, Math.max(lowest, value)),
  );
  const [low95, low, middle, high, high95] = quantiles(corrected, [0.025, 0.16, 0.5, 0.84, 0.975]);
  const [from, to] = quantiles(values, [0.16, 0.84]);
  const rank = corrected.filter((value) => value < truth).length / corrected.length;
  return { truth, measured, spread: (to - from) / 2, corrected: middle, low, high, low95, high95, rank };
}
