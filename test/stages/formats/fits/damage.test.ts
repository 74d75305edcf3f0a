/** Damaged and lying files: the right values or an InputProblem, never another exception, never a large allocation. */

import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { type ByteSource, sourceOf } from '../../../../stages/bytes.ts';
import { onesComplementSum } from '../../../../stages/formats/fits/checksum.ts';
import { readGroups } from '../../../../stages/formats/fits/groups.ts';
import { type Hdu, listHdus, openFits } from '../../../../stages/formats/fits/hdu.ts';
import { readImageHdu } from '../../../../stages/formats/fits/image.ts';
import { readTable } from '../../../../stages/formats/fits/table.ts';
import { readOifits } from '../../../../stages/formats/oifits.ts';
import { InputProblem } from '../../../../stages/problem.ts';
import { fixtureBytes, handmade, problemOf } from './fixtures.ts';

const names = [
  'images.fits',
  'table.fits',
  'groups.fits',
  'groups-scaled.fits',
  'double.oifits',
  'two-arrays.oifits',
];

/** Everything in a file as text, to compare. */
function contents(source: ByteSource, list = openFits): string {
  return JSON.stringify(list(source).map((hdu) => valuesOf(source, hdu)));
}

function valuesOf(source: ByteSource, hdu: Hdu): unknown {
  if (hdu.kind === 'groups') {
    const groups = readGroups(source, hdu);
    const block = groups.block(0, groups.count);
    return [groups.parameters.map((_, i) => [...block.parameter(i)]), [...block.data]];
  }
  if (hdu.kind === 'image') return hdu.shape.length === 0 ? [] : [...readImageHdu(source, hdu).all()];
  if (hdu.kind !== 'table') return [];
  const table = readTable(source, hdu);
  return table.names.map((name, i) => {
    const column = table.columnAt(i);
    if (/A/.test(column.form)) return [name, column.texts()];
    if (/[LX]/.test(column.form)) return [name, [...column.flags()]];
    if (/[PQ]/.test(column.form)) return [name, column.lists().map((list) => [...list])];
    if (/[CM]/.test(column.form)) return [name, [...column.complex().re]];
    return [name, [...column.numbers()]];
  });
}

/** Runs; lets InputProblems pass and returns undefined for them. */
function orProblem<T>(run: () => T): T | undefined {
  try {
    return run();
  } catch (error) {
    if (error instanceof InputProblem) return undefined;
    throw error;
  }
}

describe.each(names)('%s', (name) => {
  const bytes = fixtureBytes(name);
  const right = contents(sourceOf(bytes));

  test('cut anywhere gives an InputProblem, or the HDUs before the cut', () => {
    const starts = listHdus(sourceOf(bytes)).map(({ headerOffset }) => headerOffset);
    const cuts = Array.from({ length: bytes.length / 720 }, (_, i) => i * 720);
    for (const cut of [...cuts, bytes.length - 1]) {
      const values = orProblem(() => contents(sourceOf(bytes.slice(0, cut))));
      const whole = starts.includes(cut) && cut > 0;
      expect(values !== undefined, `cut at ${cut}`).toBe(whole);
      if (values !== undefined) expect(right.startsWith(values.slice(0, -1))).toBe(true);
    }
  });

  test('with one byte changed gives the right values or an InputProblem', () => {
    const change = fc.tuple(fc.nat(bytes.length - 1), fc.integer({ min: 1, max: 255 }));
    fc.assert(
      fc.property(change, ([at, flip]) => {
        const damaged = bytes.slice();
        damaged[at] = (damaged[at] as number) ^ flip;
        const values = orProblem(() => contents(sourceOf(damaged)));
        if (values !== undefined) expect(values).toBe(right);
      }),
      { numRuns: 300 },
    );
  });

  test('with any bytes changed and no checksums looked at throws nothing but InputProblems', () => {
    const changes = fc.array(fc.tuple(fc.nat(bytes.length - 1), fc.integer({ min: 0, max: 255 })), {
      maxLength: 8,
    });
    const inHeader = fc.array(fc.tuple(fc.nat(2879), fc.integer({ min: 32, max: 126 })), { maxLength: 4 });
    fc.assert(
      fc.property(changes, inHeader, (anywhere, header) => {
        const damaged = bytes.slice();
        for (const [at, value] of [...anywhere, ...header]) damaged[at] = value;
        orProblem(() => contents(sourceOf(damaged), listHdus));
      }),
      { numRuns: 200 },
    );
  });
});

test('OIFITS with one byte changed is read rightly or refused', () => {
  const bytes = fixtureBytes('double.oifits');
  const text = (source: ByteSource) => {
    const { vis, t3 } = readOifits(source);
    return JSON.stringify([vis[0]?.amplitude, vis[0]?.stations, t3[0]?.phaseDegrees, t3[0]?.flag]);
  };
  const right = text(sourceOf(bytes));
  const change = fc.tuple(fc.nat(bytes.length - 1), fc.integer({ min: 1, max: 255 }));
  fc.assert(
    fc.property(change, ([at, flip]) => {
      const damaged = bytes.slice();
      damaged[at] = (damaged[at] as number) ^ flip;
      const values = orProblem(() => text(sourceOf(damaged)));
      if (values !== undefined) expect(values).toBe(right);
    }),
    { numRuns: 300 },
  );
});

describe('lying headers', () => {
  const lie = (cards: string[]) =>
    problemOf(() => listHdus(sourceOf(handmade(['SIMPLE  = T', ...cards], new Uint8Array(100)))));

  test.each([
    [['BITPIX  = 8', 'NAXIS   = 1', 'NAXIS1  = 999999999999'], 'bad-size'],
    [['BITPIX  = 8', 'NAXIS   = 1', 'NAXIS1  = -1'], 'bad-value'],
    [['BITPIX  = 8', 'NAXIS   = 1', 'NAXIS1  = 1.5'], 'bad-value'],
    [['BITPIX  = 8', 'NAXIS   = 1', 'NAXIS1  = 1E300'], 'bad-value'],
    [['BITPIX  = 8', 'NAXIS   = 2', 'NAXIS1  = 5'], 'missing-keyword'],
    [['BITPIX  = 8', 'NAXIS   = 1000'], 'bad-value'],
    [['BITPIX  = 7', 'NAXIS   = 0'], 'bad-size'],
    [['NAXIS   = 0'], 'missing-keyword'],
    [['BITPIX  = 8', "NAXIS   = '2'"], 'bad-value'],
    [['BITPIX  = 64', 'NAXIS   = 3', ...[1, 2, 3].map((n) => `NAXIS${n}  = 9007199254740991`)], 'bad-size'],
    [
      [
        'BITPIX  = -32',
        'NAXIS   = 2',
        'NAXIS1  = 0',
        'NAXIS2  = 3',
        'GROUPS  = T',
        'PCOUNT  = 1',
        'GCOUNT  = 1E15',
      ],
      'bad-size',
    ],
  ])('%j give %s', (cards, code) => {
    expect(lie(cards).code).toBe(code);
  });

  test('say what was promised and what is there', () => {
    expect(lie(['BITPIX  = -64', 'NAXIS   = 1', 'NAXIS1  = 1000']).message).toBe(
      'input, header at byte 0: bad-size: expected 8640 bytes of data (8000 and the filling of the last block), as the ' +
        'header promises, got 2880 bytes from byte 2880 on. The file is cut short or its header is damaged: ' +
        'fetch it again.',
    );
  });

  test('are found when a single byte is missing', () => {
    for (const name of names) {
      expect(problemOf(() => listHdus(sourceOf(fixtureBytes(name).slice(0, -1)))).code).toBe('bad-size');
    }
  });

  test('are found before anything is read or allocated', () => {
    const bytes = handmade(['SIMPLE  = T', 'BITPIX  = 8', 'NAXIS   = 1', 'NAXIS1  = 5000000000']);
    let largest = 0;
    const source: ByteSource = {
      name: 'input',
      size: bytes.length,
      read(offset, length) {
        largest = Math.max(largest, length);
        return bytes.subarray(offset, offset + length);
      },
    };
    expect(problemOf(() => listHdus(source)).code).toBe('bad-size');
    expect(largest).toBe(2880);
  });
});

describe('what is no FITS file', () => {
  test.each([
    ['nothing', '', 'bad-header'],
    ['a text', 'u,v,re,im\n'.repeat(1000), 'bad-header'],
    ['a picture', '\x89PNG\r\n\x1a\n'.repeat(1000), 'bad-header'],
    ['SIMPLE = F', `SIMPLE  = F${' '.repeat(69)}END`.padEnd(2880), 'not-fits'],
  ])('%s is refused', (_, text, code) => {
    expect(problemOf(() => listHdus(sourceOf(new Uint8Array(Buffer.from(text, 'latin1'))))).code).toBe(code);
  });

  test('something appended is refused, zeros are not', () => {
    const bytes = fixtureBytes('minimal.fits');
    const withTail = (tail: Uint8Array) => sourceOf(new Uint8Array(Buffer.concat([bytes, tail])));
    expect(listHdus(withTail(new Uint8Array(100)))).toHaveLength(1);
    expect(problemOf(() => listHdus(withTail(new Uint8Array(100).fill(7)))).message).toBe(
      'input, byte 2880: not-fits: expected a further extension (XTENSION) or nothing but zeros, got byte 0x7 after the ' +
        'last HDU. The file is cut short or something was appended to it: fetch it again.',
    );
  });
});

describe('checksums', () => {
  test('fail for every single changed byte of the data', () => {
    const bytes = fixtureBytes('groups-scaled.fits');
    const [hdu] = listHdus(sourceOf(bytes));
    for (let at = hdu?.dataOffset as number; at < bytes.length; at += 13) {
      const damaged = bytes.slice();
      damaged[at] = (damaged[at] as number) ^ 0x10;
      expect(problemOf(() => openFits(sourceOf(damaged))).code).toBe('checksum');
    }
  });

  test('tell the header from the data', () => {
    const bytes = fixtureBytes('groups.fits');
    const header = bytes.slice();
    header.set(Buffer.from('OTHER'), Buffer.from(bytes).indexOf('TESTSRC'));
    expect(problemOf(() => openFits(sourceOf(header))).message).toMatch(
      /^input, HDU 1, bytes from 0 on: checksum: expected header and data that sum to 4294967295 with CHECKSUM, got/,
    );
    const data = bytes.slice();
    data[6000] = 1;
    expect(problemOf(() => openFits(sourceOf(data))).expected).toBe('data whose sum is DATASUM 3717516106');
  });

  // Direct: the sum word by word, as Appendix J defines it, against the sum in pieces.
  test('of pieces of any length equal the sum word by word', () => {
    const pieces = fc.array(fc.uint8Array({ maxLength: 40 }), { maxLength: 10 });
    fc.assert(
      fc.property(pieces, (parts) => {
        const all = Buffer.concat(parts);
        const filled = Buffer.concat([all, Buffer.alloc((4 - (all.length % 4)) % 4)]);
        let direct = 0n;
        for (let at = 0; at < filled.length; at += 4) {
          direct += BigInt(filled.readUInt32BE(at));
          if (direct > 0xffffffffn) direct -= 0xffffffffn;
        }
        let sum = 0;
        let before = 0;
        for (const part of parts) {
          sum = onesComplementSum(part, sum, before);
          before += part.length;
        }
        expect(sum).toBe(Number(direct));
      }),
    );
  });
});
