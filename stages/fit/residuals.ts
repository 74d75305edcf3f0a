/** The output `residuals`: data with model and error. Angles in degrees, flux densities in Jy, baselines in wavelengths;
 *  stations are indices into `stations`. */

import type { Visibilities } from '../data.ts';
import type { DataKind } from '../imaging/data-terms.ts';
import type { ModelVisibilities } from '../imaging/linear-model.ts';
import { productAt } from '../imaging/optical-terms.ts';
import { pointsOf } from '../imaging/points.ts';
import { riceMean } from '../imaging/rice.ts';
import type { ScanGains } from '../imaging/scan-gains.ts';
import {
  type Closure,
  type ClosureSet,
  closurePhase,
  logClosureAmplitude,
  wrapPhase,
} from '../numerics/closures.ts';
import { exp } from '../numerics/elementary.ts';

export interface FitResiduals {
  /** Data terms of the fit, as the parameter names them. */
  readonly data: DataKind;
  readonly stations: readonly string[];
  /** One value per row; rows are those of the fit. */
  readonly visibilities: {
    readonly u: Float64Array;
    readonly v: Float64Array;
    readonly station1: Int32Array;
    readonly station2: Int32Array;
    readonly scan: Int32Array;
    readonly timeMjd: Float64Array;
    readonly amplitude: Float64Array;
    readonly sigma: Float64Array;
    /** Amplitude of the image times the gains of the fit, with the mean of the noise. */
    readonly modelAmplitude: Float64Array;
    readonly re: Float64Array;
    readonly im: Float64Array;
    /** Visibility of the image, at the place of the fit where the centroid is a parameter, without gains. */
    readonly modelRe: Float64Array;
    readonly modelIm: Float64Array;
  };
  readonly closurePhases: {
    /** Three stations per closure phase. */
    readonly stations: readonly (readonly number[])[];
    readonly scan: readonly number[];
    readonly timeMjd: readonly number[];
    readonly phaseDegrees: readonly number[];
    readonly sigmaDegrees: readonly number[];
    readonly modelDegrees: readonly number[];
    /** Observed less model, in (-180, 180]. */
    readonly residualDegrees: readonly number[];
    /** Area of the triangle in the Fourier plane, square wavelengths. */
    readonly area: readonly number[];
  };
  readonly logClosureAmplitudes: {
    readonly stations: readonly (readonly number[])[];
    readonly scan: readonly number[];
    readonly value: readonly number[];
    readonly sigma: readonly number[];
    readonly model: readonly number[];
  };
  /** Over the square of the total flux; absent where the fit has none. */
  readonly squaredVisibilities?: {
    readonly u: Float64Array;
    readonly v: Float64Array;
    readonly station1: Int32Array;
    readonly station2: Int32Array;
    readonly scan: Int32Array;
    readonly value: Float64Array;
    readonly sigma: Float64Array;
    readonly model: Float64Array;
  };
  /** All, also those that do not enter; absent where the fit has none. */
  readonly tripleProducts?: {
    readonly stations: readonly (readonly number[])[];
    readonly scan: Int32Array;
    /** Of the longest of the three sides, wavelengths. */
    readonly length: Float64Array;
    readonly phaseDegrees: Float64Array;
    readonly sigmaDegrees: readonly (number | null)[];
    readonly modelDegrees: Float64Array;
    readonly amplitude: Float64Array;
    /** Null where there is no amplitude. */
    readonly sigmaAmplitude: readonly (number | null)[];
    readonly modelAmplitude: Float64Array;
  };
}

const DEGREES = 180 / Math.PI;

export function makeResiduals(
  kind: DataKind,
  data: Visibilities,
  sets: readonly ClosureSet[],
  at: ModelVisibilities,
  gains: readonly ScanGains[],
): FitResiduals {
  return {
    data: kind,
    stations: data.stations.map(({ name }) => name),
    visibilities: {
      u: data.u,
      v: data.v,
      station1: data.station1,
      station2: data.station2,
      scan: data.scan,
      timeMjd: data.timeMjd,
      amplitude: data.re.map((re, r) => Math.sqrt(re * re + data.im[r] * data.im[r])),
      sigma: data.sigma,
      modelAmplitude: modelAmplitudes(data, at, gains),
      re: data.re,
      im: data.im,
      modelRe: at.re.subarray(0, data.count),
      modelIm: at.im.subarray(0, data.count),
    },
    closurePhases: closurePhases(data, sets, at),
    logClosureAmplitudes: logClosureAmplitudes(data, sets, at),
    ...squaredVisibilities(data, at),
    ...tripleProducts(data, at),
  };
}

function squaredVisibilities(
  data: Visibilities,
  at: ModelVisibilities,
): Pick<FitResiduals, 'squaredVisibilities'> {
  const { squared: from, origin } = pointsOf(data);
  if (!data.squared) return {};
  const { count: _, timeMjd: __, ...columns } = data.squared;
  const model = columns.value.map((_value, m) =>
    productAt({ points: [from + m, origin], powers: [2, -2] }, at, 'amplitude'),
  );
  return { squaredVisibilities: { ...columns, model } };
}

function tripleProducts(data: Visibilities, at: ModelVisibilities): Pick<FitResiduals, 'tripleProducts'> {
  const { u, v, triples: from, origin } = pointsOf(data);
  if (!data.triples) return {};
  const { station1, station2, station3, scan, phase, sigmaPhase, amplitude, sigmaAmplitude } = data.triples;
  const points = (t: number) => [from + 3 * t, from + 3 * t + 1, from + 3 * t + 2];
  const finite = (values: Float64Array, scale: number) =>
    Array.from(values, (value) => (Number.isFinite(value) ? value * scale : null));
  return {
    tripleProducts: {
      stations: Array.from(station1, (first, t) => [first, station2[t], station3[t]]),
      scan,
      length: phase.map((_, t) =>
        Math.max(...points(t).map((point) => Math.sqrt(u[point] * u[point] + v[point] * v[point]))),
      ),
      phaseDegrees: phase.map((value) => value * DEGREES),
      sigmaDegrees: finite(sigmaPhase, DEGREES),
      modelDegrees: phase.map(
        (_, t) => wrapPhase(productAt({ points: points(t), powers: [1, 1, -1] }, at, 'phase')) * DEGREES,
      ),
      amplitude,
      sigmaAmplitude: finite(sigmaAmplitude, 1),
      modelAmplitude: amplitude.map((_, t) =>
        productAt({ points: [...points(t), origin], powers: [1, 1, 1, -3] }, at, 'amplitude'),
      ),
    },
  };
}

/** Expected amplitudes, Jy: |M| times the gains, under noise. Scans without gains count as gain 1. */
export function modelAmplitudes(
  data: Visibilities,
  at: ModelVisibilities,
  gains: readonly ScanGains[],
): Float64Array {
  const byScan = new Map(gains.map((scan) => [scan.scan, scan]));
  const logGain = (scan: number, station: number) => {
    const found = byScan.get(scan);
    const place = found ? found.stations.indexOf(station) : -1;
    return found && place >= 0 ? found.logGains[place] : 0;
  };
  return data.sigma.map((sigma, r) => {
    const size = Math.sqrt(at.re[r] * at.re[r] + at.im[r] * at.im[r]);
    const gain = exp(logGain(data.scan[r], data.station1[r]) + logGain(data.scan[r], data.station2[r]));
    return sigma * riceMean((gain * size) / sigma)[0];
  });
}

function closurePhases(
  data: Visibilities,
  sets: readonly ClosureSet[],
  at: ModelVisibilities,
): FitResiduals['closurePhases'] {
  const rows = sets.flatMap((set) =>
    set.triangles.map((closure, t) => {
      const observed = closurePhase(closure, data.re, data.im);
      const model = closurePhase(closure, at.re, at.im);
      return {
        stations: stationsOf(data, closure),
        scan: set.scan,
        timeMjd: data.timeMjd[closure.rows[0]],
        phaseDegrees: observed * DEGREES,
        sigmaDegrees: Math.sqrt(set.phaseCovariance[t * set.triangles.length + t]) * DEGREES,
        modelDegrees: model * DEGREES,
        residualDegrees: wrapPhase(observed - model) * DEGREES,
        area: triangleArea(data, closure),
      };
    }),
  );
  const column = <K extends keyof (typeof rows)[number]>(key: K) => rows.map((row) => row[key]);
  return {
    stations: column('stations'),
    scan: column('scan'),
    timeMjd: column('timeMjd'),
    phaseDegrees: column('phaseDegrees'),
    sigmaDegrees: column('sigmaDegrees'),
    modelDegrees: column('modelDegrees'),
    residualDegrees: column('residualDegrees'),
    area: column('area'),
  };
}

function logClosureAmplitudes(
  data: Visibilities,
  sets: readonly ClosureSet[],
  at: ModelVisibilities,
): FitResiduals['logClosureAmplitudes'] {
  const rows = sets.flatMap((set) =>
    set.quadrangles.map((closure, q) => ({
      stations: stationsOf(data, closure),
      scan: set.scan,
      value: logClosureAmplitude(closure, data.re, data.im),
      sigma: Math.sqrt(set.logAmplitudeCovariance[q * set.quadrangles.length + q]),
      model: logClosureAmplitude(closure, at.re, at.im),
    })),
  );
  return {
    stations: rows.map(({ stations }) => stations),
    scan: rows.map(({ scan }) => scan),
    value: rows.map(({ value }) => value),
    sigma: rows.map(({ sigma }) => sigma),
    model: rows.map(({ model }) => model),
  };
}

/** Indices of the stations of a closure, rising. */
export function stationsOf(data: Visibilities, closure: Closure): number[] {
  const all = closure.rows.flatMap((row) => [data.station1[row], data.station2[row]]);
  return [...new Set(all)].sort((a, b) => a - b);
}

/** Half the cross product of the first two baselines. */
function triangleArea(data: Visibilities, closure: Closure): number {
  const [a, b] = closure.rows;
  return Math.abs(data.u[a] * data.v[b] - data.v[a] * data.u[b]) / 2;
}
