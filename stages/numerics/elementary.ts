/** Elementary functions that give the same bits on every platform. From @stdlib (plain JavaScript); the runtime's own
 *  differ between processors. sqrt, abs, floor and the like are exactly specified and may be used from Math. */

export { default as acos } from '@stdlib/math-base-special-acos';
export { default as asin } from '@stdlib/math-base-special-asin';
export { default as atan } from '@stdlib/math-base-special-atan';
export { default as atan2 } from '@stdlib/math-base-special-atan2';
export { default as cos } from '@stdlib/math-base-special-cos';
export { default as exp } from '@stdlib/math-base-special-exp';
export { default as expm1 } from '@stdlib/math-base-special-expm1';
export { default as ln } from '@stdlib/math-base-special-ln';
export { default as log1p } from '@stdlib/math-base-special-log1p';
export { default as log10 } from '@stdlib/math-base-special-log10';
export { default as pow } from '@stdlib/math-base-special-pow';
export { default as sin } from '@stdlib/math-base-special-sin';
export { default as tan } from '@stdlib/math-base-special-tan';
