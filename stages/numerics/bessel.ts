/** Bessel functions that give the same bits on every platform, from @stdlib (plain JavaScript). */

export { default as besselJ0 } from '@stdlib/math-base-special-besselj0';
export { default as besselJ1 } from '@stdlib/math-base-special-besselj1';
