/** A known source seen through given rows: against direct sums, and the statistics of what is put on top. */

import { expect, test } from 'vitest';
import type { SkyImage, Visibilities } from '../../../stages/data.ts';
import { observe } from '../../../stages/imaging/synthetic.ts';
import { makePart } from '../../../stages/numerics/models.ts';
import { mean, standardDeviation } from '../../../stages/numerics/statistics.ts';

const UAS = Math.PI / 180 / 3600e6;
const STATIONS = 5;

/** Rows of every pair of five stations in many scans; sigma and the phase errors as given. */
function template(scans: number, sigma: number, phaseBudget: number): Visibilities {
  const pairs: [number, number][] = [];
  for (let a = 0; a < STATIONS; a++) for (let b = a + 1; b < STATIONS; b++) pairs.push([a, b]);
  const rows = Array.from({ length: scans }, (_, scan) => pairs.map(([a, b]) => ({ a, b, scan }))).flat();
  const of = (pick: (row: (typeof rows)[number], k: number) => number) => Float64Array.from(rows, pick);
  return {
    target: { name: 'invented', raDegrees: 0, decDegrees: 0 },
    arrayName: 'INVENTED',
    remark: '',
    stations: Array.from({ length: STATIONS }, (_, k) => ({ name: `S${k}`, xyz: [k, 0, 0] as const })),
    wavelengthMetres: 1.3e-3,
    bandwidthMetres: 1e-5,
    count: rows.length,
    station1: Int32Array.from(rows, ({ a }) => a),
    station2: Int32Array.from(rows, ({ b }) => b),
    scan: Int32Array.from(rows, ({ scan }) => scan),
    timeMjd: of(({ scan }) => 60000 + scan / 100),
    integrationSeconds: of(() => 300),
    u: of(({ a, b, scan }) => (b - a) * 1e9 * Math.cos(0.3 + scan / 7)),
    v: of(({ a, b, scan }) => (b - a) * 1e9 * Math.sin(0.3 + scan / 7)),
    re: of(() => 1),
    im: of(() => 0),
    sigma: of(() => sigma),
    sigmaPhase: of(() => Math.hypot(sigma, phaseBudget)),
  };
}

const image: SkyImage = {
  nx: 4,
  ny: 4,
  pixelRadians: 9 * UAS,
  pixels: Float64Array.from({ length: 16 }, (_, k) => ((k * 7) % 16) / 100),
};
const quiet = { gainDeviations: new Float64Array(STATIONS), seed: 5, noiseFactor: 0 };

/** Direct: the sum over pixels of CONVENTIONS, V = sum I exp(-2 pi i (u x + v y)). */
function direct({ u, v }: Visibilities, r: number): [number, number] {
  let [re, im] = [0, 0];
  for (let j = 0; j < 4; j++)
    for (let i = 0; i < 4; i++) {
      const phase = -2 * Math.PI * (u[r] * (1.5 - i) + v[r] * (j - 1.5)) * image.pixelRadians;
      re += image.pixels[4 * j + i] * Math.cos(phase);
      im += image.pixels[4 * j + i] * Math.sin(phase);
    }
  return [re, im];
}

test('keeps amplitudes and closure phases of an image where only station phases are unknown', () => {
  const rows = template(6, 0.01, 0);
  const { re, im } = observe(rows, image, quiet);
  const sent = Array.from({ length: rows.count }, (_, r) => direct(rows, r));
  for (let r = 0; r < rows.count; r++)
    expect(Math.hypot(re[r], im[r])).toBeCloseTo(Math.hypot(...sent[r]), 10);
  const row = (scan: number, a: number, b: number) =>
    rows.scan.findIndex((s, r) => s === scan && rows.station1[r] === a && rows.station2[r] === b);
  const wrap = (x: number) => Math.atan2(Math.sin(x), Math.cos(x));
  const turned: number[] = [];
  for (let scan = 0; scan < 6; scan++) {
    const [ab, bc, ac] = [row(scan, 0, 1), row(scan, 1, 2), row(scan, 0, 2)];
    const closure = (phase: (r: number) => number) => wrap(phase(ab) + phase(bc) - phase(ac));
    const [found, expected] = [
      closure((r) => Math.atan2(im[r], re[r])),
      closure((r) => Math.atan2(sent[r][1], sent[r][0])),
    ];
    expect(Math.abs(wrap(found - expected))).toBeLessThan(1e-9);
    turned.push(Math.abs(wrap(Math.atan2(im[ab], re[ab]) - Math.atan2(sent[ab][1], sent[ab][0]))));
  }
  expect(mean(turned)).toBeGreaterThan(0.3);
});

test('multiplies by one gain a station and scan', () => {
  const rows = template(300, 0.01, 0);
  const gainDeviations = Float64Array.of(0.3, 0, 0, 0.1, 0);
  const { re, im } = observe(rows, image, { ...quiet, gainDeviations });
  const logs = new Map<number, number[]>();
  for (let r = 0; r < rows.count; r++) {
    const key = 10 * rows.station1[r] + rows.station2[r];
    const log = Math.log(Math.hypot(re[r], im[r]) / Math.hypot(...direct(rows, r)));
    logs.set(key, [...(logs.get(key) ?? []), log]);
  }
  // Stations without a deviation leave the amplitude; the deviation of 300 values is known to 1/sqrt(600).
  expect(standardDeviation(logs.get(12) ?? [])).toBeLessThan(1e-9);
  expect(Math.abs(standardDeviation(logs.get(1) ?? []) / 0.3 - 1)).toBeLessThan(4 / Math.sqrt(600));
  expect(Math.abs(standardDeviation(logs.get(13) ?? []) / 0.1 - 1)).toBeLessThan(4 / Math.sqrt(600));
  // The same draw of station 0 on both of its baselines with quiet ones.
  expect(logs.get(1)?.[7]).toBeCloseTo(logs.get(2)?.[7] ?? 99, 9);
});

test('adds noise of the stated size times the factor, and the phase budget', () => {
  const point = { parts: [makePart('gaussian', { length: 0, flux: 1 })], blur: 0 };
  const rows = template(400, 0.001, 0.2);
  const clean = observe({ ...rows, sigmaPhase: rows.sigma }, point, quiet);
  const noisy = observe({ ...rows, sigmaPhase: rows.sigma }, point, { ...quiet, noiseFactor: 3 });
  const off = (of: 're' | 'im') => Array.from(noisy[of], (value, r) => value - clean[of][r]);
  const few = 4 / Math.sqrt(2 * rows.count);
  for (const part of ['re', 'im'] as const) {
    expect(Math.abs(standardDeviation(off(part)) / 0.003 - 1)).toBeLessThan(few);
    expect(Math.abs(mean(off(part)))).toBeLessThan((4 * 0.003) / Math.sqrt(rows.count));
  }
  expect(noisy.sigma[0]).toBeCloseTo(0.003, 12);
  const shaken = observe(rows, point, quiet);
  const turned = Array.from(shaken.re, (re, r) =>
    Math.atan2(shaken.im[r] * clean.re[r] - re * clean.im[r], re * clean.re[r] + shaken.im[r] * clean.im[r]),
  );
  expect(Math.abs(standardDeviation(turned) / 0.2 - 1)).toBeLessThan(few);
  // A budget that is kept: hypot(noise / amplitude, 0.2).
  expect(shaken.sigmaPhase[0]).toBeCloseTo(0.2, 6);
  expect(shaken.remark).toBe('invented data');
});
