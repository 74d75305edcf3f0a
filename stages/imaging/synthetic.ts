/** A known source seen through the rows of an observation: the same (u,v), scans, stations and noise, gains and station
 *  phases drawn anew; and through its squared visibilities and triple products, which no station changes. What a fit makes of it is the method's own doing. The data are invented and say so. */

import type { SkyImage, Visibilities } from '../data.ts';
import { wrapPhase } from '../numerics/closures.ts';
import { cos, exp, sin } from '../numerics/elementary.ts';
import { visibilitiesOfAll } from '../numerics/fourier.ts';
import { type Model, visibilitiesOfModel } from '../numerics/models.ts';
import { type RandomStream, randomStream } from '../numerics/random.ts';
import type { ModelVisibilities } from './linear-model.ts';
import { productAt } from './optical-terms.ts';
import { type Points, pointsOf } from './points.ts';

export interface SyntheticOptions {
  /** Standard deviation of the log gain of every station, by index; drawn anew for every scan. */
  readonly gainDeviations: Float64Array;
  readonly seed: number;
  /** Times the stated noise. Default 1. */
  readonly noiseFactor?: number;
}

/** Returns new data. The phase budget in the template's errors (what is more than noise over amplitude) is kept, and put
 *  into the data as a phase of every row.
 *  @param source  of the flux that is wanted, Jy; a model's parts or an image */
export function observe(
  template: Visibilities,
  source: Model | SkyImage,
  { gainDeviations, seed, noiseFactor = 1 }: SyntheticOptions,
): Visibilities {
  const { count, station1, station2, scan } = template;
  const points = pointsOf(template);
  const [seenRe, seenIm] = visibilitiesOf(source, points.u, points.v);
  const stations = stationEffects(template, gainDeviations, seed);
  const noise = randomStream(seed, 'thermal noise');
  const re = new Float64Array(count);
  const im = new Float64Array(count);
  const sigma = template.sigma.map((value) => noiseFactor * value);
  const sigmaPhase = new Float64Array(count);
  for (let r = 0; r < count; r++) {
    const [a, b] = [stations(scan[r], station1[r]), stations(scan[r], station2[r])];
    const budget = phaseBudget(template, r);
    const turn = a.phase - b.phase + budget * noise.normal();
    const [c, s, gain] = [cos(turn), sin(turn), exp(a.logGain + b.logGain)];
    re[r] = gain * (seenRe[r] * c - seenIm[r] * s) + sigma[r] * noise.normal();
    im[r] = gain * (seenRe[r] * s + seenIm[r] * c) + sigma[r] * noise.normal();
    const thermal = sigma[r] / Math.sqrt(re[r] * re[r] + im[r] * im[r]);
    sigmaPhase[r] = Math.min(Math.PI, Math.sqrt(thermal * thermal + budget * budget));
  }
  const seen = { re: seenRe, im: seenIm };
  return {
    ...template,
    remark: 'invented data',
    re,
    im,
    sigma,
    sigmaPhase,
    ...opticalOf(template, points, seen, noiseFactor, randomStream(seed, 'optical noise')),
  };
}

/** Squared visibilities and triple products with noise of the stated errors, each its own. */
function opticalOf(
  { squared, triples }: Visibilities,
  { squared: from, triples: first, origin }: Points,
  at: ModelVisibilities,
  noiseFactor: number,
  noise: RandomStream,
): Pick<Visibilities, 'squared' | 'triples'> {
  const measured = (sigma: number, value: () => number) =>
    Number.isFinite(sigma) ? value() + sigma * noise.normal() : 0;
  const sides = (t: number) => [first + 3 * t, first + 3 * t + 1, first + 3 * t + 2];
  const square = (m: number) => productAt({ points: [from + m, origin], powers: [2, -2] }, at, 'amplitude');
  const amplitude = (t: number) =>
    productAt({ points: [...sides(t), origin], powers: [1, 1, 1, -3] }, at, 'amplitude');
  const phase = (t: number) => wrapPhase(productAt({ points: sides(t), powers: [1, 1, -1] }, at, 'phase'));
  const noisier = (errors: Float64Array) => errors.map((sigma) => noiseFactor * sigma);
  const seenSquares = (sigma: Float64Array) => ({
    sigma,
    value: sigma.map((error, m) => measured(error, () => square(m))),
  });
  const seenTriples = (sigmaAmplitude: Float64Array, sigmaPhase: Float64Array) => ({
    sigmaAmplitude,
    sigmaPhase,
    amplitude: sigmaAmplitude.map((error, t) => measured(error, () => amplitude(t))),
    phase: sigmaPhase.map((error, t) => measured(error, () => phase(t))),
  });
  return {
    ...(squared ? { squared: { ...squared, ...seenSquares(noisier(squared.sigma)) } } : {}),
    ...(triples
      ? {
          triples: {
            ...triples,
            ...seenTriples(noisier(triples.sigmaAmplitude), noisier(triples.sigmaPhase)),
          },
        }
      : {}),
  };
}

function visibilitiesOf(
  source: Model | SkyImage,
  u: Float64Array,
  v: Float64Array,
): [Float64Array, Float64Array] {
  const re = new Float64Array(u.length);
  const im = new Float64Array(u.length);
  if ('parts' in source) visibilitiesOfModel(re, im, source, u, v);
  else visibilitiesOfAll([re], [im], source, [source.pixels], u, v);
  return [re, im];
}

function stationEffects({ stations, scan }: Visibilities, deviations: Float64Array, seed: number) {
  const random = randomStream(seed, 'gains and phases');
  const effects = new Map<number, { logGain: number; phase: number }[]>();
  for (const number of [...new Set(scan)].sort((a, b) => a - b)) {
    effects.set(
      number,
      stations.map((_, k) => ({
        logGain: deviations[k] * random.normal(),
        phase: random.between(-Math.PI, Math.PI),
      })),
    );
  }
  return (number: number, station: number) =>
    (effects.get(number) as { logGain: number; phase: number }[])[station];
}

/** What a row's phase error is beyond the noise, radians. */
function phaseBudget({ re, im, sigma, sigmaPhase }: Visibilities, r: number): number {
  if (!(sigmaPhase[r] < Math.PI)) return 0;
  const thermal = sigma[r] / Math.sqrt(re[r] * re[r] + im[r] * im[r]);
  return Math.sqrt(Math.max(0, sigmaPhase[r] * sigmaPhase[r] - thermal * thermal));
}
