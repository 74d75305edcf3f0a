/** Reads the residuals that fit writes (fit/residuals.ts describes the layout) and makes of them what the data plot
 *  shows. Lists must be of one length; numbers must be finite and errors positive. */

import { z } from 'zod';
import type { ByteSource } from '../bytes.ts';
import { readDocument } from '../formats/document.ts';
import { InputProblem } from '../problem.ts';
import type { DataSeries } from './data-plot.ts';

const ADVICE = 'Give the output residuals of a fit.';
const numbers = z.array(z.number());

const residualsSchema = z.object({
  stations: z.array(z.string()),
  visibilities: z.object({
    u: numbers,
    v: numbers,
    station1: numbers,
    station2: numbers,
    scan: numbers,
    amplitude: numbers,
    sigma: numbers,
    modelAmplitude: numbers,
  }),
  closurePhases: z.object({
    stations: z.array(numbers),
    scan: numbers,
    phaseDegrees: numbers,
    sigmaDegrees: numbers,
    modelDegrees: numbers,
    residualDegrees: numbers,
  }),
});

const maybe = z.array(z.number().nullable());

/** What the fits of optical data have besides. */
const opticalSchema = z.object({
  squaredVisibilities: z
    .object({ u: numbers, v: numbers, value: numbers, sigma: numbers, model: numbers })
    .optional(),
  tripleProducts: z
    .object({ length: numbers, phaseDegrees: numbers, sigmaDegrees: maybe, modelDegrees: numbers })
    .optional(),
});

type Residuals = z.infer<typeof residualsSchema>;

export interface DrawnResiduals {
  readonly amplitudes: DataSeries;
  readonly closurePhases: DataSeries;
  /** Empty where the fit has none. */
  readonly squared: DataSeries;
  readonly triplePhases: DataSeries;
}

/** Reads residuals. @throws InputProblem when the document is not laid out so. */
export function readResiduals(source: ByteSource): DrawnResiduals {
  const schema = residualsSchema.and(opticalSchema);
  const residuals = readDocument(schema, source, 'residuals as fit writes them', ADVICE);
  const { visibilities, closurePhases } = residuals;
  requireLists(source.name, 'visibilities', visibilities, visibilities.sigma);
  requireLists(source.name, 'closurePhases', closurePhases, closurePhases.sigmaDegrees);
  return {
    amplitudes: amplitudeSeries(residuals),
    closurePhases: phaseSeries(source.name, residuals),
    squared: squaredSeries(source.name, residuals),
    triplePhases: tripleSeries(source.name, residuals),
  };
}

type Optical = z.infer<typeof opticalSchema>;

function squaredSeries(name: string, { squaredVisibilities }: Optical): DataSeries {
  if (squaredVisibilities === undefined) return seriesOf([], [], [], []);
  requireLists(name, 'squaredVisibilities', squaredVisibilities, squaredVisibilities.sigma);
  const { value, sigma, model } = squaredVisibilities;
  return seriesOf([...baselineLengths(squaredVisibilities)], value, sigma, model);
}

/** Of the products that have a phase. */
function tripleSeries(name: string, { tripleProducts }: Optical): DataSeries {
  if (tripleProducts === undefined) return seriesOf([], [], [], []);
  const { length, phaseDegrees, sigmaDegrees, modelDegrees } = tripleProducts;
  const own = sigmaDegrees.flatMap((sigma, t) => (sigma === null ? [] : [t]));
  const of = (list: readonly number[]) => own.map((t) => list[t]);
  const sigma = own.map((t) => sigmaDegrees[t] as number);
  const lists = { length, phaseDegrees, modelDegrees };
  requireLists(
    name,
    'tripleProducts',
    lists,
    sigmaDegrees.map((each) => each ?? 1),
  );
  requireLists(name, 'tripleProducts', {}, sigma);
  const series = seriesOf(of(length), of(phaseDegrees), sigma, of(modelDegrees));
  const wrapped = (degrees: number) => degrees - 360 * Math.round(degrees / 360);
  return {
    ...series,
    residual: series.observed.map((value, k) => wrapped(value - series.model[k]) / sigma[k]),
  };
}

function seriesOf(
  length: readonly number[],
  observed: readonly number[],
  sigma: readonly number[],
  model: readonly number[],
): DataSeries {
  return {
    length: Float64Array.from(length),
    observed: Float64Array.from(observed),
    sigma: Float64Array.from(sigma),
    model: Float64Array.from(model),
    residual: Float64Array.from(observed, (value, k) => (value - model[k]) / sigma[k]),
  };
}

function amplitudeSeries({ visibilities }: Residuals): DataSeries {
  const { amplitude, sigma, modelAmplitude } = visibilities;
  return seriesOf([...baselineLengths(visibilities)], amplitude, sigma, modelAmplitude);
}

function phaseSeries(name: string, { visibilities, closurePhases }: Residuals): DataSeries {
  const lengths = baselineLengths(visibilities);
  const { scan, station1, station2 } = visibilities;
  const row = new Map(scan.map((s, k) => [pairKey(s, station1[k], station2[k]), k]));
  const length = closurePhases.stations.map((triangle, t) => {
    const [a, b, c] = triangle;
    const rows = [
      pairKey(closurePhases.scan[t], a, b),
      pairKey(closurePhases.scan[t], b, c),
      pairKey(closurePhases.scan[t], a, c),
    ].map((key) => row.get(key));
    if (triangle.length !== 3 || rows.includes(undefined)) {
      const place = `${name}, closurePhases.stations.${t}`;
      throw badResiduals(
        place,
        'three stations whose baselines are among the visibilities of the scan',
        `[${triangle}]`,
      );
    }
    return Math.max(...rows.map((k) => lengths[k as number]));
  });
  return {
    length: Float64Array.from(length),
    observed: Float64Array.from(closurePhases.phaseDegrees),
    sigma: Float64Array.from(closurePhases.sigmaDegrees),
    model: Float64Array.from(closurePhases.modelDegrees),
    residual: Float64Array.from(
      closurePhases.residualDegrees,
      (value, k) => value / closurePhases.sigmaDegrees[k],
    ),
  };
}

function baselineLengths({
  u,
  v,
}: {
  readonly u: readonly number[];
  readonly v: readonly number[];
}): Float64Array {
  return Float64Array.from(u, (each, k) => Math.sqrt(each * each + v[k] * v[k]));
}

function pairKey(scan: number, a: number, b: number): string {
  return `${scan} ${Math.min(a, b)} ${Math.max(a, b)}`;
}

function requireLists(name: string, table: string, lists: object, sigma: readonly number[]): void {
  for (const [key, list] of Object.entries(lists) as [string, readonly unknown[]][]) {
    if (list.length === sigma.length) continue;
    throw badResiduals(
      `${name}, ${table}.${key}`,
      `${sigma.length} values, as there are errors`,
      String(list.length),
    );
  }
  const bad = sigma.findIndex((value) => !(value > 0));
  if (bad >= 0) throw badResiduals(`${name}, ${table}, error ${bad}`, 'an error above 0', String(sigma[bad]));
}

function badResiduals(place: string, expected: string, found: string): InputProblem {
  return new InputProblem({
    code: 'bad-residuals',
    place,
    expected,
    found,
    advice: ADVICE,
  });
}
