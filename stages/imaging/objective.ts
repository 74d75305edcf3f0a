/** The cost of a fit as a function of the whitened parameters: half the squares of prior, data terms, positivity. */

import type { CostFunction } from '../numerics/gauss-newton.ts';
import { expandLinear, linearPart, slopesAt } from './centroid.ts';
import { type LinearModel, type ModelVisibilities, predict } from './linear-model.ts';
import type { PositivityTerm } from './positivity-term.ts';
import { makeExpansion, mirror, type Term } from './term.ts';

export function makeObjective(
  model: LinearModel,
  terms: readonly Term[],
  positivity: PositivityTerm | null,
): CostFunction {
  // A step is costed first and expanded when it is taken: the model's visibilities are the same.
  let last: { x: Float64Array; at: ModelVisibilities } | null = null;
  const predicted = (x: Float64Array) => {
    if (last?.x !== x) last = { x, at: predict(model, x) };
    return last.at;
  };
  return {
    cost(x) {
      const at = predicted(x);
      const data = terms.reduce((sum, term) => sum + term.cost(at), 0);
      return data + priorCost(x) + (positivity ? positivity.cost(linearPart(model, x)) : 0);
    },
    expand(x) {
      const at = predicted(x);
      const out = makeExpansion(x.length);
      let cost = priorCost(x);
      const slopes = slopesAt(model, x, at);
      for (const term of terms) cost += term.expand(at, slopes, out);
      if (positivity) cost += expandLinear(positivity.expand, linearPart(model, x), out);
      for (let k = 0; k < x.length; k++) {
        out.gradient[k] += x[k];
        out.curvature[k * x.length + k] += 1;
      }
      mirror(out);
      return { cost, gradient: out.gradient, curvature: out.curvature };
    },
  };
}

function priorCost(x: Float64Array): number {
  let sum = 0;
  for (const value of x) sum += value * value;
  return sum / 2;
}
