/** Which rows of the visibilities enter the fit, and what the others say about the total flux. */

import type { Visibilities } from '../data.ts';
import { ln } from '../numerics/elementary.ts';
import { median } from '../numerics/statistics.ts';
import { InputProblem } from '../problem.ts';
import { type DataKind, isOfRows, isSquared, isTriple, termsOf } from './data-terms.ts';

export interface Selection {
  /** Rows of the fit; scans and stations keep their numbers. */
  readonly data: Visibilities;
  /** Rows, squared visibilities and triple products left out because a baseline is too short. */
  readonly tooShort: number;
  /** The same because they see finer structure than the basis holds. */
  readonly tooLong: number;
  /** Median amplitude of those rows, Jy, debiased; null when there are none. It is the flux of all scales. */
  readonly totalFlux: number | null;
}

/** What the basis' resolution leaves of a visibility on the longest baseline that is fitted. Finer structure is not in
 *  the basis: it was built without frequencies of which less than 1 % is left. */
const LEAST_TAPER = 0.02;

/** Longest baseline, wavelengths, on which a basis of a resolution (FWHM, radians; 0 for none) says anything. */
export function longestBaseline(resolutionRadians: number): number {
  // exp(-(pi w)^2 q^2 / (4 ln 2)) = LEAST_TAPER
  return Math.sqrt(-4 * Math.LN2 * ln(LEAST_TAPER)) / (Math.PI * resolutionRadians);
}

/** The data without the kinds of measurement that a fit does not use. */
export function wantedData(all: Visibilities, kind: DataKind): Visibilities {
  const terms = termsOf(kind);
  const { squared, triples, ...rows } = terms.some(isOfRows) ? all : takeRows(all, []);
  return {
    ...rows,
    ...(squared && terms.some(isSquared) ? { squared } : {}),
    ...(triples && terms.some(isTriple) ? { triples } : {}),
  };
}

/** @throws InputProblem when nothing is left, or a row holds what must never reach a computation */
export function selectRows(
  all: Visibilities,
  shortestWavelengths: number,
  longestWavelengths: number,
): Selection {
  requireSound(all);
  requireSoundOptical(all);
  const sort = (count: number, lengthsOf: (r: number) => readonly number[]) =>
    sortByLength(count, lengthsOf, shortestWavelengths, longestWavelengths);
  const lengthOf = (u: number, v: number) => Math.sqrt(u * u + v * v);
  const { squared, triples } = all;
  const rows = sort(all.count, (r) => [lengthOf(all.u[r], all.v[r])]);
  const squares = squared && sort(squared.count, (r) => [lengthOf(squared.u[r], squared.v[r])]);
  const products =
    triples &&
    sort(triples.count, (t) => {
      const { u1, v1, u2, v2 } = triples;
      return [lengthOf(u1[t], v1[t]), lengthOf(u2[t], v2[t]), lengthOf(u1[t] + u2[t], v1[t] + v2[t])];
    });
  const sorted = [rows, squares, products].flatMap((each) => each ?? []);
  if (sorted.every(({ kept }) => kept.length === 0)) {
    throw new InputProblem({
      code: 'no-data',
      place: 'input visibilities',
      expected: `baselines from ${shortestWavelengths} to ${longestWavelengths} wavelengths`,
      found: `${all.count + (squared?.count ?? 0) + (triples?.count ?? 0)} rows, none of them between`,
      advice: 'Lower the parameter `shortest`, build the basis with a finer resolution, or give other data.',
    });
  }
  const total = (value: (each: Sorted) => number) => sorted.reduce((sum, each) => sum + value(each), 0);
  return {
    data: {
      ...takeRows(all, rows.kept),
      ...(squared && squares ? { squared: takeOf(squared, squares.kept) } : {}),
      ...(triples && products ? { triples: takeOf(triples, products.kept) } : {}),
    },
    tooShort: total(({ short }) => short.length),
    tooLong: total(({ tooLong }) => tooLong),
    totalFlux: totalFlux(all, rows.short),
  };
}

interface Sorted {
  readonly kept: readonly number[];
  readonly short: readonly number[];
  readonly tooLong: number;
}

function sortByLength(
  count: number,
  lengthsOf: (r: number) => readonly number[],
  shortest: number,
  longest: number,
): Sorted {
  const kept: number[] = [];
  const short: number[] = [];
  let tooLong = 0;
  for (let r = 0; r < count; r++) {
    const lengths = lengthsOf(r);
    if (lengths.some((length) => length < shortest)) short.push(r);
    else if (lengths.some((length) => length > longest)) tooLong++;
    else kept.push(r);
  }
  return { kept, short, tooLong };
}

/** Rows of a table of optical data, in their order. */
export function takeOf<T extends { readonly count: number }>(table: T, rows: readonly number[]): T {
  const columns = Object.entries(table).map(([name, values]: [string, unknown]) => {
    if (values instanceof Int32Array) return [name, Int32Array.from(rows, (r) => values[r])];
    return [name, values instanceof Float64Array ? Float64Array.from(rows, (r) => values[r]) : values];
  });
  return { ...Object.fromEntries(columns), count: rows.length };
}

function requireSound(all: Visibilities): void {
  for (let r = 0; r < all.count; r++) {
    const numbers = [all.u[r], all.v[r], all.re[r], all.im[r], all.sigma[r], all.sigmaPhase[r]];
    if (!(numbers.every(Number.isFinite) && all.sigma[r] > 0 && all.sigmaPhase[r] > 0)) {
      throw new InputProblem({
        code: 'bad-row',
        place: `input visibilities, row ${r + 1}`,
        expected: 'finite numbers and errors above 0',
        found: `u ${all.u[r]}, v ${all.v[r]}, ${all.re[r]} ${all.im[r]} Jy, errors ${all.sigma[r]} Jy and ${all.sigmaPhase[r]} rad`,
        advice: 'Flagged and weightless samples are dropped by `ingest`: give its output, or drop them.',
      });
    }
  }
}

/** Optical data: finite numbers, errors above 0; an amplitude of a triple product may have none. */
function requireSoundOptical({ squared, triples }: Visibilities): void {
  const refuse = (what: string, r: number, found: string) => {
    throw new InputProblem({
      code: 'bad-row',
      place: `input visibilities, ${what} ${r + 1}`,
      expected: 'finite numbers and errors above 0',
      found,
      advice: 'Drop what is flagged or without weight.',
    });
  };
  for (let r = 0; squared && r < squared.count; r++) {
    const { u, v, value, sigma } = squared;
    const isSound = [u[r], v[r], value[r], sigma[r]].every(Number.isFinite) && sigma[r] > 0;
    if (!isSound)
      refuse('squared visibility', r, `u ${u[r]}, v ${v[r]}, ${value[r]} with an error of ${sigma[r]}`);
  }
  for (let t = 0; triples && t < triples.count; t++) {
    const { u1, v1, u2, v2, phase, sigmaPhase, amplitude, sigmaAmplitude } = triples;
    const isPlaced = [u1[t], v1[t], u2[t], v2[t]].every(Number.isFinite);
    const isUsable = (value: number, sigma: number) =>
      sigma === Number.POSITIVE_INFINITY || (Number.isFinite(value) && Number.isFinite(sigma) && sigma > 0);
    if (!(isPlaced && isUsable(phase[t], sigmaPhase[t]) && isUsable(amplitude[t], sigmaAmplitude[t]))) {
      refuse(
        'triple product',
        t,
        `phase ${phase[t]} with ${sigmaPhase[t]} rad, amplitude ${amplitude[t]} with ${sigmaAmplitude[t]}`,
      );
    }
  }
}

function totalFlux(all: Visibilities, rows: readonly number[]): number | null {
  if (rows.length === 0) return null;
  const debiased = rows.map((r) => {
    const square = all.re[r] * all.re[r] + all.im[r] * all.im[r] - 2 * all.sigma[r] * all.sigma[r];
    return Math.sqrt(Math.max(0, square));
  });
  return median(debiased);
}

/** The visibilities' rows at some places, in that order. */
export function takeRows(all: Visibilities, rows: readonly number[]): Visibilities {
  const take = (values: Float64Array) => Float64Array.from(rows, (r) => values[r]);
  const takeIndices = (values: Int32Array) => Int32Array.from(rows, (r) => values[r]);
  return {
    ...all,
    count: rows.length,
    station1: takeIndices(all.station1),
    station2: takeIndices(all.station2),
    scan: takeIndices(all.scan),
    timeMjd: take(all.timeMjd),
    integrationSeconds: take(all.integrationSeconds),
    u: take(all.u),
    v: take(all.v),
    re: take(all.re),
    im: take(all.im),
    sigma: take(all.sigma),
    sigmaPhase: take(all.sigmaPhase),
  };
}
