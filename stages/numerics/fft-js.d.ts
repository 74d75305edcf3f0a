/** What we use of fft.js, which carries no types. Arrays are interleaved: re, im, re, im … */
declare module 'fft.js' {
  export default class FFT {
    /** @param size  a power of two, 2 or more */
    constructor(size: number);
    /** cos and -sin of pi i / size at i and i + 1, i even; length 2*size. */
    table: number[] | Float64Array;
    transform(out: Float64Array, data: Float64Array): void;
  }
}
