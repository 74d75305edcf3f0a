/** Byte sources and sinks over files, for the process in which a stage runs. */

import { closeSync, fstatSync, openSync, readSync, writeSync } from 'node:fs';
import { type ByteSink, type ByteSource, endOfInput } from '../stages/bytes.ts';

/** Bytes gathered before a write. */
const bufferBytes = 1 << 20;

/** A source over an open file; a read allocates its result. */
export function fileSource(path: string, name: string): ByteSource {
  const descriptor = openSync(path, 'r');
  const size = fstatSync(descriptor).size;
  return {
    name,
    size,
    read(offset, length) {
      if (!(offset >= 0 && length >= 0 && offset + length <= size)) {
        throw endOfInput(name, offset, length, size);
      }
      const bytes = new Uint8Array(length);
      for (let done = 0; done < length; ) {
        const count = readSync(descriptor, bytes, done, length - done, offset + done);
        if (count === 0) throw endOfInput(name, offset, length, offset + done);
        done += count;
      }
      return bytes;
    },
  };
}

/** A sink into a new file. `close` writes what is gathered and returns the size. */
export function fileSink(path: string): ByteSink & { close(): number } {
  const descriptor = openSync(path, 'wx');
  const buffer = new Uint8Array(bufferBytes);
  let gathered = 0;
  let written = 0;
  const flush = () => {
    writeWhole(descriptor, buffer.subarray(0, gathered), written);
    written += gathered;
    gathered = 0;
  };
  return {
    get size() {
      return written + gathered;
    },
    write(bytes) {
      if (gathered + bytes.length > bufferBytes) flush();
      if (bytes.length > bufferBytes) {
        writeWhole(descriptor, bytes, written);
        written += bytes.length;
      } else {
        buffer.set(bytes, gathered);
        gathered += bytes.length;
      }
    },
    patch(offset, bytes) {
      if (!(offset >= 0 && offset + bytes.length <= written + gathered)) {
        throw new RangeError('patch beyond what was written');
      }
      flush();
      writeWhole(descriptor, bytes, offset);
    },
    close() {
      flush();
      closeSync(descriptor);
      return written;
    },
  };
}

function writeWhole(descriptor: number, bytes: Uint8Array, position: number): void {
  for (let done = 0; done < bytes.length; ) {
    done += writeSync(descriptor, bytes, done, bytes.length - done, position + done);
  }
}
