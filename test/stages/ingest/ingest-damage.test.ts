/** Whatever comes in, an InputProblem or a result comes out. */

import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { InputProblem } from '../../../stages/problem.ts';
import { bytesOf, opticalFile } from '../optical-synthetic.ts';
import { rows, times, uvFile } from '../uv-synthetic.ts';
import { runIngest } from './run-ingest.ts';

function endsWell(bytes: Uint8Array, parameters = {}): boolean {
  try {
    const { visibilities } = runIngest(bytes, { checksums: 'ignore', ...parameters });
    const { re, im, u, sigma, timeMjd, squared, triples } = visibilities;
    const optical = squared ? [squared.u, squared.v, squared.value, squared.sigma, squared.timeMjd] : [];
    const closed = triples
      ? [triples.u1, triples.v1, triples.u2, triples.v2, triples.phase, triples.amplitude]
      : [];
    return [re, im, u, sigma, timeMjd, ...optical, ...closed].every((column) =>
      column.every(Number.isFinite),
    );
  } catch (error) {
    if (error instanceof InputProblem) return true;
    throw error;
  }
}

const file = uvFile(rows({ days: times(1, 2) }), { bands: [0] });
/** Squared visibilities and triple products; its sums have names that mean nothing, so that damage gets past them. */
const optical = Buffer.from(
  Buffer.from(bytesOf(opticalFile(1)))
    .toString('latin1')
    .replaceAll('CHECKSUM=', 'UNCHECKS=')
    .replaceAll('DATASUM =', 'UNDATASU='),
  'latin1',
);
const table = {
  columns: { station1: 'a', station2: 'b', time: 't', u: 'u', v: 'v', re: 're', im: 'im', sigma: 's' },
  table: {
    target: 'T',
    ra: 10,
    dec: 10,
    frequency: 2e11,
    bandwidth: 0,
    array: 'A',
    remark: '',
    stations: {},
  },
};

describe('damaged input', () => {
  it('cut anywhere', () => {
    fc.assert(fc.property(fc.nat(file.length), (length) => endsWell(file.slice(0, length))));
  });

  it('with bytes changed anywhere', () => {
    const change = fc.tuple(fc.nat(file.length - 1), fc.integer({ min: 0, max: 255 }));
    fc.assert(
      fc.property(fc.array(change, { minLength: 1, maxLength: 8 }), (changes) => {
        const copy = file.slice();
        for (const [at, byte] of changes) copy[at] = byte;
        return endsWell(copy, { uvSign: 'as-written' });
      }),
      { numRuns: 300 },
    );
  });

  it.each(['enforce', 'ignore'])('of optical data, with bytes changed or cut, rules: %s', (rules) => {
    expect(endsWell(optical, { rules })).toBe(true);
    const change = fc.tuple(fc.nat(optical.length - 1), fc.integer({ min: 0, max: 255 }));
    fc.assert(
      fc.property(
        fc.array(change, { maxLength: 8 }),
        fc.option(fc.nat(optical.length)),
        (changes, length) => {
          const copy = Uint8Array.from(optical);
          for (const [at, byte] of changes) copy[at] = byte;
          return endsWell(length === null ? copy : copy.slice(0, length), { rules });
        },
      ),
      { numRuns: 200 },
    );
  });

  it('of random bytes', () => {
    fc.assert(fc.property(fc.uint8Array({ maxLength: 6000 }), (bytes) => endsWell(bytes, table)));
    expect(() => runIngest(new Uint8Array(0))).toThrow(InputProblem);
  });

  it('as a table of any cells', () => {
    const cell = fc.oneof(
      fc.double().map(String),
      fc.string({ maxLength: 6 }),
      fc.constantFrom('1', 'nan', '-inf', ''),
    );
    fc.assert(
      fc.property(fc.array(fc.array(cell, { minLength: 8, maxLength: 8 }), { maxLength: 6 }), (cells) =>
        endsWell(
          new TextEncoder().encode(['a,b,t,u,v,re,im,s', ...cells.map((row) => row.join(','))].join('\n')),
          table,
        ),
      ),
    );
  });
});
