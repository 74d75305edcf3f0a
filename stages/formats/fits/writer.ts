/** Writing one HDU: header, data in pieces, zeros up to the block, and then CHECKSUM and DATASUM patched into the
 *  header. No date is written, so equal content gives equal bytes. */

import type { ByteSink } from '../../bytes.ts';
import { InternalError } from '../../problem.ts';
import { cardLength, formatCard } from './cards.ts';
import { encodeChecksum, onesComplementSum } from './checksum.ts';
import { blockLength, formatHeader, makeHeader, type NewCard } from './header.ts';

export interface HduWriter {
  /** Appends data, as they shall lie in the file. */
  write(bytes: Uint8Array): void;
  /** Fills the block and patches the sums. @throws InternalError when more or less than promised was written. */
  end(): void;
}

/** Starts an HDU at the end of the sink.
 *  @param dataBytes  what will be written before `end`, without the filling of zeros */
export function startHdu(sink: ByteSink, cards: readonly NewCard[], dataBytes: number): HduWriter {
  const start = sink.size;
  // Readers older than FITS 4.0 want LONGSTRN where strings go on over CONTINUE.
  const long = cards.some(([keyword, value]) => formatCard(keyword, value)[1]?.startsWith('CONTINUE'));
  const convention: NewCard[] = long ? [['LONGSTRN', 'OGIP 1.0']] : [];
  const all: NewCard[] = [...cards, ...convention, ['CHECKSUM', '0'.repeat(16)], ['DATASUM', '0']];
  const header = formatHeader(makeHeader(all));
  sink.write(header);
  let sum = 0;
  let written = 0;
  const write = (bytes: Uint8Array) => {
    sum = onesComplementSum(bytes, sum, written);
    written += bytes.length;
    sink.write(bytes);
  };
  return {
    write,
    end() {
      if (written !== dataBytes)
        throw new InternalError('startHdu', `${written} of ${dataBytes} bytes written`);
      write(new Uint8Array((blockLength - (written % blockLength)) % blockLength));
      patchSums(sink, start, header, sum);
    },
  };
}

function patchSums(sink: ByteSink, start: number, header: Uint8Array, dataSum: number): void {
  const end = Buffer.from(header.buffer, header.byteOffset, header.length).lastIndexOf(
    'END'.padEnd(cardLength),
  );
  const datasumAt = end - cardLength;
  const checksumAt = end - 2 * cardLength;
  putCard(header, datasumAt, formatCard('DATASUM', String(dataSum)));
  const sum = onesComplementSum(header, dataSum);
  putCard(header, checksumAt, formatCard('CHECKSUM', encodeChecksum(sum)));
  sink.patch(start + checksumAt, header.subarray(checksumAt, end));
}

function putCard(header: Uint8Array, at: number, [text = '']: readonly string[]): void {
  for (let i = 0; i < cardLength; i++) header[at + i] = text.charCodeAt(i);
}
