/** One observation of the suite beside its truth: measured, corrected as `features` does, its intervals and rank. */

import { type BiasOfQuantity, biasOf, correctionAt, type MethodBias } from '../imaging/method-bias.ts';
import { QUANTITIES, type Quantity, type Trial } from '../imaging/trial.ts';
import { randomStream } from '../numerics/random.ts';
import { angleDifference, circularMean, median, quantiles } from '../numerics/statistics.ts';

export interface RecoveredQuantity {
  readonly truth: number;
  readonly measured: number;
  readonly corrected: number;
  readonly low: number;
  readonly high: number;
  readonly low95: number;
  readonly high95: number;
  /** Of the truth among corrected draws, 0 to 1. */
  readonly rank: number;
}

const NEAREST = 16;
/** What counts as one step of distance between rings, uas. */
const [DIAMETER_STEP, WIDTH_STEP] = [5, 3];
const COPIES = 8;

/** The bias of the injected rings that came out most like this one; null when there are too few. */
export function nearestBias(injected: readonly Trial[], { measured }: Trial): MethodBias | null {
  if (measured === null) return null;
  const distance = (other: NonNullable<Trial['measured']>) => {
    const d = (other.diameter.value - measured.diameter.value) / DIAMETER_STEP;
    const w = (other.width.value - measured.width.value) / WIDTH_STEP;
    return d * d + w * w;
  };
  const near = injected
    .flatMap((trial) =>
      trial.measured === null || trial.truth === null ? [] : [{ trial, at: distance(trial.measured) }],
    )
    .sort((a, b) => a.at - b.at)
    .slice(0, NEAREST);
  return biasOf(near.map(({ trial }) => trial));
}

/** Null where truth or measurement have no ring, or no bias is known. */
export function correctedTrial(
  { truth, measured, draws }: Trial,
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
  const { shift, deviation } = correctionAt(bias, measured);
  const random = randomStream(1, `method bias of the ${name}`);
  const corrected = values.flatMap((value) =>
    Array.from({ length: COPIES }, () => value - shift + deviation * random.normal()),
  );
  const [low95, low, middle, high, high95] = quantiles(corrected, [0.025, 0.16, 0.5, 0.84, 0.975]);
  const below = corrected.filter((value) => value < truth).length;
  return { truth, measured, corrected: middle, low, high, low95, high95, rank: below / corrected.length };
}
