/** Where the error of a diameter comes from: each part a standard deviation, uas. */

import type { Basis, Posterior } from '../data.ts';
import { mean, median, quantiles, standardDeviation } from '../numerics/statistics.ts';
import { UAS_PER_RADIAN } from './intervals.ts';
import { type MeasuredDraws, measureDraws } from './measure-draws.ts';
import type { BiasOfQuantity } from './method-bias.ts';
import { correctionAt } from './method-bias.ts';

export interface ErrorParts {
  /** With the gains held at the optimum. */
  readonly noise?: number;
  /** What the gains add. */
  readonly calibration?: number;
  /** Between numbers of components that held-out data admit. */
  readonly components?: number;
  /** Between libraries. */
  readonly library?: number;
  /** Of the corrected diameter, as injections show it: that of noise and calibration is in it. */
  readonly method?: number;
}

export interface Alternative {
  readonly basis: Basis;
  readonly posterior: Posterior;
}

export interface PartSources {
  readonly basis: Basis;
  readonly variants: readonly {
    readonly role: 'gains fixed' | 'components';
    readonly posterior: Posterior;
  }[];
  readonly others: readonly Alternative[];
  readonly bias: BiasOfQuantity | null;
}

/** Parts of which there is something to tell; absent are those of which there is not. */
export function errorParts(draws: MeasuredDraws, { basis, variants, others, bias }: PartSources): ErrorParts {
  const own = diametersOf(draws);
  if (own.length < 2) return {};
  const total = standardDeviation(own);
  const fixed = variants.find(({ role }) => role === 'gains fixed');
  const held = fixed === undefined ? [] : diametersOf(measureDraws(basis, fixed.posterior));
  const noise = held.length < 2 ? undefined : standardDeviation(held);
  const numbers = variants
    .filter(({ role }) => role === 'components')
    .flatMap(({ posterior }) => medianOf(diametersOf(measureDraws(basis, posterior))));
  const libraries = others.flatMap((other) =>
    medianOf(diametersOf(measureDraws(other.basis, other.posterior))),
  );
  const between = (medians: readonly number[]) =>
    medians.length === 0 ? undefined : spread([median(own), ...medians]);
  const parts = {
    noise,
    calibration: noise === undefined ? undefined : Math.sqrt(Math.max(0, total * total - noise * noise)),
    components: between(numbers),
    library: between(libraries),
    method: bias === null ? undefined : ofMethod(bias, own),
  };
  return Object.fromEntries(Object.entries(parts).filter(([, value]) => value !== undefined));
}

/** What the intervals do not hold, or cannot tell. */
export function partsRemark({ noise, components, library }: ErrorParts): string {
  const besides = (name: string, part: number | undefined, unknown: string) =>
    part === undefined ? unknown : `that of the ${name} is ${part.toFixed(2)} uas`;
  return (
    'Of the error of the diameter the intervals do not hold the parts of the choice of components and of the library: ' +
    `${besides('components', components, noise === undefined ? 'the first was not looked at' : 'held-out data admit no other number of components, or none was asked for')}; ` +
    `${besides('library', library, 'the second is not known, since no fit in another library was given')}.`
  );
}

function diametersOf({ rings }: MeasuredDraws): number[] {
  return rings.map(({ diameter }) => diameter * UAS_PER_RADIAN);
}

function medianOf(values: readonly number[]): number[] {
  return values.length === 0 ? [] : [median(values)];
}

function ofMethod(bias: BiasOfQuantity, own: readonly number[]): number {
  const [low, middle, high] = quantiles(own, [0.16, 0.5, 0.84]);
  const { scatter, ofLine } = correctionAt(bias, middle, (high - low) / 2);
  return Math.sqrt(scatter * scatter + ofLine * ofLine);
}

/** Root of the mean square about the mean. */
function spread(values: readonly number[]): number {
  const centre = mean(values);
  return Math.sqrt(mean(values.map((value) => (value - centre) * (value - centre))));
}
