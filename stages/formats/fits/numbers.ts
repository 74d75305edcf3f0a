/** Big-endian arrays of the FITS number types, to and from Float64Array.
 *  Source: FITS Standard 4.0, sections 5.2 and 5.3. */

import { InputProblem, InternalError } from '../../problem.ts';

/** uint8, int16, int32, int64, float32, float64 by their BITPIX (section 4.4.1.1, table 8). */
export type Bitpix = 8 | 16 | 32 | 64 | -32 | -64;

export interface Scaling {
  readonly scale: number;
  readonly zero: number;
  /** Stored integer that means "undefined" and is read as NaN. */
  readonly blank?: bigint | undefined;
}

export const unscaled: Scaling = { scale: 1, zero: 0 };

const littleEndian = new Uint8Array(new Uint16Array([1]).buffer)[0] === 1;
const two53 = 0x20_0000_0000_0000n;
const two63 = 0x8000_0000_0000_0000n;

export function isBitpix(value: number): value is Bitpix {
  return value === 8 || value === 16 || value === 32 || value === 64 || value === -32 || value === -64;
}

export function bytesOf(bitpix: Bitpix): number {
  return Math.abs(bitpix) / 8;
}

/** Physical values zero + scale * stored. Integers of 64 bits must fit in 53 (after a `zero` of 2^63, by which
 *  unsigned integers are stored): nothing is rounded silently.
 *  @param place  for the message
 *  @throws InputProblem for a larger integer
 *  Cost: about 2 ns per number. */
export function decodeNumbers(
  bytes: Uint8Array,
  bitpix: Bitpix,
  scaling: Scaling,
  place: string,
): Float64Array {
  if (bitpix === 64) return decodeLong(bytes, scaling, place);
  const stored = storedNumbers(bytes, bitpix);
  const { scale, zero } = scaling;
  const values =
    stored instanceof Float64Array ? stored : new Float64Array(stored as ArrayLike<number> as Float32Array);
  const blank = scaling.blank === undefined || bitpix < 0 ? Number.NaN : Number(scaling.blank);
  if (scale === 1 && zero === 0 && Number.isNaN(blank)) return values;
  for (let i = 0; i < values.length; i++) {
    const value = values[i] as number;
    values[i] = value === blank ? Number.NaN : zero + scale * value;
  }
  return values;
}

function storedNumbers(bytes: Uint8Array, bitpix: Exclude<Bitpix, 64>) {
  if (bitpix === 8) return bytes;
  const buffer = toHost(new Uint8Array(bytes), bytesOf(bitpix));
  if (bitpix === 16) return new Int16Array(buffer);
  if (bitpix === 32) return new Int32Array(buffer);
  return bitpix === -32 ? new Float32Array(buffer) : new Float64Array(buffer);
}

function decodeLong(bytes: Uint8Array, { scale, zero, blank }: Scaling, place: string): Float64Array {
  const stored = new BigInt64Array(toHost(new Uint8Array(bytes), 8));
  const unsigned = zero === Number(two63) && scale === 1;
  return Float64Array.from(stored, (raw, i) => {
    if (raw === blank) return Number.NaN;
    const value = unsigned ? raw + two63 : raw;
    if (value > two53 || value < -two53) throw tooLarge(place, value, i);
    return unsigned ? Number(value) : zero + scale * Number(value);
  });
}

function tooLarge(place: string, value: bigint, index: number): InputProblem {
  return new InputProblem({
    code: 'too-large',
    place: `${place}, value ${index + 1}`,
    expected: 'an integer of at most 53 bits, which a double holds exactly',
    found: `${value}`,
    advice: 'Store the values as smaller integers or as floating-point numbers.',
  });
}

/** Big-endian bytes of the values; integers must be whole and in range.
 *  @throws InternalError for a value that the type cannot hold. Cost: about 2 ns per number. */
export function encodeNumbers(values: ArrayLike<number>, bitpix: Bitpix): Uint8Array<ArrayBuffer> {
  const stored = storedFrom(values, bitpix);
  if (bitpix > 0) {
    for (let i = 0; i < values.length; i++) {
      if (Number(stored[i]) !== values[i]) {
        throw new InternalError('encodeNumbers', `${values[i]} is no integer of ${bitpix} bits`);
      }
    }
  }
  return new Uint8Array(toHost(new Uint8Array(stored.buffer), bytesOf(bitpix)));
}

function storedFrom(values: ArrayLike<number>, bitpix: Bitpix) {
  if (bitpix === 64) {
    return BigInt64Array.from(Array.from(values, (value) => BigInt(Number.isInteger(value) ? value : 0)));
  }
  if (bitpix === 8) return new Uint8Array(values);
  if (bitpix === 16) return new Int16Array(values);
  if (bitpix === 32) return new Int32Array(values);
  return bitpix === -32 ? new Float32Array(values) : new Float64Array(values);
}

/** Turns big-endian words into the host's, or back, in place. The array must own its whole buffer. */
export function toHost(bytes: Uint8Array<ArrayBuffer>, width: number): ArrayBuffer {
  const whole = Buffer.from(bytes.buffer, bytes.byteOffset, bytes.length);
  if (littleEndian && width === 2) whole.swap16();
  if (littleEndian && width === 4) whole.swap32();
  if (littleEndian && width === 8) whole.swap64();
  return bytes.buffer;
}
