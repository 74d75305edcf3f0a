/** The method's own error from trials: for each quantity, measured less true is
 *
 *    error_i = a + b (measured_i - centre) + e_i,    e_i normal with variance v
 *
 *  A value is corrected by a + b (value - centre); v and the error of a and b are what is left of its error. By least squares with
 *  a prior on b, v = S / (n - 1) of n trials with S the sum of squares about the line; the corrected value is Student t of n - 1
 *  degrees of freedom (Gelman, Carlin, Stern, Dunson, Vehtari & Rubin, Bayesian Data Analysis, 3rd ed., section 14.2). So that
 *  a posterior much wider than those of the trials is not lost, v is taken times (n - 1 + s^2 / t^2) / n with s^2 the
 *  posterior's variance and t^2 the mean of those of the trials: its own width counts for one trial.
 *
 *  Why s^2 + S / (n - 1) would count twice. With a linear model, data of curvature D and a prior of curvature P, the
 *  posterior covariance is C = (D + P)^-1 = C D C + C P C: the scatter of the optimum over noise and gains, and the spread
 *  of what the data do not tell (retrieval noise and smoothing error: Rodgers, Inverse Methods for Atmospheric Sounding, 2000,
 *  section 3.2). The error of a trial holds the first part, since its noise and gains are drawn anew; and the second, since
 *  its truth is drawn anew, but only of rings like the one that was found, of which the second part is mostly alike: it is
 *  the bias a + b (measured - centre), which is taken out. Seen on invented rings through eight and five stations: at a
 *  fixed truth the diameter scatters by 0.3 to 0.6 uas over noise and gains where s is 0.65 to 1.5; over truths, about the
 *  line, by 0.45 to 0.7 with s of 0.55 to 1.1; and by as much in the third of them with the smallest s as in that with
 *  the largest. So v is taken as the same for all trials. That of a position angle goes as its s^2, since an angle is
 *  known as well as the ring is lopsided. */

import { chiSquareQuantile } from '../numerics/chi-square.ts';
import { leastSquares } from '../numerics/linear.ts';
import type { RandomStream } from '../numerics/random.ts';
import { angleDifference, mean, quantiles } from '../numerics/statistics.ts';
import { LEAST_RINGS } from './ring-verdict.ts';
import { QUANTITIES, type Quantity, type Trial } from './trial.ts';

export interface BiasOfQuantity {
  /** Measured less true, at the centre and per unit of what was measured. */
  readonly offset: number;
  readonly slope: number;
  readonly centre: number;
  /** Variances and covariance of offset and slope. */
  readonly covariance: readonly [number, number, number];
  /** Sum of the squared errors about the line; where `byOwnSpread`, each over its posterior's variance. */
  readonly squares: number;
  readonly byOwnSpread: boolean;
  /** Root of the mean variance of the posteriors. */
  readonly spread: number;
  /** Standard deviation of the errors about the line. */
  readonly scatter: number;
  readonly trials: number;
}

export type MethodBias = Readonly<Record<Quantity, BiasOfQuantity>>;

/** Prior standard deviation of the slope. A ridge is drawn inward by w^2 / (4 ln2 d), of which the slope is that over d, 0.05
 *  for a width of 16 and a diameter of 45; found within 0.03 on hundreds of rings. A width is off by 0.15 of what it is
 *  more than others, asymmetry by less; of a central depression near 0 most of what differs is error. */
const SLOPE_PRIOR: Readonly<Record<Exclude<Quantity, 'position-angle'>, number>> = {
  diameter: 0.05,
  width: 0.2,
  asymmetry: 0.2,
  'central-depression': 0.5,
};
const LEAST_TRIALS = 4;
/** The weight of the slope's prior depends on the variance that is found: fixed after three rounds to a thousandth. */
const ROUNDS = 8;
/** Draws that stand for one where an error is folded in; their scales are as many equally likely ones of its variance. */
const COPIES = 8;

/** What of a trial tells the bias. */
export type ToldTrial = Pick<Trial, 'truth' | 'measured' | 'ringFraction'>;

/** Null with fewer than four trials that have a ring in truth and in most of the draws. */
export function biasOf(trials: readonly ToldTrial[]): MethodBias | null {
  const used = trials.filter(isUsable);
  if (used.length < LEAST_TRIALS) return null;
  return Object.fromEntries(QUANTITIES.map((name) => [name, biasOfQuantity(used, name)])) as MethodBias;
}

/** Whether a trial tells the bias: a ring in truth and in most of the draws. */
export function isUsable({ truth, measured, ringFraction }: ToldTrial): boolean {
  return truth !== null && measured !== null && ringFraction >= LEAST_RINGS;
}

interface Row {
  readonly value: number;
  readonly error: number;
  /** Of the posterior. */
  readonly variance: number;
}

function biasOfQuantity(trials: readonly ToldTrial[], name: Quantity): BiasOfQuantity {
  // An angle's error does not depend on the angle.
  const slopePrior = name === 'position-angle' ? null : SLOPE_PRIOR[name];
  const isAngle = slopePrior === null;
  const rows = trials.map(({ truth, measured }): Row => {
    const [m, t] = [
      (measured as NonNullable<Trial['measured']>)[name],
      (truth as NonNullable<Trial['truth']>)[name],
    ];
    const error = isAngle ? angleDifference(m.value, t) : m.value - t;
    return { value: m.value, error, variance: m.deviation * m.deviation + 1e-18 };
  });
  const centre = isAngle ? 0 : mean(rows.map(({ value }) => value));
  const relative = isAngle ? rows.map(({ variance }) => variance) : rows.map(() => 1);
  const spread = Math.sqrt(mean(rows.map(({ variance }) => variance)));
  let factor = isAngle ? 1 : spread * spread;
  const solveAt = (variance: number) => solve(rows, relative, centre, { factor: variance, slopePrior });
  let found = solveAt(factor);
  for (let k = 0; k < ROUNDS; k++) {
    factor = found.squares / (rows.length - 1) + 1e-18;
    found = solveAt(factor);
  }
  const { offset, slope, covariance, squares } = found;
  const scatter = Math.sqrt((squares * mean(relative)) / (rows.length - 1));
  return {
    offset,
    slope,
    centre,
    covariance,
    squares,
    byOwnSpread: isAngle,
    spread,
    scatter,
    trials: rows.length,
  };
}

/** The line by least squares, each row of variance factor times its relative one. */
function solve(
  rows: readonly Row[],
  relative: readonly number[],
  centre: number,
  { factor, slopePrior }: { factor: number; slopePrior: number | null },
) {
  const n = 2;
  const hasSlope = slopePrior !== null;
  const A = new Float64Array((rows.length + 1) * n);
  const b = new Float64Array(rows.length + 1);
  rows.forEach(({ value, error }, i) => {
    const weight = 1 / Math.sqrt(factor * relative[i]);
    A[i * n] = weight;
    A[i * n + 1] = hasSlope ? weight * (value - centre) : 0;
    b[i] = weight * error;
  });
  A[rows.length * n + 1] = 1 / (slopePrior ?? 1);
  const found = leastSquares(A, b, n);
  if (found === null) return { offset: 0, slope: 0, covariance: [0, 0, 0] as const, squares: 0 };
  const [offset, slope] = found.solution;
  const [a, c, , d] = found.inverse;
  return {
    offset,
    slope,
    covariance: hasSlope ? ([a, d, c] as const) : ([a, 0, 0] as const),
    squares: found.residualSquares * factor,
  };
}

export interface Correction {
  /** To be taken from the value. */
  readonly shift: number;
  /** Standard deviation of the error that is left: of the value about the line, and of the line. */
  readonly scatter: number;
  readonly ofLine: number;
  readonly degreesOfFreedom: number;
}

/** @param deviation  of the posterior of the value */
export function correctionAt(bias: BiasOfQuantity, value: number, deviation: number): Correction {
  const from = bias.byOwnSpread ? 0 : value - bias.centre;
  const [varianceOfOffset, varianceOfSlope, covariance] = bias.covariance;
  const ofLine = varianceOfOffset + from * from * varianceOfSlope + 2 * from * covariance;
  const degreesOfFreedom = bias.trials - 1;
  const own = deviation * deviation;
  const wider = (degreesOfFreedom + own / (bias.spread * bias.spread)) / bias.trials;
  return {
    shift: bias.offset + bias.slope * from,
    scatter: Math.sqrt((bias.squares / degreesOfFreedom) * (bias.byOwnSpread ? own : wider)),
    ofLine: Math.sqrt(Math.max(0, ofLine)),
    degreesOfFreedom,
  };
}

/** Draws of a posterior with the bias taken out, as wide as the correction says: in the shape that they had, each standing for
 *  several of Student's t. @param values  two or more; angles about their mean, not cut at north */
export function correctedDraws(
  values: readonly number[],
  bias: BiasOfQuantity,
  random: RandomStream,
): number[] {
  const [low, middle, high] = quantiles(values, [0.16, 0.5, 0.84]);
  const deviation = (high - low) / 2;
  const { shift, scatter, ofLine, degreesOfFreedom } = correctionAt(bias, middle, deviation);
  const scales = Array.from({ length: COPIES }, (_, k) =>
    Math.sqrt(degreesOfFreedom / chiSquareQuantile((k + 0.5) / COPIES, degreesOfFreedom)),
  );
  return values.flatMap((value) =>
    scales.map((scale) => {
      const step = deviation > 0 ? (value - middle) / deviation : random.normal();
      return middle - shift + scale * (scatter * step + ofLine * random.normal());
    }),
  );
}
