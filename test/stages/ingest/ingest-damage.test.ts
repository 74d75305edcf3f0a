/** Whatever comes in, an InputProblem or a result comes out. */

import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { InputProblem } from '../../../stages/problem.ts';
import { rows, times, uvFile } from '../uv-synthetic.ts';
import { runIngest } from './run-ingest.ts';

function endsWell(bytes: Uint8Array, parameters = {}): boolean {
  try {
    const { visibilities } = runIngest(bytes, { checksums: 'ignore', ...parameters });
    return [visibilities.re, visibilities.im, visibilities.u, visibilities.sigma, visibilities.timeMjd].every(
      (column) => column.every(Number.isFinite),
    );
  } catch (error) {
    if (error instanceof InputProblem) return true;
    throw error;
  }
}

const file = uvFile(rows({ days: times(1, 2) }), { bands: [0] });
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
