/** What the tests of `simulate` and `calibration-check` share: parameters resolved as the runner does it, a run of a
 *  kind in memory, and a small invented observation. */

import { cellOf } from '../../runner/recipe/cells.ts';
import { resolveFields } from '../../runner/recipe/parameters.ts';
import { problemList } from '../../runner/recipe/recipe-problems.ts';
import { sourceText } from '../../runner/recipe/source-text.ts';
import { type ByteSource, memorySink, sourceOf } from '../../stages/bytes.ts';
import type { StageKind, StageReport } from '../../stages/kind.ts';

/** Parameters of a kind, written as in a recipe, with defaults filled in and quantities converted. */
export function resolve(kind: StageKind, written: Record<string, unknown>): Record<string, unknown> {
  const spot = { source: sourceText('test', ''), offset: 0 };
  const problems = problemList();
  const cell = cellOf(written, spot);
  const resolved = cell.type === 'map' ? resolveFields(kind.parameters, cell, '', spot, problems) : undefined;
  if (resolved === undefined) {
    const list = problems
      .sorted()
      .map(({ path, expected, found }) => `${path}: expected ${expected}, got ${found}`);
    throw new Error(list.join('\n'));
  }
  return resolved.value as Record<string, unknown>;
}

export interface Ran {
  readonly report: StageReport;
  readonly outputs: Readonly<Record<string, ByteSource>>;
}

/** Runs a kind in memory. */
export async function runKind(
  kind: StageKind,
  written: Record<string, unknown>,
  inputs: Readonly<Record<string, readonly ByteSource[]>> = {},
): Promise<Ran> {
  const { compute } = await kind.load();
  const sinks = Object.fromEntries(Object.keys(kind.outputs).map((name) => [name, memorySink()]));
  const report = await compute({
    inputs,
    parameters: resolve(kind, written),
    outputs: sinks,
    note: () => {},
    progress: () => {},
  });
  const outputs = Object.fromEntries(
    Object.entries(sinks).map(([name, sink]) => [name, sourceOf(sink.bytes(), name)]),
  );
  return { report, outputs };
}

/** Five invented stations at four sites, two hours of a ring, no errors but noise. */
export const SMALL = {
  target: { name: 'Lantern nucleus', ra: '180 deg', dec: '18 deg' },
  band: { frequency: '230 GHz', bandwidth: '2 GHz' },
  stations: [
    { name: 'WICK-A', longitude: '20.5 deg', latitude: '-27.5 deg', height: '1200 m', sefd: '4000 Jy' },
    { name: 'WICK-B', longitude: '20.51 deg', latitude: '-27.51 deg', height: '1210 m', sefd: '4000 Jy' },
    { name: 'TALLOW', longitude: '36 deg', latitude: '37.6 deg', height: '2300 m', sefd: '4000 Jy' },
    { name: 'EMBER', longitude: '-18.5 deg', latitude: '64.8 deg', height: '800 m', sefd: '4000 Jy' },
    { name: 'BEACON', longitude: '-14 deg', latitude: '28.6 deg', height: '700 m', sefd: '4000 Jy' },
  ],
  start: '2031-03-10T21:00:00Z',
  duration: '2 h',
  record: '30 s',
  scan: '3 min',
  interval: '20 min',
  truth: {
    flux: '0.8 Jy',
    diameter: '46 uas',
    width: '12 uas',
    asymmetry: 0.25,
    positionAngle: '150 deg',
    pixels: 64,
  },
} as const;
