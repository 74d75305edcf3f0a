/** Damaged and lying files of every format that a stage reads: what was written or an InputProblem; never another exception,
 *  more memory than the file justifies, or reading without end. FITS itself: fits/damage.test.ts; what `ingest` makes of
 *  damage: ../ingest/ingest-damage.test.ts. With PLATEBOOK_EVERY_BYTE (`npm run long`) large files are cut at every card, too. */

import fc from 'fast-check';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { type ByteSource, sourceOf } from '../../../stages/bytes.ts';
import { readBasis } from '../../../stages/formats/basis.ts';
import { listHdus, openFits } from '../../../stages/formats/fits/hdu.ts';
import { readTable } from '../../../stages/formats/fits/table.ts';
import { readJson, readNumbers } from '../../../stages/formats/json.ts';
import { readOifits } from '../../../stages/formats/oifits.ts';
import { requireValidOifits } from '../../../stages/formats/oifits-strict.ts';
import { readPosterior, readVariants, writePosterior } from '../../../stages/formats/posterior.ts';
import { readSkyCube, readSkyImage } from '../../../stages/formats/sky-image.ts';
import { readUvGroups } from '../../../stages/formats/uv-groups.ts';
import { readVisibilities } from '../../../stages/formats/visibilities.ts';
import { readVisibilityTable } from '../../../stages/formats/visibility-table.ts';
import { InputProblem } from '../../../stages/problem.ts';
import { rows, times, uvFile } from '../uv-synthetic.ts';
import { fixtureBytes, handmade, problemOf, written } from './fits/fixtures.ts';
import { sourceOfFile, validFile } from './oifits-files.ts';
import { ourFiles, posterior } from './our-files.ts';

const CARD = 80;
const BLOCK = 2880;

/** Values of a reader as text, to compare. */
function textOf(value: unknown): string {
  return JSON.stringify(value, (_, each: unknown) =>
    each instanceof Map
      ? [...each]
      : ArrayBuffer.isView(each)
        ? Array.from(each as Float64Array, String)
        : each,
  );
}

function uvOf(source: ByteSource): unknown {
  const uv = readUvGroups(source);
  return [uv, uv.block(0, uv.count)];
}

function oifitsOf(source: ByteSource): unknown {
  requireValidOifits(source);
  const { targets, arrays, vis, vis2, t3, flux } = readOifits(source);
  return [targets, arrays, ...[...vis, ...vis2, ...t3, ...flux].map(({ table: _, ...data }) => data)];
}

function cubeOf(source: ByteSource): unknown {
  const cube = readSkyCube(source);
  return Array.from({ length: cube.count }, (_, k) => cube.plane(k));
}

/** All columns of all tables, lists in the heap included. */
function tablesOf(source: ByteSource): unknown {
  return listHdus(source).flatMap((hdu) => {
    if (hdu.kind !== 'table') return [];
    const table = readTable(source, hdu);
    return table.names.map((_, n) => {
      const column = table.columnAt(n);
      const form = column.form.replace(/^\s*\d*/, '');
      if (/^A|^[PQ]A/.test(form)) return column.texts();
      if (/^[LX]/.test(form)) return column.flags();
      if (/^[PQ]/.test(form)) return column.lists();
      return /^[CM]/.test(form) ? column.complex() : column.numbers();
    });
  });
}

const variants = written((sink) =>
  writePosterior(sink, posterior, { variants: [{ role: 'gains fixed', posterior }] }),
);
const valid = sourceOfFile(validFile());
const formats: readonly [string, Uint8Array, (source: ByteSource) => unknown][] = [
  ['fits-image', ourFiles['image.fits'](), readSkyImage],
  ['fits-cube', ourFiles['cube.fits'](), cubeOf],
  ['basis', ourFiles['basis.fits'](), readBasis],
  [
    'fits-table of draws',
    variants.read(0, variants.size),
    (source) => [readPosterior(source), readVariants(source)],
  ],
  ['visibilities', ourFiles['visibilities.fits'](), readVisibilities],
  ['visibilities, optical', ourFiles['optical.fits'](), readVisibilities],
  ['oifits', valid.read(0, valid.size), oifitsOf],
  ['uv-fits', uvFile(rows({ days: times(1, 2) }), { bands: [0] }), uvOf],
  ['tables of every form', fixtureBytes('table.fits'), tablesOf],
];

/** A source that counts what is read. */
function metered(bytes: Uint8Array): ByteSource & { readonly total: () => number } {
  const source = sourceOf(bytes);
  let total = 0;
  return {
    name: 'input',
    size: bytes.length,
    total: () => total,
    read(offset, length) {
      // A read of nothing costs as well.
      total += length + 1;
      return source.read(offset, length);
    },
  };
}

const KINDS = ['Uint8Array', 'Int16Array', 'Int32Array', 'Float32Array', 'Float64Array'] as const;
const originals = new Map<string, unknown>();
let allocated = 0;

/** Every array of numbers that is made counts, whoever makes it. */
beforeAll(() => {
  const world = globalThis as unknown as Record<string, new (...parts: unknown[]) => ArrayBufferView>;
  for (const kind of KINDS) {
    const original = world[kind];
    originals.set(kind, original);
    world[kind] = new Proxy(original, {
      construct(target, parts, asked) {
        const made = Reflect.construct(target, parts, asked) as ArrayBufferView;
        if (!(parts[0] instanceof ArrayBuffer)) allocated += made.byteLength;
        return made;
      },
    });
  }
});

afterAll(() => {
  for (const [kind, original] of originals)
    (globalThis as unknown as Record<string, unknown>)[kind] = original;
});

/** Times that the whole file may be read; a reader that goes over a file for each column reads blocks of rows. */
const MOST_READ = 100;
/** Bytes of memory for each byte of the file: a byte becomes a double, and a few copies of it. */
const MOST_MEMORY = 100;

/** What a reader makes of bytes as text, or undefined for an InputProblem. Fails when it takes more than they justify. */
function outcome(bytes: Uint8Array, read: (source: ByteSource) => unknown): string | undefined {
  const source = metered(bytes);
  allocated = 0;
  try {
    return textOf(read(source));
  } catch (error) {
    if (error instanceof InputProblem) return undefined;
    throw error;
  } finally {
    expect(source.total()).toBeLessThan(MOST_READ * (bytes.length + BLOCK));
    expect(allocated).toBeLessThan(MOST_MEMORY * (bytes.length + BLOCK));
  }
}

/** The same with sums whose names mean nothing, so that damage gets past them. */
function withoutSums(bytes: Uint8Array): Uint8Array {
  const text = Buffer.from(bytes).toString('latin1');
  return new Uint8Array(
    Buffer.from(text.replaceAll('CHECKSUM=', 'UNCHECKS=').replaceAll('DATASUM =', 'UNDATASU='), 'latin1'),
  );
}

/** What a header may say of a size, and never should. */
const LIES = [
  ...['0', '1', '2', '3', '-1', '1.5', '255', '2147483647', '2147483648', '4294967297', '9007199254740991'],
  ...['9007199254740993', '1E300', 'T', '', "'x'"],
];
const FORM_LIES = [
  ...['0D', '1D', '3E', '2147483647D', '9007199254740991D', '1125899906842624M', '99999999999999999999D'],
  ...['1PD(1)', '1QJ(9)', '2PD', '1X', '9007199254740991X', '16A', '2147483647A', '1L', 'D', 'Z', ''],
];
const SIZES =
  /^(BITPIX|NAXIS\d*|PCOUNT|GCOUNT|TFIELDS|THEAP|GROUPS|NCOMP|NDATA|OI_REVN|TSCAL\d+|PSCAL\d+|CRPIX\d|CDELT\d|BLANK|TNULL\d+) *$/;

describe.each(formats)('%s', (_, bytes, read) => {
  const right = textOf(read(sourceOf(bytes)));
  const plain = withoutSums(bytes);
  const starts = listHdus(sourceOf(bytes)).map(({ headerOffset }) => headerOffset);

  test('cut at every block, card and at any byte is refused, or is the tables before the cut', () => {
    const cards = Array.from({ length: bytes.length / CARD }, (_, k) => k * CARD);
    const step = process.env.PLATEBOOK_EVERY_BYTE ? 1 : Math.max(1, Math.ceil(cards.length / 300));
    const cuts = new Set([
      ...cards.filter((at, k) => k % step === 0 || at % BLOCK === 0),
      ...starts.flatMap((at) => [at - 1, at, at + 1]).filter((at) => at >= 0),
      bytes.length - 1,
    ]);
    for (const cut of cuts) {
      const found = outcome(bytes.slice(0, cut), read);
      if (found === undefined) continue;
      // Nothing in FITS tells how many tables a file had: a cut between two is none.
      expect(starts, `cut at ${cut}`).toContain(cut);
      expect(right.length).toBeGreaterThanOrEqual(found.length);
    }
  });

  test('with one byte changed is what it was, or is refused', () => {
    const change = fc.tuple(fc.nat(bytes.length - 1), fc.integer({ min: 1, max: 255 }));
    fc.assert(
      fc.property(change, ([at, flip]) => {
        const damaged = bytes.slice();
        damaged[at] ^= flip;
        // Readers of uv data and of bare tables leave the sums to their callers.
        expect(outcome(damaged, (source) => openFits(source) && read(source)) ?? right).toBe(right);
      }),
      { numRuns: 60 },
    );
  });

  test('with bytes changed behind the back of the sums takes no more than the file justifies', () => {
    const change = fc.tuple(fc.nat(plain.length - 1), fc.integer({ min: 0, max: 255 }));
    fc.assert(
      fc.property(fc.array(change, { minLength: 1, maxLength: 6 }), (changes) => {
        const damaged = plain.slice();
        for (const [at, value] of changes) damaged[at] = value;
        outcome(damaged, read);
      }),
      { numRuns: 60 },
    );
  });

  test('with a header that lies about a size takes no more than the file justifies', () => {
    const places = starts.flatMap((start, k) => {
      const end = starts[k + 1] ?? plain.length;
      const cards: { at: number; isForm: boolean }[] = [];
      for (let at = start; at < end; at += CARD) {
        const keyword = Buffer.from(plain.subarray(at, at + 8)).toString('latin1');
        if (keyword.startsWith('END ')) break;
        if (/^TFORM\d/.test(keyword)) cards.push({ at, isForm: true });
        else if (SIZES.test(keyword)) cards.push({ at, isForm: false });
      }
      return cards;
    });
    const lie = fc.tuple(fc.constantFrom(...places), fc.nat(17));
    fc.assert(
      fc.property(fc.array(lie, { minLength: 1, maxLength: 3 }), (lies) => {
        const damaged = plain.slice();
        for (const [{ at, isForm }, which] of lies) {
          const value = isForm ? `'${FORM_LIES[which % FORM_LIES.length]}'` : LIES[which % LIES.length];
          damaged.set(Buffer.from(`= ${value}`.padEnd(CARD - 8), 'latin1'), at + 8);
        }
        outcome(damaged, read);
      }),
      { numRuns: 150 },
    );
  });
});

test('lists of all rows that share one piece of the heap are not copied for each', () => {
  const [rows, length] = [1000, 4000];
  const data = new DataView(new ArrayBuffer(8 * rows + length));
  for (let row = 0; row < rows; row++) data.setInt32(8 * row, length);
  const primary = handmade(['SIMPLE  = T', 'BITPIX  = 8', 'NAXIS   = 0']);
  const table = handmade(
    [
      ...["XTENSION= 'BINTABLE'", 'BITPIX  = 8', 'NAXIS   = 2', 'NAXIS1  = 8', `NAXIS2  = ${rows}`],
      ...[`PCOUNT  = ${length}`, 'GCOUNT  = 1', 'TFIELDS = 1', "TTYPE1  = 'LIST'", "TFORM1  = '1PB'"],
    ],
    new Uint8Array(data.buffer),
  );
  const bytes = new Uint8Array(Buffer.concat([primary, table]));
  expect(outcome(bytes, tablesOf)).toBeUndefined();
  expect(problemOf(() => tablesOf(sourceOf(bytes))).message).toBe(
    'input, HDU 2, column LIST, row 2: bad-size: expected a list within the heap of 4000 bytes, got 4000 elements from its byte 0 on. The file is damaged: fetch it again.',
  );
});

describe('headers', () => {
  const card = (text: string) => text.padEnd(CARD);

  // Joined piece by piece, these would take a minute.
  test('of a string over very many cards are read in a moment', () => {
    const pieces = 40_000;
    const text = `CONTINUE  '${'x'.repeat(60)}&'`;
    const bytes = handmade([
      ...['SIMPLE  = T', 'BITPIX  = 8', 'NAXIS   = 0', "LONG    = 'a&'"],
      ...Array.from({ length: pieces }, () => text),
    ]);
    const before = performance.now();
    const [hdu] = listHdus(sourceOf(bytes));
    expect(performance.now() - before).toBeLessThan(5000);
    expect(hdu.header.first.get('LONG')?.value).toHaveLength(1 + 60 * pieces + 1);
  });

  test('of more cards than any has are refused, though all are one string', () => {
    const first = ['SIMPLE  = T', "LONG    = 'a&'"].map(card).join('');
    const text = (first + card("CONTINUE  'x&'").repeat(180_100)).padEnd(BLOCK * 5004);
    const bytes = new Uint8Array(Buffer.from(text, 'latin1'));
    expect(problemOf(() => listHdus(sourceOf(bytes))).found).toMatch(/cards without END$/);
  });
});

describe('text', () => {
  const numbers = {
    values: { diameter: { value: 42.5, unit: 'uas', low: 41, high: 44, definition: 'ridge' } },
    remarks: ['invented'],
  };
  const bytes = new TextEncoder().encode(`${JSON.stringify(numbers, null, 2)}\n`);

  test('of JSON cut anywhere is refused', () => {
    for (let cut = 0; cut < bytes.length - 1; cut++)
      expect(problemOf(() => readNumbers(sourceOf(bytes.slice(0, cut)))).code).toBe('bad-json');
  });

  test('of JSON with any bytes is numbers or refused, and no number is endless', () => {
    const change = fc.tuple(fc.nat(bytes.length - 1), fc.integer({ min: 0, max: 255 }));
    fc.assert(
      fc.property(fc.array(change, { minLength: 1, maxLength: 4 }), (changes) => {
        const damaged = bytes.slice();
        for (const [at, value] of changes) damaged[at] = value;
        outcome(damaged, readJson);
        outcome(damaged, readNumbers);
      }),
    );
    for (const digits of ['1e999', '-1e999']) {
      const endless = JSON.stringify(numbers).replace('42.5', digits);
      expect(problemOf(() => readNumbers(sourceOf(new TextEncoder().encode(endless)))).place).toBe(
        'input, values.diameter.value',
      );
      const low = JSON.stringify(numbers).replace('41', digits);
      expect(problemOf(() => readNumbers(sourceOf(new TextEncoder().encode(low)))).place).toBe(
        'input, values.diameter.low',
      );
    }
    const deep = new TextEncoder().encode('['.repeat(200_000));
    expect(problemOf(() => readJson(sourceOf(deep))).code).toBe('bad-json');
  });

  const column = (name: string) => ({ column: name, unit: undefined });
  const request = {
    columns: Object.fromEntries(
      ['station1', 'station2', 'time', 'u', 'v', 're', 'im', 'sigma'].map((name) => [name, column(name)]),
    ),
    timeOrigin: 0,
    frequencyHz: 1e9,
  };
  const table = new TextEncoder().encode(
    `station1,station2,time,u,v,re,im,sigma\n${'A,B,60000.25,1e9,-2e9,0.5,-0.25,0.0125\n'.repeat(4)}`,
  );

  test('of a table cut anywhere is refused, is whole lines, or is told to end within one', () => {
    for (let cut = 0; cut < table.length; cut++) {
      try {
        const { isEnded, count } = readVisibilityTable(sourceOf(table.slice(0, cut)), request);
        const last = Buffer.from(table.subarray(0, cut)).toString().split('\n').at(-1);
        expect([isEnded, count < 4 || !isEnded]).toEqual([last === '', true]);
      } catch (error) {
        expect(error).toBeInstanceOf(InputProblem);
      }
    }
  });

  test('of a table with any bytes takes no more than it justifies', () => {
    const change = fc.tuple(fc.nat(table.length - 1), fc.integer({ min: 0, max: 255 }));
    fc.assert(
      fc.property(fc.array(change, { minLength: 1, maxLength: 4 }), (changes) => {
        const damaged = table.slice();
        for (const [at, value] of changes) damaged[at] = value;
        outcome(damaged, (source) => readVisibilityTable(source, request));
      }),
    );
  });
});
