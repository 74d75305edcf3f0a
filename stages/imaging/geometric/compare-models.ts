/** Which geometric model explains the data best, and whether it is dark inside.
 *
 *  Models are compared by the Bayesian information criterion -2 ln L + k ln N (Schwarz 1978, Ann. Stat. 6, 461), gains at
 *  their optimum and k without them, which all models share; and the best of those with a dark centre against the best of
 *  those without by the likelihood of held-out scans, paired (Hastie, Tibshirani and Friedman, The Elements of Statistical
 *  Learning, 2nd ed., section 7.10). A difference of 10 in the criterion counts as very strong (Kass and Raftery 1995, J.
 *  Am. Stat. Assoc. 90, 773). A ring is preferred when both say so, by more than 10 and by more than one standard error, and when the best model's
 *  centre has less than half of the brightness on its ridge: a disc with a bright edge is none. */

import { ln } from '../../numerics/elementary.ts';
import { invertSymmetric } from '../../numerics/linear.ts';
import { mean, standardDeviation } from '../../numerics/statistics.ts';
import { placeAt } from '../centroid.ts';
import type { FitProblem } from '../fit-problem.ts';
import {
  type FittedModel,
  fitModel,
  parametersOf,
  predictModel,
  refitModel,
  type Setting,
  settingOf,
} from './fit-model.ts';
import { MODEL_KINDS } from './model-kinds.ts';

export interface ModelReport {
  readonly model: string;
  readonly isRing: boolean;
  readonly parameters: Readonly<
    Record<string, { readonly value: number; readonly unit: string; readonly deviation: number }>
  >;
  readonly measurements: number;
  readonly parameterCount: number;
  readonly chiSquare: number;
  /** Of the data with the gains at their optimum. */
  readonly logLikelihood: number;
  readonly bic: number;
  readonly converged: boolean;
}

export interface ModelComparison {
  /** Best first. */
  readonly models: readonly ModelReport[];
  readonly preferred: string;
  readonly ringPreferred: boolean;
  /** The best without a dark centre less the best with one: above 0 for a ring. */
  readonly margin: { readonly bic: number; readonly heldOut: number; readonly heldOutError: number };
  /** Of the best model with a dark centre: brightness at the centre over that on the ridge. */
  readonly centre: number;
  readonly sentence: string;
}

const VERY_STRONG = 10;
/** Brightness at the centre over that on the ridge. */
const DARK = 0.5;
const FOLDS = 5;

/** Fits and compares all models. @param x  the image fit's optimum, for the place of the source
 *  Cost: some hundred evaluations of the data terms a model, a second in all for 300 rows. */
export function compareModels(
  problem: FitProblem,
  x: Float64Array,
  progress: (fraction: number) => void = () => {},
): ModelComparison {
  const setting = settingOf(problem);
  const place = placeAt(problem.model, x);
  const fitted = MODEL_KINDS.map((kind, k) => {
    const found = fitModel(kind, problem.terms, setting, place);
    progress((k + 1) / (MODEL_KINDS.length + 1));
    return { found, report: reportOf(found, problem, setting) };
  }).sort((a, b) => a.report.bic - b.report.bic);
  const best = (isRing: boolean) =>
    fitted.find(({ report }) => report.isRing === isRing) as (typeof fitted)[number];
  const [ring, other] = [best(true), best(false)];
  const difference = heldOutDifference(ring.found, other.found, problem, setting);
  const margin = { bic: other.report.bic - ring.report.bic, ...difference };
  const { kind, minimum } = ring.found;
  const centre = kind.centre(minimum.x.subarray(1, 1 + kind.size), setting.length);
  const ringPreferred = margin.bic > VERY_STRONG && margin.heldOut > margin.heldOutError && centre < DARK;
  return {
    models: fitted.map(({ report }) => report),
    preferred: fitted[0].report.model,
    ringPreferred,
    margin,
    centre,
    sentence: sentenceOf(ring.report.model, other.report.model, { ...margin, centre }, ringPreferred),
  };
}

function reportOf(found: FittedModel, { terms }: FitProblem, setting: Setting): ModelReport {
  const { kind, minimum } = found;
  const at = predictModel(kind, minimum.x, setting);
  const measurements = terms.reduce((sum, term) => sum + term.count, 0);
  const cost = terms.reduce((sum, term) => sum + term.cost(at), 0);
  const parameterCount = parametersOf(kind, setting);
  return {
    model: kind.model,
    isRing: kind.isRing,
    parameters: measuresOf(found, setting),
    measurements,
    parameterCount,
    chiSquare: terms.reduce((sum, term) => sum + term.chiSquare(at), 0),
    logLikelihood: -cost,
    bic: 2 * cost + parameterCount * ln(measurements),
    converged: minimum.converged,
  };
}

/** Sizes with their standard deviations, from the curvature by the chain rule. */
function measuresOf({ kind, minimum }: FittedModel, { length }: Setting): ModelReport['parameters'] {
  const n = minimum.x.length;
  const covariance = invertSymmetric(minimum.curvature, n) ?? new Float64Array(n * n).fill(Number.NaN);
  const own = (x: Float64Array) => kind.measures(x.subarray(1, 1 + kind.size), length);
  const h = 1e-4;
  const slopes = Array.from({ length: kind.size }, (_, k) => {
    const moved = (step: number) =>
      own(Float64Array.from(minimum.x, (value, i) => (i === k + 1 ? value + step : value)));
    const [up, down] = [moved(h), moved(-h)];
    return up.map(({ value, unit }, m) => {
      const turned = value - down[m].value;
      // Angles go round.
      const whole =
        unit === 'deg' ? (Math.abs(turned) > 90 ? turned - Math.sign(turned) * 360 : turned) : turned;
      return whole / (2 * h);
    });
  });
  return Object.fromEntries(
    own(minimum.x).map(({ name, unit, value }, m) => {
      let variance = 0;
      for (let i = 0; i < kind.size; i++) {
        for (let j = 0; j < kind.size; j++)
          variance += slopes[i][m] * slopes[j][m] * covariance[(i + 1) * n + j + 1];
      }
      const deviation = Math.sqrt(variance);
      return [name, { value, unit, deviation: Number.isFinite(deviation) ? deviation : 0 }];
    }),
  );
}

/** -2 ln L of held-out scans, the second model less the first, with the standard error of the sum. */
function heldOutDifference(first: FittedModel, second: FittedModel, { terms }: FitProblem, setting: Setting) {
  const scans = [...new Set(terms.flatMap((term) => term.scans))].sort((a, b) => a - b);
  const folds = Math.min(FOLDS, scans.length);
  const differences: number[] = [];
  for (let fold = 0; fold < folds && folds > 1; fold++) {
    const isHeldOut = (place: number) => place % folds === fold;
    const kept = new Set(scans.filter((_, place) => !isHeldOut(place)));
    const own = terms.map((term) => term.only(kept));
    const [a, b] = [first, second].map((found) =>
      predictModel(found.kind, refitModel(found, own, setting).x, setting),
    );
    scans.forEach((scan, place) => {
      if (!isHeldOut(place)) return;
      const only = new Set([scan]);
      differences.push(
        terms.reduce((sum, term) => sum + 2 * (term.only(only).cost(b) - term.only(only).cost(a)), 0),
      );
    });
  }
  if (differences.length < 2) return { heldOut: 0, heldOutError: 0 };
  const n = differences.length;
  return { heldOut: n * mean(differences), heldOutError: Math.sqrt(n) * standardDeviation(differences) };
}

function sentenceOf(
  ring: string,
  other: string,
  { bic, heldOut, heldOutError, centre }: ModelComparison['margin'] & { readonly centre: number },
  ringPreferred: boolean,
): string {
  const facts =
    `the best model with a dark centre (${ring}) against the best without one (${other}): ${signed(bic)} in the information ` +
    `criterion, ${signed(heldOut)} ± ${heldOutError.toFixed(1)} in -2 ln of the likelihood of held-out scans; its centre has ` +
    `${(100 * centre).toFixed(0)} % of the ridge's brightness`;
  return ringPreferred
    ? `The data prefer a dark centre: ${facts}.`
    : `The data do not prefer a dark centre: ${facts}; more than ${VERY_STRONG}, more than one standard error and less than ${100 * DARK} % are needed.`;
}

function signed(value: number): string {
  return `${value < 0 ? '−' : '+'}${Math.abs(value).toFixed(1)}`;
}
