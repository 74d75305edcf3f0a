/** Closure phases and amplitudes against published counts, errors and an outside example. */

import { describe, expect, test } from 'vitest';
import {
  type ClosureData,
  closurePhase,
  closureSets,
  logClosureAmplitude,
  quadranglesOf,
  trianglesOf,
} from '../../stages/numerics/closures.ts';
import { randomStream } from '../../stages/numerics/random.ts';

/** One scan with every baseline of N stations; `visibility` gives re, im by station numbers. */
function fullScan(
  N: number,
  visibility: (i: number, j: number) => readonly [number, number],
  sigma: (k: number) => number = () => 0.1,
): ClosureData {
  const pairs: [number, number][] = [];
  for (let i = 0; i < N; i++) for (let j = i + 1; j < N; j++) pairs.push([i, j]);
  const column = (f: (pair: [number, number], k: number) => number) => Float64Array.from(pairs, f);
  const re = column(([i, j]) => visibility(i, j)[0]);
  const im = column(([i, j]) => visibility(i, j)[1]);
  const error = column((_, k) => sigma(k));
  return {
    count: pairs.length,
    station1: Int32Array.from(pairs, ([i]) => i),
    station2: Int32Array.from(pairs, ([, j]) => j),
    scan: new Int32Array(pairs.length),
    u: column(([i, j]) => 1e9 * (i - j)),
    v: column(([i, j]) => 1e8 * (i * i - j * j)),
    re,
    im,
    sigma: error,
    sigmaPhase: error.map((value, k) => value / Math.hypot(re[k] as number, im[k] as number)),
  };
}

describe('Independent closures of N stations (Thompson, Moran & Swenson, 3rd ed., section 10.3)', () => {
  // (N−1)(N−2)/2 and N(N−3)/2; all triangles N!/(3!(N−3)!).
  test.each([
    [3, 1, 0, 1],
    [4, 3, 2, 4],
    [5, 6, 5, 10],
    [6, 10, 9, 20],
    [7, 15, 14, 35],
    [8, 21, 20, 56],
    [9, 28, 27, 84],
    [10, 36, 35, 120],
  ])('%d stations have %d closure phases and %d closure amplitudes', (N, phases, amplitudes, triangles) => {
    const stream = randomStream(N, 'noise level');
    const data = fullScan(
      N,
      () => [1, 0],
      () => 0.01 + 0.1 * stream.uniform(),
    );
    const [set] = closureSets(data, { minimumSnr: 1 });
    expect(set?.triangles.length).toBe(phases);
    expect(set?.quadrangles.length).toBe(amplitudes);
    expect(trianglesOf(data, 0, { minimumSnr: 1 }).length).toBe(triangles);
  });
});

test('The double source of ratio 0.4 at (30, −15) µas has a closure phase of −60.1069382570457 degrees', () => {
  // Computed outside in 30 digits: baselines (2, 1), (1.5, −2.5) Gλ and their sum, bispectrum 0.226383799693891.
  const uas = Math.PI / 180 / 3600e6;
  const double = (u: number, v: number): [number, number] => {
    const phase = -2 * Math.PI * 1e9 * uas * (30 * u - 15 * v);
    return [(1 + 0.4 * Math.cos(phase)) / 1.4, (0.4 * Math.sin(phase)) / 1.4];
  };
  const uv = { '0-1': [2, 1], '1-2': [1.5, -2.5], '0-2': [3.5, -1.5] } as Record<string, [number, number]>;
  const data = fullScan(3, (i, j) => double(...(uv[`${i}-${j}`] as [number, number])));
  const [triangle] = trianglesOf(data, 0, { minimumSnr: 0 });
  if (!triangle) throw new Error('no triangle');
  expect(
    Math.abs((closurePhase(triangle, data.re, data.im) * 180) / Math.PI + 60.1069382570457),
  ).toBeLessThan(1e-11);
});

describe('The mean of ln|V + n| above ln|V|', () => {
  // E1(snr²/2)/2; E1(0.5) = 0.559773595, E1(2) = 0.048900511, E1(4.5) = 0.002073401 (Abramowitz & Stegun, table 5.1; the last
  // computed outside).
  test.each([
    [1, 0.559773595],
    [2, 0.048900511],
    [3, 0.002073401],
  ])('is E1(snr²/2)/2 at a signal-to-noise ratio of %d', (snr, E1) => {
    const stream = randomStream(snr, 'log amplitudes');
    const draws = 200_000;
    let [sum, squares] = [0, 0];
    for (let draw = 0; draw < draws; draw++) {
      const value = Math.log(Math.hypot(snr + stream.normal(), stream.normal()) / snr);
      sum += value;
      squares += value * value;
    }
    const error = Math.sqrt(squares / draws / draws);
    expect(Math.abs(sum / draws - E1 / 2)).toBeLessThan(4 * error);
  });
});

describe('Errors of closures to first order (ibid., sections 9.3 and 10.3)', () => {
  test('add 1/snr² along a triangle: 0.0237345… rad² for 12, 9, 15', () => {
    const snr = [12, 9, 15];
    const data = fullScan(
      3,
      () => [1, 0],
      (k) => 1 / (snr[k] as number),
    );
    const [set] = closureSets(data, { minimumSnr: 1 });
    expect(set?.phaseCovariance[0]).toBeCloseTo(0.023734567901234568, 15);
  });

  test('add 1/snr² around a quadrangle: 0.0337345… for 12, 9, 15, 10', () => {
    // Baselines 0–1, 0–2, 1–3, 2–3 carry the quadrangle; the other two are too weak to be chosen.
    const snr: Record<number, number> = { 0: 12, 1: 9, 4: 15, 5: 10, 2: 1.1, 3: 1.1 };
    const data = fullScan(
      4,
      () => [1, 0],
      (k) => 1 / (snr[k] as number),
    );
    const [set] = closureSets(data, { minimumSnr: 1 });
    expect(set?.logAmplitudeCovariance[0]).toBeCloseTo(0.033734567901234566, 15);
  });

  test('meet the scatter of drawn noise within 4 % (2e6 draws outside: 0.023966 and 0.034074)', () => {
    const stream = randomStream(11, 'noise');
    const snr: Record<number, number> = { 0: 12, 1: 9, 4: 15, 5: 10, 2: 11, 3: 14 };
    const draws = 20_000;
    let phaseSquares = 0;
    let amplitudeSquares = 0;
    for (let draw = 0; draw < draws; draw++) {
      let k = 0;
      const data = fullScan(
        4,
        () => {
          const noise = 1 / (snr[k++ % 6] as number);
          return [1 + noise * stream.normal(), noise * stream.normal()];
        },
        (row) => 1 / (snr[row] as number),
      );
      const triangle = { rows: [0, 3, 1], signs: [1, 1, -1] };
      const quadrangle = { rows: [0, 5, 1, 4], signs: [1, 1, -1, -1] };
      phaseSquares += closurePhase(triangle, data.re, data.im) ** 2;
      amplitudeSquares += logClosureAmplitude(quadrangle, data.re, data.im) ** 2;
    }
    const phaseVariance = 1 / 12 ** 2 + 1 / 14 ** 2 + 1 / 9 ** 2;
    const amplitudeVariance = 0.033734567901234566;
    // A variance from 20,000 draws is good to 1 %; the first order errs by another per cent.
    expect(Math.abs(phaseSquares / draws / phaseVariance - 1)).toBeLessThan(0.04);
    expect(Math.abs(amplitudeSquares / draws / amplitudeVariance - 1)).toBeLessThan(0.04);
  });

  test('correlate closures that share a baseline by ± its 1/snr², the sign by the direction', () => {
    const data = fullScan(
      4,
      () => [1, 0],
      (k) => 0.1 + 0.01 * k,
    );
    const [set] = closureSets(data, { minimumSnr: 1 });
    if (!set) throw new Error('no set');
    const n = set.triangles.length;
    for (let a = 0; a < n; a++) {
      for (let b = 0; b < n; b++) {
        if (a === b) continue;
        const [one, other] = [set.triangles[a], set.triangles[b]];
        const shared = one?.rows.find((row) => other?.rows.includes(row)) ?? -1;
        const sign =
          (one?.signs[one.rows.indexOf(shared)] ?? 0) * (other?.signs[other.rows.indexOf(shared)] ?? 0);
        const variance = (data.sigmaPhase[shared] as number) ** 2;
        expect(set.phaseCovariance[a * n + b]).toBeCloseTo(sign * variance, 15);
      }
    }
  });

  test('leave quadrangles of a point source at zero, three for every four stations', () => {
    const data = fullScan(5, () => [1, 0]);
    // 3 · 5!/(4! 1!)
    expect(quadranglesOf(data, 0, { minimumSnr: 1 }).length).toBe(15);
    for (const quadrangle of quadranglesOf(data, 0, { minimumSnr: 1 })) {
      expect(logClosureAmplitude(quadrangle, data.re, data.im)).toBe(0);
    }
  });
});
