/** Squared visibilities and triple products as data terms: what optical arrays measure. With F = V(0,0) the total flux,
 *
 *    squared visibility   |V(u,v)|^2 / F^2
 *    triple product       V(u1,v1) V(u2,v2) conj(V(u1+u2, v1+v2)) / F^3          its phase and its amplitude
 *
 *  (Duvert, Young and Hummel 2017, Astron. Astrophys. 597, A8, section 5). The estimates are unbiased, and no gain of a
 *  station enters: what transmission is left has been divided out. Each is a product of powers of visibilities:
 *
 *    ln f = sum_k w_k ln|V_k|,  d f = f sum_k w_k d ln|V_k|;     arg = sum_k w_k arg V_k
 *
 *  Of the triple products of a scan those enter that are independent, the most precise first (N stations have
 *  N(N-1)(N-2)/6, of which (N-1)(N-2)/2 are). Their errors count as uncorrelated: the data do not say how they are. */

import type { TripleProducts, Visibilities } from '../data.ts';
import { independentClosures, wrapPhase } from '../numerics/closures.ts';
import { atan2, exp, ln } from '../numerics/elementary.ts';
import type { ModelVisibilities } from './linear-model.ts';
import { pointsOf } from './points.ts';
import { addResidual, logDerivatives, type Term } from './term.ts';

/** One measurement: a product of powers of the visibilities at some points. */
export interface Product {
  readonly scan: number;
  readonly points: readonly number[];
  readonly powers: readonly number[];
  readonly value: number;
  readonly sigma: number;
}

type Part = 'amplitude' | 'phase';

export function makeSquaredTerm(data: Visibilities): Term {
  const { squared: from, origin } = pointsOf(data);
  const { squared } = data;
  const products = Array.from({ length: squared?.count ?? 0 }, (_, m): Product => {
    const { scan, value, sigma } = squared as NonNullable<typeof squared>;
    return {
      scan: scan[m],
      points: [from + m, origin],
      powers: [2, -2],
      value: value[m],
      sigma: sigma[m],
    };
  });
  return productTerm('squared visibilities', products, 'amplitude');
}

/** @param chosen  of `chosenTriples` */
export function makeTriplePhaseTerm(data: Visibilities, chosen: readonly number[]): Term {
  const { triples: from } = pointsOf(data);
  const { scan, phase, sigmaPhase } = data.triples as TripleProducts;
  const products = chosen.map((t) => ({
    scan: scan[t],
    points: [from + 3 * t, from + 3 * t + 1, from + 3 * t + 2],
    powers: [1, 1, -1],
    value: phase[t],
    sigma: sigmaPhase[t],
  }));
  return productTerm('triple phases', products, 'phase');
}

export function makeTripleAmplitudeTerm(data: Visibilities, chosen: readonly number[]): Term {
  const { triples: from, origin } = pointsOf(data);
  const { scan, amplitude, sigmaAmplitude } = data.triples as TripleProducts;
  const products = chosen.map((t) => ({
    scan: scan[t],
    points: [from + 3 * t, from + 3 * t + 1, from + 3 * t + 2, origin],
    powers: [1, 1, 1, -3],
    value: amplitude[t],
    sigma: sigmaAmplitude[t],
  }));
  return productTerm('triple amplitudes', products, 'amplitude');
}

export interface ChosenTriples {
  readonly chosen: readonly number[];
  /** How many have no finite error, or one above the limit. */
  readonly noisy: number;
  /** How many follow from the others of their scan. */
  readonly dependent: number;
}

/** The triple products that enter a term. @param limit  largest error; that of a phase in radians */
export function chosenTriples(triples: TripleProducts, part: Part, limit: number): ChosenTriples {
  const sigma = part === 'phase' ? triples.sigmaPhase : triples.sigmaAmplitude;
  const admitted = Array.from(sigma.keys()).filter((t) => sigma[t] <= limit && Number.isFinite(sigma[t]));
  const chosen: number[] = [];
  for (const scan of [...new Set(admitted.map((t) => triples.scan[t]))].sort((a, b) => a - b)) {
    const own = admitted.filter((t) => triples.scan[t] === scan);
    chosen.push(...independentTriples(triples, own, sigma));
  }
  return {
    chosen: chosen.sort((a, b) => a - b),
    noisy: triples.count - admitted.length,
    dependent: admitted.length - chosen.length,
  };
}

/** Of triples of one scan those that raise the rank of the signs with which baselines enter. */
function independentTriples(
  { station1, station2, station3 }: TripleProducts,
  own: readonly number[],
  sigma: Float64Array,
): number[] {
  const baselines = new Map<string, number>();
  const side = (a: number, b: number): [number, number] => {
    const key = a < b ? `${a}-${b}` : `${b}-${a}`;
    if (!baselines.has(key)) baselines.set(key, baselines.size);
    return [baselines.get(key) as number, a < b ? 1 : -1];
  };
  const ordered = [...own].sort((a, b) => sigma[a] - sigma[b] || a - b);
  const closures = ordered.map((t) => {
    const [a, b, c] = [station1[t], station2[t], station3[t]];
    const sides = [side(a, b), side(b, c), side(c, a)];
    return { triple: t, rows: sides.map(([row]) => row), signs: sides.map(([, sign]) => sign) };
  });
  // All of one variance: the order stays that of the errors.
  const kept = new Set<object>(independentClosures(closures, new Float64Array(baselines.size).fill(1)));
  return closures.filter((closure) => kept.has(closure)).map(({ triple }) => triple);
}

function productTerm(name: string, products: readonly Product[], part: Part): Term {
  const residual = (product: Product, at: ModelVisibilities) => {
    const model = productAt(product, at, part);
    const difference = model - product.value;
    return (part === 'phase' ? wrapPhase(difference) : difference) / product.sigma;
  };
  /** d residual over d ln f or d arg. */
  const scaleOf = (product: Product, at: ModelVisibilities) =>
    (part === 'phase' ? 1 : productAt(product, at, part)) / product.sigma;
  const chiSquare: Term['chiSquare'] = (at) =>
    products.reduce((sum, product) => sum + residual(product, at) * residual(product, at), 0);
  return {
    name,
    count: products.length,
    scans: [...new Set(products.map(({ scan }) => scan))].sort((a, b) => a - b),
    chiSquare,
    nuisances: () => 0,
    cost: (at) => chiSquare(at) / 2,
    expand(at, slopes, out) {
      const columns = out.gradient.length;
      const own = new Float64Array(columns);
      const J = new Float64Array(columns);
      for (const product of products) {
        const scale = scaleOf(product, at);
        J.fill(0);
        product.points.forEach((point, m) => {
          logDerivatives(
            part === 'phase' ? null : own,
            part === 'phase' ? own : null,
            at,
            slopes,
            point,
            columns,
          );
          for (let k = 0; k < columns; k++) J[k] += scale * product.powers[m] * own[k];
        });
        addResidual(out, residual(product, at), J, 0);
      }
      return chiSquare(at) / 2;
    },
    adjoint(at, out) {
      let cost = 0;
      for (const product of products) {
        const value = residual(product, at);
        cost += (value * value) / 2;
        const pull = value * scaleOf(product, at);
        product.points.forEach((point, m) => {
          addLogSlope(out, at, point, pull * product.powers[m], part);
        });
      }
      return cost;
    },
    only: (scans) =>
      productTerm(
        name,
        products.filter(({ scan }) => scans.has(scan)),
        part,
      ),
  };
}

/** f, or the angle in radians, not wrapped. 0 where a visibility in the numerator is. */
export function productAt(
  { points, powers }: Pick<Product, 'points' | 'powers'>,
  { re, im }: ModelVisibilities,
  part: Part,
): number {
  let sum = 0;
  for (let m = 0; m < points.length; m++) {
    const [a, b] = [re[points[m]], im[points[m]]];
    sum += powers[m] * (part === 'phase' ? atan2(b, a) : ln(a * a + b * b) / 2);
  }
  return part === 'phase' ? sum : exp(sum);
}

/** Adds pull * d ln|V|, or pull * d arg V. */
function addLogSlope(out: ModelVisibilities, at: ModelVisibilities, r: number, pull: number, part: Part) {
  const [re, im] = [at.re[r], at.im[r]];
  const square = re * re + im * im;
  if (!(square > 0)) return;
  out.re[r] += (pull * (part === 'phase' ? -im : re)) / square;
  out.im[r] += (pull * (part === 'phase' ? re : im)) / square;
}
