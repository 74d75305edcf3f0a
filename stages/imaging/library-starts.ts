/** Starts of the search: which images of the library agree best with the data, at what flux. A coarse measure for
 *  ranking only: closure phases with their own errors and no correlations, amplitudes with the gains' spread added to
 *  their errors, at the flux that suits each image best. */

import type { Basis, Visibilities } from '../data.ts';
import { type Closure, type ClosureSet, closurePhase, wrapPhase } from '../numerics/closures.ts';
import { atan2 } from '../numerics/elementary.ts';
import type { BasisVisibilities, LinearModel } from './linear-model.ts';
import type { Term } from './term.ts';

export interface LibraryMatch {
  /** Number of the image in the library, from 0. */
  readonly image: number;
  readonly family: string;
  /** Jy; the flux at which amplitudes agree best. */
  readonly flux: number;
  readonly chiSquare: number;
}

/** Libraries are thinned evenly to about so many images: the search takes 0.1 ms an image. */
const MOST_IMAGES = 4000;
/** Relative error added to amplitudes: two gains of 10 %. */
const GAIN_SPREAD = 0.15;

/** Returns library images in the order of their agreement, the best first. @param sets  closures of `data`
 *  @param libraryStride  one image in so many is tried */
export function matchLibrary(
  basis: Basis,
  visibilities: BasisVisibilities,
  data: Visibilities,
  sets: readonly ClosureSet[],
  libraryStride = 1,
): LibraryMatch[] {
  const K = visibilities.columns - 1;
  const images = basis.families.length;
  const stride = Math.max(libraryStride, Math.ceil(images / MOST_IMAGES));
  const amplitudes = prepareAmplitudes(data);
  const phases = preparePhases(data, sets);
  const matches: LibraryMatch[] = [];
  const re = new Float64Array(data.count);
  const im = new Float64Array(data.count);
  for (let image = 0; image < images; image += stride) {
    const scores = basis.scores.subarray(image * K, (image + 1) * K);
    unitVisibilities(re, im, visibilities, scores);
    const { flux, chiSquare } = matchAmplitudes(re, im, amplitudes);
    if (!(flux > 0)) continue;
    const total = chiSquare + phaseChiSquare(re, im, phases);
    matches.push({ image, family: basis.families[image], flux, chiSquare: total });
  }
  return matches.sort((a, b) => a.chiSquare - b.chiSquare || a.image - b.image);
}

/** The same for data without rows, by the terms of the fit at a flux that is stated. @param flux  Jy */
export function matchByTerms(
  basis: Basis,
  visibilities: BasisVisibilities,
  terms: readonly Term[],
  flux: number,
  libraryStride = 1,
): LibraryMatch[] {
  const K = visibilities.columns - 1;
  const count = visibilities.re.length / visibilities.columns;
  const at = { re: new Float64Array(count), im: new Float64Array(count) };
  const stride = Math.max(libraryStride, Math.ceil(basis.families.length / MOST_IMAGES));
  const matches: LibraryMatch[] = [];
  for (let image = 0; image < basis.families.length; image += stride) {
    unitVisibilities(at.re, at.im, visibilities, basis.scores.subarray(image * K, (image + 1) * K));
    const chiSquare = terms.reduce((sum, term) => sum + term.chiSquare(at), 0);
    matches.push({ image, family: basis.families[image], flux, chiSquare });
  }
  return matches.sort((a, b) => a.chiSquare - b.chiSquare || a.image - b.image);
}

function unitVisibilities(
  re: Float64Array,
  im: Float64Array,
  visibilities: BasisVisibilities,
  scores: Float64Array,
): void {
  const { columns } = visibilities;
  for (let r = 0; r < re.length; r++) {
    const start = r * columns;
    let a = visibilities.re[start];
    let b = visibilities.im[start];
    for (let k = 1; k < columns; k++) {
      a += visibilities.re[start + k] * scores[k - 1];
      b += visibilities.im[start + k] * scores[k - 1];
    }
    re[r] = a;
    im[r] = b;
  }
}

interface Amplitudes {
  readonly value: Float64Array;
  readonly weight: Float64Array;
}

function prepareAmplitudes(data: Visibilities): Amplitudes {
  const square = data.re.map((re, r) => re * re + data.im[r] * data.im[r]);
  const debiased = square.map((value, r) => Math.max(0, value - 2 * data.sigma[r] * data.sigma[r]));
  return {
    value: debiased.map(Math.sqrt),
    weight: debiased.map((value, r) => {
      return 1 / (data.sigma[r] * data.sigma[r] + GAIN_SPREAD * GAIN_SPREAD * value);
    }),
  };
}

function matchAmplitudes(re: Float64Array, im: Float64Array, { value, weight }: Amplitudes) {
  let product = 0;
  let square = 0;
  let data = 0;
  for (let r = 0; r < re.length; r++) {
    const size = Math.sqrt(re[r] * re[r] + im[r] * im[r]);
    product += weight[r] * value[r] * size;
    square += weight[r] * size * size;
    data += weight[r] * value[r] * value[r];
  }
  const flux = product / square;
  return { flux, chiSquare: data - flux * product };
}

interface Phases {
  readonly closure: Closure;
  readonly observed: number;
  readonly variance: number;
}

function preparePhases(data: Visibilities, sets: readonly ClosureSet[]): Phases[] {
  return sets.flatMap(({ triangles, phaseCovariance }) =>
    triangles.map((closure, t) => ({
      closure,
      observed: closurePhase(closure, data.re, data.im),
      variance: phaseCovariance[t * triangles.length + t],
    })),
  );
}

function phaseChiSquare(re: Float64Array, im: Float64Array, phases: readonly Phases[]): number {
  const angle = re.map((value, r) => atan2(im[r], value));
  let sum = 0;
  for (const { closure, observed, variance } of phases) {
    let model = 0;
    for (let m = 0; m < 3; m++) model += closure.signs[m] * angle[closure.rows[m]];
    const residual = wrapPhase(model - observed);
    sum += (residual * residual) / variance;
  }
  return sum;
}

/** Picks starts from the ranking: the best image, then the best of other families, then the next best.
 *  @returns at most `count` of them */
export function pickStarts(matches: readonly LibraryMatch[], count: number): LibraryMatch[] {
  const families = new Set<string>();
  const firsts = matches.filter(({ family }) => !families.has(family) && families.add(family));
  const others = matches.filter((match) => !firsts.includes(match));
  return [...firsts, ...others].slice(0, count);
}

/** Returns the whitened parameters of a library image at its flux. @param columns  1 + components */
export function startOf(
  match: LibraryMatch,
  basis: Basis,
  model: LinearModel,
  columns: number,
): Float64Array {
  const K = basis.components.length;
  const x = new Float64Array(columns);
  x[0] = (match.flux - model.flux) / model.scales[0];
  for (let k = 1; k < columns; k++) {
    const coefficient = match.flux * basis.scores[match.image * K + k - 1];
    x[k] = model.scales[k] > 0 ? coefficient / model.scales[k] : 0;
  }
  return x;
}
