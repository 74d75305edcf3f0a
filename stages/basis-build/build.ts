/** Mean and components of a library, and what they leave unexplained. The mathematics of basis-build, without files.
 *
 *  Images are short vectors on the modes of band-limit.ts. Since these are orthonormal over the pixels, the covariance
 *  of the vectors has the eigenvalues of the covariance of the band-limited images, and its eigenvectors are the
 *  coefficients of the images' principal components: nothing is approximated. */

import type { Basis } from '../data.ts';
import { type Modes, makeModes } from '../numerics/band-limit.ts';
import { type Moments, makeMomentSum, orientation, principalComponents } from '../numerics/components.ts';
import { InputProblem } from '../problem.ts';
import type { Library } from './library.ts';

export interface BuildOptions {
  readonly components: number;
  readonly resolutionRadians: number;
  /** Part of the images to hold out, 0 to 0.5. */
  readonly heldOut: number;
  /** Rows per block of the covariance; changes no bit of the result. */
  readonly blockRows?: number;
  readonly progress?: (fraction: number) => void;
}

/** An image on the basis. */
export interface Projection {
  readonly image: number;
  readonly heldOut: boolean;
  /** Its coefficients. Valid until the next projection. */
  readonly scores: Float64Array;
  /** Sum of squares of the band-limited image, and of its difference from the mean. The sum of squares that k
   *  components leave is `deviation` less the squares of the first k scores. */
  readonly square: number;
  readonly deviation: number;
}

export interface Build {
  readonly basis: Basis;
  /** Number of modes. */
  readonly modes: number;
}

/** Frequencies at which the Gaussian leaves this much or less are left out: at most a ten-thousandth of any power, and
 *  the number of modes, whose cube is the cost, stays near 720 for 160 uas at 12 uas. */
export const TAPER_CUT = 0.01;

/** Most modes: those of 64 by 64 pixels without a band limit. Covariance and eigenvectors take half a gigabyte and some
 *  minutes then, 30 MB and a second at the default. */
const MOST_MODES = 4000;

/** An eigenvalue below this part of the largest is rounding. */
const NO_VARIANCE = 1e-12;

/** Where progress stands after the covariance and after the eigenvectors. */
const COVARIANCE_PART = 0.4;
const EIGENVECTOR_PART = 0.8;

/** Images between two reports of progress. */
const PROGRESS_STEP = 50;

/** Whether an image is held out: every 1/part-th, evenly. */
export function isHeldOut(image: number, part: number): boolean {
  return Math.floor((image + 1) * part) > Math.floor(image * part);
}

/** Projections that are kept between the two passes, bytes: of some 11,000 images on 724 modes. */
const KEPT_BYTES = 64e6;

/** Builds the basis. Needs the projection of every image twice: for the covariance, then for its scores. As many as fit
 *  into KEPT_BYTES are kept; of the others the image is read again.
 *  @param look  is shown every image of the library, in order, on the finished basis
 *  @throws InputProblem when the library cannot carry so many components, or the field has too many frequencies */
export function buildBasis(
  library: Library,
  options: BuildOptions,
  look: (projection: Projection) => void,
): Build {
  const { nx, ny, pixelRadians, families } = library;
  const { components, heldOut, resolutionRadians, progress = () => {} } = options;
  const modes = makeModes(library, resolutionRadians, TAPER_CUT);
  requireModes(modes.count, components);
  const project = keepingProjection(library, modes);
  const moments = sumMoments(library, modes, options, project);
  progress(COVARIANCE_PART);
  const found = principalComponents(moments, components);
  requireRank(found.eigenvalues, moments.count);
  progress(EIGENVECTOR_PART);
  const { vectors, images } = orient(found.vectors, modes, nx * ny);
  const mean = new Float64Array(nx * ny);
  modes.synthesize(mean, moments.mean, 1);
  const scores = new Float64Array(moments.count * components);
  let row = 0;
  for (const projection of projectImages(library, project, moments.mean, vectors, options)) {
    if (!projection.heldOut) scores.set(projection.scores, components * row++);
    look(projection);
  }
  const basis: Basis = {
    nx,
    ny,
    pixelRadians,
    resolutionRadians,
    mean,
    components: images,
    eigenvalues: found.eigenvalues,
    totalVariance: found.totalVariance,
    scores,
    families: families.filter((_, image) => !isHeldOut(image, heldOut)),
  };
  return { basis, modes: modes.count };
}

/** Writes an image's projection on the modes. */
type Project = (out: Float64Array, image: number) => void;

function keepingProjection(library: Library, modes: Modes): Project {
  const room = Math.min(library.count, Math.floor(KEPT_BYTES / (8 * modes.count)));
  const kept: Float64Array[] = [];
  return (out, image) => {
    const known = kept[image];
    if (known !== undefined) {
      out.set(known);
      return;
    }
    modes.project(out, library.image(image));
    if (image < room) kept[image] = out.slice();
  };
}

function sumMoments(
  library: Library,
  modes: Modes,
  { heldOut, blockRows, components }: BuildOptions,
  project: Project,
): Moments {
  const sum = makeMomentSum(modes.count, blockRows);
  const row = new Float64Array(modes.count);
  let count = 0;
  for (let image = 0; image < library.count; image++) {
    if (isHeldOut(image, heldOut)) continue;
    project(row, image);
    sum.add(row);
    count++;
  }
  if (!(count > components)) throw tooFew(count, components);
  return sum.finish();
}

/** Turns each vector so that the largest pixel of its image is positive. */
function orient(
  found: readonly Float64Array[],
  modes: Modes,
  pixels: number,
): { vectors: Float64Array[]; images: Float64Array[] } {
  const vectors: Float64Array[] = [];
  const images: Float64Array[] = [];
  for (const vector of found) {
    const image = new Float64Array(pixels);
    modes.synthesize(image, vector, 0);
    const sign = orientation(image);
    vectors.push(vector.map((value) => sign * value));
    images.push(image.map((value) => sign * value));
  }
  return { vectors, images };
}

function* projectImages(
  library: Library,
  project: Project,
  mean: Float64Array,
  vectors: readonly Float64Array[],
  { heldOut, progress = () => {} }: BuildOptions,
): Generator<Projection> {
  const row = new Float64Array(mean.length);
  const scores = new Float64Array(vectors.length);
  // The constant function's coefficient, which the modes leave out.
  const constant = 1 / (library.nx * library.ny);
  for (let image = 0; image < library.count; image++) {
    project(row, image);
    let square = constant;
    let deviation = 0;
    for (let m = 0; m < row.length; m++) {
      const value = row[m] as number;
      const difference = value - (mean[m] as number);
      square += value * value;
      deviation += difference * difference;
      row[m] = difference;
    }
    for (let k = 0; k < vectors.length; k++) scores[k] = dot(vectors[k] as Float64Array, row);
    yield { image, heldOut: isHeldOut(image, heldOut), scores, square, deviation };
    if (image % PROGRESS_STEP === 0) {
      progress(EIGENVECTOR_PART + (1 - EIGENVECTOR_PART) * (image / library.count));
    }
  }
}

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0;
  for (let m = 0; m < a.length; m++) sum += (a[m] as number) * (b[m] as number);
  return sum;
}

function requireModes(modes: number, components: number): void {
  if (!(modes <= MOST_MODES)) {
    throw new InputProblem({
      code: 'too-many-modes',
      place: 'parameter resolution',
      expected: `at most ${MOST_MODES} frequencies within the field at this resolution`,
      found: `${modes}`,
      advice: 'Give a coarser resolution, or make the library with a smaller field or fewer pixels.',
    });
  }
  if (components <= modes) return;
  throw new InputProblem({
    code: 'too-many-components',
    place: 'parameter components',
    expected: `at most ${modes}, the frequencies within the field at this resolution`,
    found: `${components}`,
    advice: 'Ask for fewer components or a finer resolution.',
  });
}

function tooFew(images: number, components: number): InputProblem {
  return new InputProblem({
    code: 'too-many-components',
    place: 'parameter components',
    expected: `fewer components than the ${images} images in the basis`,
    found: `${components}`,
    advice: 'Ask for fewer components, or give more images.',
  });
}

function requireRank(eigenvalues: Float64Array, images: number): void {
  const rank = eigenvalues.filter((value) => value > NO_VARIANCE * (eigenvalues[0] as number)).length;
  if (rank === eigenvalues.length) return;
  throw new InputProblem({
    code: 'too-many-components',
    place: 'parameter components',
    expected: `at most ${rank}: at this resolution the ${images} images differ in no more directions than that`,
    found: `${eigenvalues.length}`,
    advice: 'Ask for fewer components, or give more varied images.',
  });
}
