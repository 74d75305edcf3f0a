/** Squared visibilities and triple products of an image, by slow sums, at the points of an invented observation. */

import type { SkyImage, SquaredVisibilities, TripleProducts, Visibilities } from '../../../stages/data.ts';
import { randomStream } from '../../../stages/numerics/random.ts';
import { slowVisibility } from './synthetic-data.ts';

export interface OpticalOptions {
  readonly sigmaSquared?: number;
  /** Radians. */
  readonly sigmaPhase?: number;
  readonly seed?: number;
}

/** Every baseline and every triangle of the template; no rows. @param image  of any flux: the products are normalised */
export function observeOptically(
  template: Visibilities,
  image: SkyImage,
  { sigmaSquared = 0.01, sigmaPhase = 0.05, seed = 1 }: OpticalOptions = {},
): Visibilities {
  const random = randomStream(seed, 'optical');
  const [flux] = slowVisibility(image, 0, 0);
  const seen = (u: number, v: number) => slowVisibility(image, u, v).map((part) => part / flux);
  const rows = Array.from({ length: template.count }, (_, r) => r);
  const take = (values: Float64Array) => Float64Array.from(rows, (r) => values[r]);
  const squared: SquaredVisibilities = {
    count: template.count,
    station1: Int32Array.from(template.station1),
    station2: Int32Array.from(template.station2),
    scan: Int32Array.from(template.scan),
    timeMjd: take(template.timeMjd),
    u: take(template.u),
    v: take(template.v),
    value: Float64Array.from(rows, (r) => {
      const [re, im] = seen(template.u[r], template.v[r]);
      return re * re + im * im + sigmaSquared * random.normal();
    }),
    sigma: new Float64Array(template.count).fill(sigmaSquared),
  };
  const at = new Map(
    rows.map((r) => [`${template.scan[r]} ${template.station1[r]} ${template.station2[r]}`, r]),
  );
  const triangles = rows.flatMap((first) =>
    rows.flatMap((second) => {
      const isJoined =
        template.scan[first] === template.scan[second] &&
        template.station2[first] === template.station1[second];
      const scan = template.scan[first];
      return isJoined && at.has(`${scan} ${template.station1[first]} ${template.station2[second]}`)
        ? [{ first, second }]
        : [];
    }),
  );
  const products = triangles.map(({ first, second }) => {
    const [u1, v1] = [template.u[first], template.v[first]];
    const [u2, v2] = [template.u[second], template.v[second]];
    const [a, b, c] = [seen(u1, v1), seen(u2, v2), seen(u1 + u2, v1 + v2)];
    // a b conj(c)
    const [re, im] = [a[0] * b[0] - a[1] * b[1], a[0] * b[1] + a[1] * b[0]];
    return [re * c[0] + im * c[1], im * c[0] - re * c[1]];
  });
  const triples: TripleProducts = {
    count: triangles.length,
    station1: Int32Array.from(triangles, ({ first }) => template.station1[first]),
    station2: Int32Array.from(triangles, ({ first }) => template.station2[first]),
    station3: Int32Array.from(triangles, ({ second }) => template.station2[second]),
    scan: Int32Array.from(triangles, ({ first }) => template.scan[first]),
    timeMjd: Float64Array.from(triangles, ({ first }) => template.timeMjd[first]),
    u1: Float64Array.from(triangles, ({ first }) => template.u[first]),
    v1: Float64Array.from(triangles, ({ first }) => template.v[first]),
    u2: Float64Array.from(triangles, ({ second }) => template.u[second]),
    v2: Float64Array.from(triangles, ({ second }) => template.v[second]),
    amplitude: Float64Array.from(products, ([re, im]) => Math.hypot(re, im) + sigmaSquared * random.normal()),
    sigmaAmplitude: new Float64Array(triangles.length).fill(sigmaSquared),
    phase: Float64Array.from(products, ([re, im]) => Math.atan2(im, re) + sigmaPhase * random.normal()),
    sigmaPhase: new Float64Array(triangles.length).fill(sigmaPhase),
  };
  const none = new Float64Array(0);
  const noneOf = new Int32Array(0);
  return {
    ...template,
    count: 0,
    station1: noneOf,
    station2: noneOf,
    scan: noneOf,
    timeMjd: none,
    integrationSeconds: none,
    u: none,
    v: none,
    re: none,
    im: none,
    sigma: none,
    sigmaPhase: none,
    squared,
    triples,
  };
}
