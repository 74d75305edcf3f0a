/** Special functions that give the same bits on every platform, from @stdlib (plain JavaScript). */

export { default as besselJ0 } from '@stdlib/math-base-special-besselj0';
export { default as besselJ1 } from '@stdlib/math-base-special-besselj1';
export { default as erf } from '@stdlib/math-base-special-erf';
export { default as erfc } from '@stdlib/math-base-special-erfc';
export { default as erfcInverse } from '@stdlib/math-base-special-erfcinv';
export { default as erfInverse } from '@stdlib/math-base-special-erfinv';
/** Regularised lower incomplete gamma function P(s, x), called as gammaIncomplete(x, s). */
export { default as gammaIncomplete } from '@stdlib/math-base-special-gammainc';
/** x with P(s, x) = p, called as gammaIncompleteInverse(p, s). */
export { default as gammaIncompleteInverse } from '@stdlib/math-base-special-gammaincinv';
export { default as lnGamma } from '@stdlib/math-base-special-gammaln';
