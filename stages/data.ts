/** The things that stages hand to each other, in memory. How each lies in a file: CONVENTIONS.md; who reads and
 *  writes it: formats/. Arrays are flat Float64Array, complex numbers are two arrays (re, im). */

export interface Station {
  readonly name: string;
  /** Geocentric (ITRF) position, metres. */
  readonly xyz: readonly [number, number, number];
}

/** Averaged visibilities of one target in one band: row k is baseline station1[k]-station2[k] in scan scan[k]. */
export interface Visibilities {
  readonly target: { readonly name: string; readonly raDegrees: number; readonly decDegrees: number };
  readonly arrayName: string;
  /** Free text that must survive to reports, such as "invented data". Empty when there is nothing to say. */
  readonly remark: string;
  readonly stations: readonly Station[];
  readonly wavelengthMetres: number;
  readonly bandwidthMetres: number;
  readonly count: number;
  /** Indices into `stations`; station1 < station2. */
  readonly station1: Int32Array;
  readonly station2: Int32Array;
  /** Scan number, from 0, rising with time. */
  readonly scan: Int32Array;
  /** UTC, mean of the records averaged. */
  readonly timeMjd: Float64Array;
  readonly integrationSeconds: Float64Array;
  /** Wavelengths, station 1 to station 2, east and north; V = sum I exp(-2 pi i (u x + v y)). */
  readonly u: Float64Array;
  readonly v: Float64Array;
  /** Jy. */
  readonly re: Float64Array;
  readonly im: Float64Array;
  /** Jy, of one real component; of the amplitude (thermal, with an error budget once one has been added). */
  readonly sigma: Float64Array;
  /** Radians; thermal sigma/|V| with the error budget; pi when the amplitude is nothing. */
  readonly sigmaPhase: Float64Array;
  /** What optical arrays measure instead of, or beside, the rows above. */
  readonly squared?: SquaredVisibilities;
  readonly triples?: TripleProducts;
}

/** Squared visibilities over the square of the total flux: 1 for a point. Indices, scans and times as in `Visibilities`. */
export interface SquaredVisibilities {
  readonly count: number;
  readonly station1: Int32Array;
  readonly station2: Int32Array;
  readonly scan: Int32Array;
  readonly timeMjd: Float64Array;
  /** Wavelengths. */
  readonly u: Float64Array;
  readonly v: Float64Array;
  /** May be negative: the estimate is unbiased. */
  readonly value: Float64Array;
  readonly sigma: Float64Array;
}

/** Triple products V(u1,v1) V(u2,v2) conj(V(u1+u2, v1+v2)) over the cube of the total flux, of stations 1, 2 and 3. */
export interface TripleProducts {
  readonly count: number;
  readonly station1: Int32Array;
  readonly station2: Int32Array;
  readonly station3: Int32Array;
  readonly scan: Int32Array;
  readonly timeMjd: Float64Array;
  /** Wavelengths; from station 1 to 2, and from 2 to 3. */
  readonly u1: Float64Array;
  readonly v1: Float64Array;
  readonly u2: Float64Array;
  readonly v2: Float64Array;
  readonly amplitude: Float64Array;
  /** Infinity where there is no amplitude. */
  readonly sigmaAmplitude: Float64Array;
  /** Radians. */
  readonly phase: Float64Array;
  readonly sigmaPhase: Float64Array;
}

/** A square-pixelled image of the sky in FITS pixel order: x fastest, x index rising to the west, y index rising to
 *  the north; the origin of the offsets is the centre of the array, between pixels when the count is even. */
export interface SkyImage {
  readonly nx: number;
  readonly ny: number;
  readonly pixelRadians: number;
  /** length nx*ny; Jy per pixel (or per pixel of an image of unit flux). */
  readonly pixels: Float64Array;
}

/** Mean image and principal components of a library, all of one shape. Images of the library have unit flux, so the
 *  mean sums to 1 and components sum to 0. */
export interface Basis {
  readonly nx: number;
  readonly ny: number;
  readonly pixelRadians: number;
  /** FWHM of the circular Gaussian to whose resolution the library was band-limited, radians; 0 for none. */
  readonly resolutionRadians: number;
  readonly mean: Float64Array;
  /** components[k], length nx*ny, of unit norm, in order of falling variance. */
  readonly components: readonly Float64Array[];
  /** Variance along each component, divisor n-1. */
  readonly eigenvalues: Float64Array;
  readonly totalVariance: number;
  /** Coefficients of every library image: scores[i*K + k]. */
  readonly scores: Float64Array;
  /** Family of every library image. */
  readonly families: readonly string[];
}

/** Draws from a posterior over images: image = flux * mean + sum_k coefficient_k * component_k, in Jy per pixel. */
export interface Posterior {
  readonly count: number;
  readonly components: number;
  /** Jy, length count. */
  readonly flux: Float64Array;
  /** Jy, coefficients[s*components + k]. */
  readonly coefficients: Float64Array;
}

/** One number of a `numbers` document. */
export interface NumberValue {
  readonly value: number;
  readonly unit: string;
  /** Credible interval of 68 %; absent for a truth. */
  readonly low?: number;
  readonly high?: number;
  readonly low95?: number;
  readonly high95?: number;
  /** How the number is defined, and what the interval does not hold. */
  readonly definition: string;
}

/** The format `numbers`: JSON with the numbers by name and remarks that belong beside them. */
export interface Numbers {
  readonly values: Readonly<Record<string, NumberValue>>;
  readonly remarks: readonly string[];
}
