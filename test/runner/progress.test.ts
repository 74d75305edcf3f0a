/** The lines of a run on terminals of several widths. */

import { expect, test } from 'vitest';
import type { Outcome } from '../../runner/job.ts';
import { endedLine } from '../../runner/progress.ts';

const outcome: Outcome = {
  name: 'calibration',
  kind: 'calibration-check',
  state: 'computed',
  entry: 12,
  outputs: {},
  seconds: 1.23,
  findings: [
    {
      check: 'gainOffset',
      finding: 'marginal',
      value: 0.274,
      marginal: 0.2,
      limit: 0.6,
      detail: 'Largest mean log gain ratio of 2 co-located pairs: ONE and TWO.',
    },
    { check: 'clock', finding: 'within limits', value: 0.1, marginal: 0.3, limit: 0.95, detail: 'Seconds.' },
  ],
  warnings: ['three samples of weight zero were dropped'],
  stop: null,
  mark: null,
  error: null,
  codeDigest: null,
};

test('stand in columns where there is room', () => {
  expect(endedLine(outcome, 20, 100).split('\n')).toEqual([
    '  calibration           computed         entry 12      1.2 s',
    '    marginal: gainOffset 0.274 (marginal 0.2, limit 0.6): Largest mean log gain ratio of 2',
    '      co-located pairs: ONE and TWO.',
    '    1 check within limits, value (limit): clock 0.1 (0.95)',
    '    warning: three samples of weight zero were dropped',
  ]);
});

test.each([30, 40, 80, 100])('fit into %d columns', (columns) => {
  const lines = endedLine(outcome, 20, columns).split('\n');
  for (const line of lines.slice(1)) expect(line.length, line).toBeLessThanOrEqual(columns);
  if (columns >= 40) expect(lines[0].length).toBeLessThanOrEqual(columns);
});
