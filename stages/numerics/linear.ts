/** Small dense linear algebra on flat Float64Array, row after row: A[i*n + j]. Fixed order of every sum.
 *  Sources: Golub and Van Loan, Matrix Computations, 4th ed., sections 4.2 (Cholesky) and 5.2, 5.3 (Householder QR and
 *  least squares). */

/** Returns the lower triangle L with A = L L^T (zeros above), or null when A is not positive definite (NaN included).
 *  @param A  symmetric, n on a side; only the lower triangle is read. Cost n^3/3. */
export function cholesky(A: Float64Array, n: number): Float64Array | null {
  requireSize('cholesky', A.length, n * n);
  const L = new Float64Array(n * n);
  for (let i = 0; i < n; i++) {
    for (let j = 0; j <= i; j++) {
      let sum = A[i * n + j];
      for (let k = 0; k < j; k++) sum -= L[i * n + k] * L[j * n + k];
      if (j < i) {
        L[i * n + j] = sum / L[j * n + j];
      } else {
        if (!(sum > 0 && sum < Number.POSITIVE_INFINITY)) return null;
        L[i * n + i] = Math.sqrt(sum);
      }
    }
  }
  return L;
}

/** The same of a matrix that is positive definite but for rounding: where it is not, the diagonal is raised by as little as
 *  helps, from 1e-14 to 1e-6 of itself; null when that does not help. */
export function choleskyNearby(A: Float64Array, n: number): Float64Array | null {
  for (let raise = 0; raise <= MOST_RAISE; raise = raise === 0 ? LEAST_RAISE : raise * 100) {
    const raised = Float64Array.from(A);
    for (let k = 0; k < n; k++) raised[k * n + k] *= 1 + raise;
    const L = cholesky(raised, n);
    if (L) return L;
  }
  return null;
}

const LEAST_RAISE = 1e-14;
const MOST_RAISE = 1e-6;

/** Adds sum_k factors[k] vectors[k] to `out`, vector after vector. Four at a time, so that `out` is read and written a
 *  quarter as often; the order of the sums, and so every bit, is that of one at a time. Vectors beyond the factors are
 *  left out. Cost one multiply-add per value and factor. */
export function addCombination(
  out: Float64Array,
  vectors: readonly Float64Array[],
  factors: Float64Array,
): void {
  const count = factors.length;
  let k = 0;
  for (; k + 4 <= count; k += 4) {
    const [a, b, c, d] = [vectors[k], vectors[k + 1], vectors[k + 2], vectors[k + 3]];
    const [fa, fb, fc, fd] = [factors[k], factors[k + 1], factors[k + 2], factors[k + 3]];
    for (let i = 0; i < out.length; i++) {
      out[i] = out[i] + fa * a[i] + fb * b[i] + fc * c[i] + fd * d[i];
    }
  }
  for (; k < count; k++) {
    const [a, fa] = [vectors[k], factors[k]];
    for (let i = 0; i < out.length; i++) out[i] += fa * a[i];
  }
}

/** Returns x with L x = b. Cost n^2. */
export function solveLower(L: Float64Array, b: Float64Array): Float64Array {
  const n = b.length;
  const x = Float64Array.from(b);
  for (let i = 0; i < n; i++) {
    let sum = x[i];
    for (let k = 0; k < i; k++) sum -= L[i * n + k] * x[k];
    x[i] = sum / L[i * n + i];
  }
  return x;
}

/** Returns x with L^T x = b. Cost n^2. */
export function solveLowerTransposed(L: Float64Array, b: Float64Array): Float64Array {
  const n = b.length;
  const x = Float64Array.from(b);
  for (let i = n - 1; i >= 0; i--) {
    let sum = x[i];
    for (let k = i + 1; k < n; k++) sum -= L[k * n + i] * x[k];
    x[i] = sum / L[i * n + i];
  }
  return x;
}

/** For each row of L the column of its first number that is not 0: what stands before it is skipped below. */
export function profileOf(L: Float64Array, n: number): Int32Array {
  return Int32Array.from({ length: n }, (_, i) => {
    let k = 0;
    while (k < i && L[i * n + k] === 0) k++;
    return k;
  });
}

/** x := L^-1 x. @param profile  of `profileOf`. Cost: two for each number of the profile */
export function applyInverse(L: Float64Array, x: Float64Array, profile: Int32Array): void {
  const n = x.length;
  for (let i = 0; i < n; i++) {
    const row = i * n;
    let k = profile[i];
    // Four sums side by side.
    let a = 0;
    let b = 0;
    let c = 0;
    let d = 0;
    for (; k + 3 < i; k += 4) {
      a += L[row + k] * x[k];
      b += L[row + k + 1] * x[k + 1];
      c += L[row + k + 2] * x[k + 2];
      d += L[row + k + 3] * x[k + 3];
    }
    for (; k < i; k++) a += L[row + k] * x[k];
    x[i] = (x[i] - (a + b + (c + d))) / L[row + i];
  }
}

/** x := L^-T x, row after row of L. */
export function applyInverseTransposed(L: Float64Array, x: Float64Array, profile: Int32Array): void {
  const n = x.length;
  for (let i = n - 1; i >= 0; i--) {
    const row = i * n;
    const value = x[i] / L[row + i];
    x[i] = value;
    for (let k = profile[i]; k < i; k++) x[k] -= L[row + k] * value;
  }
}

/** Turns a positive definite A (lower triangle) into its factor L; false, A spoilt, when it is none. For matrices so small
 *  that making arrays would cost more than the work. */
export function factorise(A: Float64Array, n: number): boolean {
  for (let i = 0; i < n; i++) {
    for (let j = 0; j <= i; j++) {
      let sum = A[i * n + j];
      for (let k = 0; k < j; k++) sum -= A[i * n + k] * A[j * n + k];
      if (j < i) {
        A[i * n + j] = sum / A[j * n + j];
      } else {
        if (!(sum > 0 && sum < Number.POSITIVE_INFINITY)) return false;
        A[i * n + i] = Math.sqrt(sum);
      }
    }
  }
  return true;
}

/** Returns x with L L^T x = b. Cost 2 n^2. */
export function solveCholesky(L: Float64Array, b: Float64Array): Float64Array {
  return solveLowerTransposed(L, solveLower(L, b));
}

/** Returns (L L^T)^-1, symmetric, n on a side. Cost n^3. */
export function invertCholesky(L: Float64Array, n: number): Float64Array {
  const inverse = new Float64Array(n * n);
  const unit = new Float64Array(n);
  for (let j = 0; j < n; j++) {
    unit.fill(0);
    unit[j] = 1;
    const column = solveCholesky(L, unit);
    for (let i = j; i < n; i++) {
      inverse[i * n + j] = column[i];
      inverse[j * n + i] = column[i];
    }
  }
  return inverse;
}

/** Returns the inverse of a symmetric positive definite matrix, or null when it is not one. Cost 4 n^3/3. */
export function invertSymmetric(A: Float64Array, n: number): Float64Array | null {
  const L = cholesky(A, n);
  return L && invertCholesky(L, n);
}

export interface LeastSquares {
  readonly solution: Float64Array;
  /** (A^T A)^-1, n on a side; times the variance of one measurement it is the covariance of the solution. */
  readonly inverse: Float64Array;
  /** |A x - b|^2 */
  readonly residualSquares: number;
}

/** Returns x that minimises |A x - b|^2, by Householder reflections of A with columns scaled to unit length, which loses
 *  half as many digits as the normal equations; null when A has no full column rank in double precision.
 *  @param A  m rows of n, m >= n. Cost 2 n^2 (m - n/3). */
export function leastSquares(A: Float64Array, b: Float64Array, n: number): LeastSquares | null {
  const m = b.length;
  requireSize('leastSquares', A.length, m * n);
  const scales = columnNorms(A, m, n);
  if (!scales.every((scale) => scale > 0)) return null;
  const Q = A.map((value, index) => value / scales[index % n]);
  const c = Float64Array.from(b);
  const diagonal = new Float64Array(n);
  for (let k = 0; k < n; k++) diagonal[k] = reflect(Q, c, m, n, k);
  // Columns have unit length: a pivot at the level of rounding means that the column depends on those before it.
  if (!diagonal.every((pivot) => Math.abs(pivot) > m * Number.EPSILON)) return null;
  const R = upperInverse(Q, diagonal, n);
  const solution = new Float64Array(n);
  const inverse = new Float64Array(n * n);
  for (let i = 0; i < n; i++) {
    for (let k = i; k < n; k++) solution[i] += (R[i * n + k] * c[k]) / scales[i];
    for (let j = 0; j < n; j++) {
      let sum = 0;
      for (let k = Math.max(i, j); k < n; k++) sum += R[i * n + k] * R[j * n + k];
      inverse[i * n + j] = sum / (scales[i] * scales[j]);
    }
  }
  let residualSquares = 0;
  for (let i = n; i < m; i++) residualSquares += c[i] * c[i];
  return { solution, inverse, residualSquares };
}

/** Applies the reflection that clears column k below the diagonal to the rest of Q and to c; returns the new diagonal. */
function reflect(Q: Float64Array, c: Float64Array, m: number, n: number, k: number): number {
  let norm = 0;
  for (let i = k; i < m; i++) norm += Q[i * n + k] * Q[i * n + k];
  norm = Math.sqrt(norm);
  if (norm === 0) return 0;
  const pivot = Q[k * n + k] > 0 ? -norm : norm;
  Q[k * n + k] -= pivot;
  const factor = -1 / (pivot * Q[k * n + k]);
  for (let j = k + 1; j < n; j++) {
    let sum = 0;
    for (let i = k; i < m; i++) sum += Q[i * n + k] * Q[i * n + j];
    for (let i = k; i < m; i++) Q[i * n + j] -= factor * sum * Q[i * n + k];
  }
  let sum = 0;
  for (let i = k; i < m; i++) sum += Q[i * n + k] * c[i];
  for (let i = k; i < m; i++) c[i] -= factor * sum * Q[i * n + k];
  return pivot;
}

/** Inverse of the upper triangle R, whose diagonal stands apart. */
function upperInverse(R: Float64Array, diagonal: Float64Array, n: number): Float64Array {
  const inverse = new Float64Array(n * n);
  for (let j = 0; j < n; j++) {
    inverse[j * n + j] = 1 / diagonal[j];
    for (let i = j - 1; i >= 0; i--) {
      let sum = 0;
      for (let k = i + 1; k <= j; k++) sum += R[i * n + k] * inverse[k * n + j];
      inverse[i * n + j] = -sum / diagonal[i];
    }
  }
  return inverse;
}

function columnNorms(A: Float64Array, m: number, n: number): Float64Array {
  const norms = new Float64Array(n);
  for (let i = 0; i < m; i++) {
    for (let j = 0; j < n; j++) norms[j] += A[i * n + j] * A[i * n + j];
  }
  return norms.map(Math.sqrt);
}

function requireSize(where: string, length: number, expected: number): void {
  if (length !== expected)
    throw new RangeError(`${where}: ${length} values where ${expected} make the matrix`);
}
