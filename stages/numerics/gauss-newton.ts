/** Damped Gauss-Newton minimisation (Levenberg 1944, Q. Appl. Math. 2, 164; Marquardt 1963, J. SIAM 11, 431).
 *
 *  Each step solves (H + mu diag H) step = -gradient with H the positive definite Gauss-Newton curvature. The step is
 *  taken when the cost falls; mu falls then and rises otherwise. It starts at 0, so a quadratic cost takes one step. */

import { cholesky, solveCholesky } from './linear.ts';

export interface CostFunction {
  /** Returns the cost alone; half a sum of squares in the usual case. */
  cost(x: Float64Array): number;
  /** Returns cost, gradient (n) and curvature (n*n, symmetric, positive definite). */
  expand(x: Float64Array): { cost: number; gradient: Float64Array; curvature: Float64Array };
}

export interface GaussNewtonOptions {
  /** Limit of steps tried. Default 60. */
  readonly mostSteps?: number;
  /** Converged when the undamped step promises to lower the cost by less than this. Default 1e-6, which is a
   *  thousandth of a standard deviation. */
  readonly tolerance?: number;
}

export interface Minimum {
  readonly x: Float64Array;
  readonly cost: number;
  readonly curvature: Float64Array;
  readonly steps: number;
  /** False when the limit of steps was reached or no damping lowered the cost. */
  readonly converged: boolean;
}

const DEFAULT_STEPS = 60;
const DEFAULT_TOLERANCE = 1e-6;
const FIRST_DAMPING = 1e-3;
/** Steps shorter than with this damping do not change a double. */
const MOST_DAMPING = 1e12;

/** Returns the minimum that is reached from a start. @throws RangeError when the start's cost is not finite. */
export function gaussNewton(f: CostFunction, start: Float64Array, options: GaussNewtonOptions = {}): Minimum {
  const mostSteps = options.mostSteps ?? DEFAULT_STEPS;
  const tolerance = options.tolerance ?? DEFAULT_TOLERANCE;
  let x = Float64Array.from(start);
  let here = f.expand(x);
  if (!Number.isFinite(here.cost)) throw new RangeError('gaussNewton: the cost at the start is not finite');
  let damping = 0;
  for (let steps = 0; steps < mostSteps; steps++) {
    const step = dampedStep(here, damping);
    if (step && damping === 0 && promise(here, step) < tolerance) return minimum(x, here, steps, true);
    const next = step && x.map((value, k) => value + step[k]);
    if (next && f.cost(next) < here.cost) {
      x = next;
      here = f.expand(x);
      damping = damping > FIRST_DAMPING ? damping / 10 : 0;
    } else {
      damping = damping === 0 ? FIRST_DAMPING : damping * 10;
      if (!(damping < MOST_DAMPING)) return minimum(x, here, steps, false);
    }
  }
  return minimum(x, here, mostSteps, false);
}

type Expansion = ReturnType<CostFunction['expand']>;

function minimum(x: Float64Array, here: Expansion, steps: number, converged: boolean): Minimum {
  return { x, cost: here.cost, curvature: here.curvature, steps, converged };
}

function dampedStep({ curvature, gradient }: Expansion, damping: number): Float64Array | null {
  const n = gradient.length;
  const damped = Float64Array.from(curvature);
  for (let k = 0; k < n; k++) damped[k * n + k] *= 1 + damping;
  const L = cholesky(damped, n);
  const fall = gradient.map((value) => -value);
  return L && solveCholesky(L, fall);
}

/** By how much the quadratic model falls along a step: -g s - s H s / 2. */
function promise({ gradient, curvature }: Expansion, step: Float64Array): number {
  const n = step.length;
  let fall = 0;
  for (let i = 0; i < n; i++) {
    let row = 0;
    for (let j = 0; j < n; j++) row += curvature[i * n + j] * step[j];
    fall -= step[i] * (gradient[i] + row / 2);
  }
  return fall;
}
