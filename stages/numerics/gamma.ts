/** The gamma function and its relatives, the same bits on every platform, from @stdlib (plain JavaScript). To load them takes
 *  a process a tenth of a second: only what needs them imports this file. */

/** Regularised lower incomplete gamma function P(s, x), called as gammaIncomplete(x, s). */
export { default as gammaIncomplete } from '@stdlib/math-base-special-gammainc';
/** x with P(s, x) = p, called as gammaIncompleteInverse(p, s). */
export { default as gammaIncompleteInverse } from '@stdlib/math-base-special-gammaincinv';
export { default as lnGamma } from '@stdlib/math-base-special-gammaln';
