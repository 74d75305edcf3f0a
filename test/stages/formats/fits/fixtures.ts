/** Fixtures of test/data/fits as sources, and what every reader test needs. */

import { readFileSync } from 'node:fs';
import { type ByteSource, memorySink, sourceOf } from '../../../../stages/bytes.ts';
import { InputProblem } from '../../../../stages/problem.ts';

export function fixtureBytes(name: string): Uint8Array {
  return new Uint8Array(readFileSync(new URL(`../../../data/fits/${name}`, import.meta.url)));
}

export function fixture(name: string): ByteSource {
  return sourceOf(fixtureBytes(name), name);
}

/** What astropy and numpy say is in the fixtures (test/data/scripts/make-fits-fixtures.py). */
export const expectedValues = JSON.parse(Buffer.from(fixtureBytes('expected.json')).toString('utf8'));

/** What a writer writes, as a source. */
export function written(write: (sink: ReturnType<typeof memorySink>) => void, name = 'written'): ByteSource {
  const sink = memorySink();
  write(sink);
  return sourceOf(sink.bytes().slice(), name);
}

/** The InputProblem that `run` throws; fails when it throws nothing or anything else. */
export function problemOf(run: () => unknown): InputProblem {
  try {
    run();
  } catch (error) {
    if (error instanceof InputProblem) return error;
    throw error;
  }
  throw new Error('nothing was thrown');
}

/** Bytes of a header of these cards, each filled to 80 characters, with END, and data. */
export function handmade(cards: readonly string[], data: Uint8Array = new Uint8Array(0)): Uint8Array {
  const text = [...cards, 'END'].map((card) => card.padEnd(80)).join('');
  const header = Buffer.from(text.padEnd(Math.ceil(text.length / 2880) * 2880), 'latin1');
  const filling = new Uint8Array((2880 - (data.length % 2880)) % 2880);
  return new Uint8Array(Buffer.concat([header, data, filling]));
}

/** null, as JSON has it, to NaN. */
export function numbersOf(list: readonly (number | null)[]): number[] {
  return list.map((value) => value ?? Number.NaN);
}
