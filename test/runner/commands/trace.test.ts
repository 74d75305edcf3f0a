/** `trace`: document and text. The lineage itself: test/ledger/questions.test.ts. */

import { existsSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { openBook } from '../../../ledger/book.ts';
import type { PlateEntry, StageEntry } from '../../../ledger/entry.ts';
import { checkProof } from '../../../ledger/proof.ts';
import { traceCommand } from '../../../runner/commands/trace.ts';
import { type Filled, filledBook, keepingIo, longLines, optionsFor } from './book-io.ts';

let filled: Filled;
let plate: PlateEntry;
let fit: StageEntry;

beforeAll(() => {
  filled = filledBook();
  const book = openBook(filled.book);
  plate = book.entry(9) as PlateEntry;
  fit = book.entry(5) as StageEntry;
  book.close();
});

afterAll(() => filled.remove());

function textOf(...words: string[]): string {
  const io = keepingIo(filled.directory);
  expect(traceCommand(words, optionsFor(filled.book), io)).toBe(0);
  expect(io.said()).toBe('');
  return io.printed();
}

test('prints one JSON document with subject and lineage', () => {
  writeFileSync(join(filled.directory, 'figure.svg'), `<svg><metadata>${plate.plate}</metadata></svg>`);
  const io = keepingIo(filled.directory);
  expect(traceCommand(['figure.svg'], optionsFor(filled.book, true), io)).toBe(0);
  const document = JSON.parse(io.printed());
  expect(Object.keys(document)).toEqual(['subject', 'lineage', 'withdrawals', 'countersignatures']);
  expect([document.withdrawals, document.countersignatures]).toEqual([[], []]);
  expect(document.subject).toMatchObject({ asked: 'figure.svg', type: 'plate', plate: plate.plate });
  expect(document.lineage.map(({ number }: { number: number }) => number)).toEqual([9, 7, 6, 5, 4, 2, 3, 1]);
  expect(document.lineage[0]).toMatchObject({
    type: 'plate',
    drawn: 7,
    digest: expect.stringMatching(/^[0-9a-f]{64}$/),
  });
  expect(document.lineage[7].inputs.image[0].origin).toEqual({ file: 'data/truth.fits' });
});

test('shows a plate down to the files: digests, sizes, paths, parameters with units, findings, warnings', () => {
  const text = textOf(plate.plate);
  const { digest } = fit.outputs.image as { digest: string };
  for (const piece of [
    `Plate ${plate.plate}: output image of entry 7`,
    'Lineage, nearest first: 8 entries',
    '      5  stage  fit           fit            2026-01-02 03:04:11',
    'Entry 5: stage fit (fit)\n------------------------\n',
    `  code              ${'c0de'.repeat(16)}\n`,
    'version 1, 1 file, 1 package, runtime v24.21.0',
    'on linux-x64, 1.3 s, at most 105 MB',
    `    image           fits-image, 12 bytes\n                    store/${digest.slice(0, 3)}/${digest}\n`,
    `    image           output image of entry 5, fit, 12 bytes\n                    digest ${digest}\n`,
    `    image           file data/truth.fits, 1,234 bytes\n                    digest ${'da7a'.repeat(16)}\n`,
    '    taper           15 uas\n',
    '    band.frequency  227 GHz\n',
    '    stations.1      name TWO; sefd 4000 Jy\n',
    '    terms           amplitudes, closure-phases\n',
    '    scatter against stated noise  marginal: 1.62 (marginal 1.5, limit 2.5). Scatter within',
    '    closure                       within limits: 1 (marginal 1.5, limit 2.5)\n',
    '  warnings\n    3 samples of weight zero were dropped.\n',
    `One file from outside went in:\n\n  data/truth.fits  1,234 bytes\n    digest ${'da7a'.repeat(16)}\n`,
  ]) {
    expect(text).toContain(piece);
  }
  expect(longLines(text)).toEqual([]);
});

test('shows a published number with interval and truth', () => {
  const text = textOf('ring-diameter', 'in', 'run', '1');
  // 42.1 ± 0.8 to two digits of the uncertainty.
  expect(text).toContain(
    'ring-diameter = 42.10 +0.80 −0.80 uas, 68 % interval: published by run 1, diameter in output ring',
  );
  expect(text).toContain('The truth of this synthetic observation is 42.000 uas, entry 1\n');
});

test('shows a run with stages, plates and numbers', () => {
  const text = textOf('run', '2');
  expect(text).toContain('    visibilities  ingest         carried forward  entry 2\n');
  expect(text).toContain('    ring-diameter  42.90 +0.80 −0.80 uas  entry 13, ring\n');
  expect(text).toContain('    lantern-ring    as lantern.yaml, 21 bytes\n                    store/');
});

test('says of a file from outside which entries read it', () => {
  expect(textOf('da7ada7a')).toContain(
    'a file from outside; no entry made it. It went into entry 1 (image).',
  );
});

test('writes a proof that checks, and says where', () => {
  const io = keepingIo(filled.directory);
  expect(traceCommand([plate.plate], { ...optionsFor(filled.book), proof: 'proof.json' }, io)).toBe(0);
  const file = join(filled.directory, 'proof.json');
  expect(io.said()).toBe(`Proof of entry 9 under the seal of 16 entries: ${file}\n`);
  const proof = JSON.parse(readFileSync(file, 'utf8'));
  expect(checkProof(proof)).toMatchObject({ book: 'lantern', number: 9 });
  expect(JSON.parse(proof.entry)).toMatchObject({ type: 'plate', plate: plate.plate });
  // The plate's trace is printed all the same.
  expect(io.printed()).toContain('Lineage, nearest first: 8 entries');
});

test('proves a published number by the run that published it', () => {
  const io = keepingIo(filled.directory);
  const proof = join(filled.directory, 'number.json');
  traceCommand(['ring-diameter', 'in', 'run', '1'], { ...optionsFor(filled.book, true), proof }, io);
  expect(JSON.parse(JSON.parse(readFileSync(proof, 'utf8')).entry)).toMatchObject({ type: 'run', run: 1 });
  expect(JSON.parse(io.printed()).lineage).toHaveLength(6);
});

test('proves nothing of a file that no entry made, and says where a proof cannot be written', () => {
  const io = keepingIo(filled.directory);
  const prove = (words: string[], proof: string) =>
    traceCommand(words, { ...optionsFor(filled.book), proof }, io);
  expect(() => prove(['da7ada7a'], 'none.json')).toThrow(
    'da7ada7a: a file from outside, which no entry made. Prove an entry that read it.',
  );
  expect(existsSync(join(filled.directory, 'none.json'))).toBe(false);
  expect(() => prove(['9'], 'no/where.json')).toThrow('cannot be written (no such file)');
});

test('throws what the command line prints', () => {
  const io = keepingIo(filled.directory);
  expect(() => traceCommand(['nothing'], optionsFor(filled.book), io)).toThrow(
    'nothing is no entry, plate number',
  );
  expect(() => traceCommand(['1'], optionsFor(join(filled.directory, 'nowhere')), io)).toThrow(
    'there is no book here',
  );
  expect(io.printed()).toBe('');
});
