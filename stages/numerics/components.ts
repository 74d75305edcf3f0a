/** Principal components of rows that come one after the other: mean and covariance in one pass with memory for one
 *  block of rows, then the eigenvectors of the covariance.
 *
 *    C = 1/(n-1) sum_r (x_r - m)(x_r - m)',   C e_k = lambda_k e_k,   lambda falling
 *
 *  (Jolliffe, Principal Component Analysis, 2nd ed., ch. 1 and 3). Sums are taken about the first row, which keeps the
 *  digits that sums about zero would lose (Chan, Golub and LeVeque 1983, Am. Stat. 37, 242), and in the order
 *  of the rows: the size of the block does not change a bit. The eigenvectors come from ml-pca, whose path for a
 *  covariance matrix (Householder tridiagonalisation and implicit QL, from EISPACK's tred2 and tql2) uses no function
 *  of Math but sqrt, abs and max. */

import { Matrix } from 'ml-matrix';
import { PCA } from 'ml-pca';

export interface Moments {
  /** Number of rows. */
  readonly count: number;
  readonly mean: Float64Array;
  /** covariance[i*d + j], divisor n-1. */
  readonly covariance: Float64Array;
}

/** Takes rows in and gives their moments at the end. */
export interface MomentSum {
  add(row: Float64Array): void;
  /** @throws RangeError with fewer than two rows */
  finish(): Moments;
}

/** Rows are gathered in blocks of this size, small enough to stay in cache; any size gives the same bits. */
const BLOCK_ROWS = 32;

/** Values are summed in tiles of this many by half as many; d is filled up to a multiple with zeros. */
const TILE = 4;

/** Makes an empty sum for rows of d values. Memory d*d + blockRows*d; cost of a row d*d/2 multiply-adds. NaN in gives
 *  NaN out. */
export function makeMomentSum(d: number, blockRows = BLOCK_ROWS): MomentSum {
  const padded = Math.ceil(d / TILE) * TILE;
  const first = new Float64Array(d);
  const sums = new Float64Array(d);
  // products[i*padded + j], j <= i; what lies above the diagonal is not used.
  const products = new Float64Array(padded * padded);
  // block[i*blockRows + r]: the rows of a block for one value lie side by side.
  const block = new Float64Array(padded * blockRows);
  let count = 0;
  let held = 0;
  return {
    add(row) {
      if (row.length !== d) throw new RangeError(`a row of ${row.length} values among rows of ${d}`);
      if (count === 0) first.set(row);
      for (let i = 0; i < d; i++) {
        const value = (row[i] as number) - (first[i] as number);
        block[i * blockRows + held] = value;
        sums[i] = (sums[i] as number) + value;
      }
      count++;
      held++;
      if (held === blockRows) {
        addProducts(products, block, padded, blockRows, held);
        held = 0;
      }
    },
    finish() {
      if (!(count >= 2)) throw new RangeError(`a covariance of ${count} rows`);
      addProducts(products, block, padded, blockRows, held);
      held = 0;
      return { count, ...meanAndCovariance(first, sums, products, padded, count) };
    },
  };
}

/** Adds the products of pairs of values of a block, row after row. A tile of two by four has eight running sums: an
 *  addition need not wait for the one before it, and each value that is read serves several. */
function addProducts(
  products: Float64Array,
  block: Float64Array,
  d: number,
  stride: number,
  rows: number,
): void {
  for (let i = 0; i < d; i += 2) {
    for (let j = 0; j <= i + 1; j += TILE) addTile(products, block, d, stride, rows, i, j);
  }
}

function addTile(
  products: Float64Array,
  block: Float64Array,
  d: number,
  stride: number,
  rows: number,
  i: number,
  j: number,
): void {
  const upper = i * d + j;
  const lower = upper + d;
  let p0 = products[upper] as number;
  let p1 = products[upper + 1] as number;
  let p2 = products[upper + 2] as number;
  let p3 = products[upper + 3] as number;
  let q0 = products[lower] as number;
  let q1 = products[lower + 1] as number;
  let q2 = products[lower + 2] as number;
  let q3 = products[lower + 3] as number;
  for (let r = 0, a = i * stride, b = j * stride; r < rows; r++, a++, b++) {
    const x = block[a] as number;
    const y = block[a + stride] as number;
    const b0 = block[b] as number;
    const b1 = block[b + stride] as number;
    const b2 = block[b + 2 * stride] as number;
    const b3 = block[b + 3 * stride] as number;
    p0 += x * b0;
    p1 += x * b1;
    p2 += x * b2;
    p3 += x * b3;
    q0 += y * b0;
    q1 += y * b1;
    q2 += y * b2;
    q3 += y * b3;
  }
  products[upper] = p0;
  products[upper + 1] = p1;
  products[upper + 2] = p2;
  products[upper + 3] = p3;
  products[lower] = q0;
  products[lower + 1] = q1;
  products[lower + 2] = q2;
  products[lower + 3] = q3;
}

function meanAndCovariance(
  first: Float64Array,
  sums: Float64Array,
  products: Float64Array,
  stride: number,
  count: number,
): { mean: Float64Array; covariance: Float64Array } {
  const d = first.length;
  const shift = sums.map((sum) => sum / count);
  const covariance = new Float64Array(d * d);
  for (let i = 0; i < d; i++) {
    for (let j = 0; j <= i; j++) {
      const about = count * (shift[i] as number) * (shift[j] as number);
      const value = ((products[i * stride + j] as number) - about) / (count - 1);
      covariance[i * d + j] = value;
      covariance[j * d + i] = value;
    }
  }
  return { mean: first.map((value, i) => value + (shift[i] as number)), covariance };
}

export interface Components {
  /** Variance along each component, falling; values that rounding made negative are 0. */
  readonly eigenvalues: Float64Array;
  /** vectors[k], length d, orthonormal. Their signs are whatever the decomposition gave: see orientation. */
  readonly vectors: readonly Float64Array[];
  /** The trace of the covariance. */
  readonly totalVariance: number;
}

/** The leading principal components of a covariance.
 *  @param count  how many, 1 to d. Cost: that of all, about 10 d^3 (one to two seconds for d = 720). */
export function principalComponents({ covariance, mean }: Moments, count: number): Components {
  const d = mean.length;
  if (!(count >= 1 && count <= d)) throw new RangeError(`${count} components of ${d} values`);
  const pca = new PCA(Matrix.from1DArray(d, d, covariance), { isCovarianceMatrix: true });
  const vectors = pca.getEigenvectors();
  let totalVariance = 0;
  for (let i = 0; i < d; i++) totalVariance += covariance[i * d + i] as number;
  return {
    eigenvalues: Float64Array.from(pca.getEigenvalues().slice(0, count), (value) => Math.max(value, 0)),
    vectors: Array.from({ length: count }, (_, k) => Float64Array.from(vectors.getColumn(k))),
    totalVariance,
  };
}

/** Magnitudes closer than this, relative, count as equal when a sign is chosen, so that rounding does not choose. */
const EQUAL_MAGNITUDES = 1e-9;

/** The sign, 1 or -1, that makes the vector's largest value by magnitude positive; the first of equal ones decides. */
export function orientation(vector: Float64Array): 1 | -1 {
  let largest = 0;
  for (let i = 0; i < vector.length; i++) largest = Math.max(largest, Math.abs(vector[i] as number));
  const deciding = vector.find((value) => Math.abs(value) >= largest * (1 - EQUAL_MAGNITUDES)) ?? 0;
  return deciding < 0 ? -1 : 1;
}
