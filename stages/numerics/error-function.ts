/** The complement of the error function and its inverse, the same bits on every platform, from @stdlib (plain JavaScript). */

export { default as erfc } from '@stdlib/math-base-special-erfc';
export { default as erfcInverse } from '@stdlib/math-base-special-erfcinv';
