import { describe, expect, it } from 'vitest';
import type { PublishedNumber } from '../../ledger/entry.ts';
import { type ComparedOutput, overallVerdict } from '../../runner/compare-outputs.ts';

const number: PublishedNumber = {
  name: 'ring-diameter',
  value: 42,
  low: 41,
  high: 43,
  unit: 'uas',
  entry: 7,
  output: 'ring',
  key: 'diameter',
  against: null,
  tolerance: 0.01,
};

function output(name: string, verdict: ComparedOutput['verdict'], deviation: number | null): ComparedOutput {
  return { stage: 'features', output: name, verdict, was: 'a', is: 'b', largestDeviation: deviation };
}

describe('the verdict of a rerun', () => {
  it('is identical when every byte is', () => {
    expect(overallVerdict([output('ring', 'identical', 0)], [number])).toBe('identical');
  });

  it('is within tolerance when bytes differ and every published number is inside', () => {
    const outputs = [output('ring', 'within tolerance', 0.4), output('samples', 'different', null)];
    expect(overallVerdict(outputs, [number])).toBe('within tolerance');
  });

  it('is different when a number is outside, when none is published, or when an output is missing', () => {
    expect(overallVerdict([output('ring', 'different', 3)], [number])).toBe('different');
    expect(overallVerdict([output('samples', 'different', null)], [])).toBe('different');
    const lost = { ...output('samples', 'different', null), is: null };
    expect(overallVerdict([output('ring', 'within tolerance', 0.4), lost], [number])).toBe('different');
  });
});
