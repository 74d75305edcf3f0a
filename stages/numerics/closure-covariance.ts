/** Errors of closure quantities by linear propagation. A closure is a signed sum over visibilities, so closures that
 *  share a baseline are correlated:
 *    C = A diag(s²) Aᵀ,  A the matrix of signs, s the error of each visibility's phase or log amplitude
 *  To first order in 1/snr both errors are 1/snr (Thompson, Moran & Swenson, 3rd ed., sections 9.3 and 10.3). */

/** A signed sum over rows of the visibilities: `signs[m]` times row `rows[m]`. */
export interface Closure {
  readonly rows: readonly number[];
  readonly signs: readonly number[];
}

/** Covariance of signed sums of independent quantities.
 *  @param closures  n of them
 *  @param variance  by row of the visibilities
 *  @returns length n*n, symmetric, in the unit of `variance`. Cost O(n² · rows per closure squared). */
export function closureCovariance(closures: readonly Closure[], variance: Float64Array): Float64Array {
  const n = closures.length;
  const out = new Float64Array(n * n);
  for (let a = 0; a < n; a++) {
    for (let b = a; b < n; b++) {
      const value = sharedVariance(closures[a], closures[b], variance);
      out[a * n + b] = value;
      out[b * n + a] = value;
    }
  }
  return out;
}

/** Variance of one signed sum of independent quantities, in the unit of `variance`. */
export function closureVariance(closure: Closure, variance: Float64Array): number {
  return sharedVariance(closure, closure, variance);
}

function sharedVariance(a: Closure, b: Closure, variance: Float64Array): number {
  let sum = 0;
  for (let m = 0; m < a.rows.length; m++) {
    for (let n = 0; n < b.rows.length; n++) {
      if (a.rows[m] === b.rows[n]) sum += a.signs[m] * b.signs[n] * variance[a.rows[m]];
    }
  }
  return sum;
}
