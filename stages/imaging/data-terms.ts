/** Which data terms a fit may combine. Every term takes the phases of baselines, their amplitudes, or both; a measurement
 *  must enter once only, so each of the two may come from one term at most. */

import type { Visibilities } from '../data.ts';
import { InputProblem } from '../problem.ts';

export const DATA_TERMS = [
  'complex-visibilities',
  'amplitudes',
  'closure-phases',
  'log-closure-amplitudes',
  'squared-visibilities',
  'triple-phases',
  'triple-amplitudes',
] as const;

export type DataTerm = (typeof DATA_TERMS)[number];

/** Combinations with a name of their own. */
export const DATA_WORDS = [
  'closure-phases-and-amplitudes',
  'complex-visibilities',
  'closure-phases-and-log-closure-amplitudes',
] as const;

export type DataKind = (typeof DATA_WORDS)[number] | readonly DataTerm[];

const TERMS_OF: Readonly<Record<(typeof DATA_WORDS)[number], readonly DataTerm[]>> = {
  'closure-phases-and-amplitudes': ['closure-phases', 'amplitudes'],
  'complex-visibilities': ['complex-visibilities'],
  'closure-phases-and-log-closure-amplitudes': ['closure-phases', 'log-closure-amplitudes'],
};

const TAKES: Readonly<Record<DataTerm, readonly ('phases' | 'amplitudes')[]>> = {
  'complex-visibilities': ['phases', 'amplitudes'],
  amplitudes: ['amplitudes'],
  'closure-phases': ['phases'],
  'log-closure-amplitudes': ['amplitudes'],
  'squared-visibilities': ['amplitudes'],
  'triple-phases': ['phases'],
  'triple-amplitudes': ['amplitudes'],
};

/** The terms that a parameter `data` stands for, as it names them. */
export function termsOf(kind: DataKind): readonly DataTerm[] {
  return typeof kind === 'string' ? TERMS_OF[kind] : kind;
}

/** Whether a term sees the flux itself, not the source's shape alone. */
export function seesFlux(term: DataTerm): boolean {
  return term === 'complex-visibilities' || term === 'amplitudes';
}

/** Whether a term is made of the rows of complex visibilities. */
export function isOfRows(term: DataTerm): boolean {
  return !isSquared(term) && !isTriple(term);
}

export function isSquared(term: DataTerm): boolean {
  return term === 'squared-visibilities';
}

export function isTriple(term: DataTerm): boolean {
  return term === 'triple-phases' || term === 'triple-amplitudes';
}

/** @throws InputProblem when a measurement would count twice */
export function requireCombination(kind: DataKind): void {
  const terms = termsOf(kind);
  for (const part of ['phases', 'amplitudes'] as const) {
    const [first, second] = terms.filter((term) => TAKES[term].includes(part));
    if (second === undefined) continue;
    throw new InputProblem({
      code: 'counted-twice',
      place: 'parameter data',
      expected: `one term at most that takes the ${part} of baselines`,
      found: `${first} and ${second}`,
      advice: 'Leave one of them out: both hold the same measurements, which would count twice.',
    });
  }
}

/** @throws InputProblem when the data do not hold what a term is made of */
export function requirePresent(kind: DataKind, data: Visibilities): void {
  const has = (term: DataTerm) =>
    (isSquared(term) ? data.squared?.count : isTriple(term) ? data.triples?.count : data.count) ?? 0;
  const lacking = termsOf(kind).find((term) => has(term) === 0);
  if (lacking === undefined) return;
  const what = isSquared(lacking)
    ? 'squared visibilities'
    : isTriple(lacking)
      ? 'triple products'
      : 'visibilities';
  throw new InputProblem({
    code: 'no-data',
    place: 'parameter data',
    expected: `data terms that the input holds; ${lacking} need ${what}`,
    found: 'none of them',
    advice: 'Name terms that the data have.',
  });
}
