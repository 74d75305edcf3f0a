/** Where stages read from and write to. Positioned, synchronous, and blind to paths; tests pass arrays. */

import { InputProblem } from './problem.ts';

export interface ByteSource {
  /** How a message names this input: the input's name in the recipe, never a path. */
  readonly name: string;
  readonly size: number;
  /** Exactly `length` bytes from `offset`. @throws InputProblem when the source ends before. */
  read(offset: number, length: number): Uint8Array;
}

export interface ByteSink {
  /** Appends. */
  write(bytes: Uint8Array): void;
  /** Overwrites bytes already written, such as a checksum in a header that is known only after the data. */
  patch(offset: number, bytes: Uint8Array): void;
  /** Bytes written so far. */
  readonly size: number;
}

/** A source over bytes in memory. */
export function sourceOf(bytes: Uint8Array, name = 'input'): ByteSource {
  return {
    name,
    size: bytes.length,
    read(offset, length) {
      if (!(offset >= 0 && length >= 0 && offset + length <= bytes.length)) {
        throw endOfInput(name, offset, length, bytes.length);
      }
      return bytes.subarray(offset, offset + length);
    },
  };
}

/** A sink into memory; `bytes()` returns what was written. */
export function memorySink(): ByteSink & { bytes(): Uint8Array } {
  let buffer = new Uint8Array(1 << 16);
  let size = 0;
  return {
    get size() {
      return size;
    },
    write(bytes) {
      if (size + bytes.length > buffer.length) {
        const larger = new Uint8Array(Math.max(buffer.length * 2, size + bytes.length));
        larger.set(buffer.subarray(0, size));
        buffer = larger;
      }
      buffer.set(bytes, size);
      size += bytes.length;
    },
    patch(offset, bytes) {
      if (!(offset >= 0 && offset + bytes.length <= size))
        throw new RangeError('patch beyond what was written');
      buffer.set(bytes, offset);
    },
    bytes: () => buffer.subarray(0, size),
  };
}

/** All bytes of a source at once. */
export function readAll(source: ByteSource): Uint8Array {
  return source.read(0, source.size);
}

/** The problem of a read beyond the end of a source. */
export function endOfInput(name: string, offset: number, length: number, size: number): InputProblem {
  return new InputProblem({
    code: 'truncated',
    place: `${name}, byte ${offset}`,
    expected: `${length} bytes`,
    found: `the end of the file at byte ${size}`,
    advice: 'The file is cut short or its header promises more than it holds: fetch it again.',
  });
}
