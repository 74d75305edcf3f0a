/** The resolved parameters of `fit`, typed; and the checks that a declaration cannot make. */

import type { Visibilities } from '../data.ts';
import { InputProblem } from '../problem.ts';
import { type DataKind, isOfRows, requireCombination, seesFlux, termsOf } from './data-terms.ts';
import type { SamplerSettings } from './sampler.ts';

export type { DataKind } from './data-terms.ts';

export interface FitSettings {
  readonly data: DataKind;
  readonly components: number | 'by-data';
  readonly priorWidth: number;
  /** Jy. */
  readonly flux?: number;
  readonly fluxPrior: number;
  /** 1e9 wavelengths. */
  readonly shortest: number;
  readonly gainPriors: { readonly usual: number; readonly stations: Readonly<Record<string, number>> };
  readonly minimumSnr: number;
  /** Whether complex visibilities fit the centroid; absent is `fixed`. */
  readonly centroid?: 'free' | 'fixed';
  readonly positivity: number;
  readonly starts: number;
  /** `gaussian`: of the curvature at the optimum alone. */
  readonly posterior: 'sampled' | 'gaussian';
  readonly sampler: SamplerSettings;
  readonly samples: number;
  readonly seed: number;
}

/** Least signal-to-noise of log closure amplitudes: a cut at 3 selects +0.20 in ln(A^2 - sigma^2) at a true 3 (common practice). */
export const LEAST_AMPLITUDE_SNR = 4;

/** Whether the centroid is a parameter of the fit: closures and amplitudes do not see it. */
export function fitsCentroid({ data, centroid }: FitSettings): boolean {
  return termsOf(data).includes('complex-visibilities') && centroid === 'free';
}

/** Whether the model is linear and everything Gaussian: the posterior has a closed form. */
export function isLinear(settings: FitSettings): boolean {
  const isComplex = termsOf(settings.data).every((term) => term === 'complex-visibilities');
  return isComplex && !fitsCentroid(settings) && settings.positivity === 0;
}

/** Whether some data term sees the flux; else it is what the recipe states. */
export function measuresFlux({ data }: Pick<FitSettings, 'data'>): boolean {
  return termsOf(data).some(seesFlux);
}

export function readSettings(
  parameters: Readonly<Record<string, unknown>>,
  visibilities: Visibilities,
  available: number,
): FitSettings {
  const settings = parameters as unknown as FitSettings;
  requireComponents(settings.components, available);
  requireStations(settings.gainPriors.stations, visibilities);
  requireCombination(settings.data);
  if (measuresFlux(settings) || settings.flux !== undefined) return settings;
  // Optical data are normalised: the image is of a source of flux 1.
  if (!termsOf(settings.data).some(isOfRows)) return { ...settings, flux: 1 };
  throw new InputProblem({
    code: 'flux-needed',
    place: 'parameter flux',
    expected: 'the compact flux, because closures do not see it',
    found: 'no value',
    advice:
      'State the flux, such as `flux: 0.6 Jy`, or take amplitudes or complex visibilities among the data.',
  });
}

function requireComponents(components: FitSettings['components'], available: number): void {
  if (components === 'by-data' ? available >= 1 : components <= available) return;
  throw new InputProblem({
    code: 'too-few-components',
    place: 'parameter components',
    expected: `at most ${available}, which the basis has`,
    found: `${components}`,
    advice: 'Ask for fewer, or build the basis with more.',
  });
}

function requireStations(named: Readonly<Record<string, number>>, { stations }: Visibilities): void {
  const known = stations.map(({ name }) => name);
  const unknown = Object.keys(named).find((name) => !known.includes(name));
  if (unknown === undefined) return;
  throw new InputProblem({
    code: 'unknown-station',
    place: 'parameter gainPriors.stations',
    expected: `names among ${known.join(', ')}`,
    found: unknown,
    advice: 'Write the name as the data do.',
  });
}
