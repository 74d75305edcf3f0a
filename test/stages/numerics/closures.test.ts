/** Identities of closures: what stations do to them, what is left when baselines are missing, wrapping. */

import fc from 'fast-check';
import { Matrix, SingularValueDecomposition } from 'ml-matrix';
import { describe, expect, test } from 'vitest';
import {
  type Closure,
  type ClosureData,
  closurePhase,
  closureSets,
  closureVariance,
  logAmplitudeVariances,
  logClosureAmplitude,
  quadranglesOf,
  scanNumbers,
  trianglesOf,
  wrapPhase,
} from '../../../stages/numerics/closures.ts';
import { randomStream } from '../../../stages/numerics/random.ts';

/** Scans of N stations with random visibilities; `present` says which baseline is there. */
function randomScans(
  seed: number,
  N: number,
  scans: number,
  present: (i: number, j: number, scan: number) => boolean = () => true,
): ClosureData {
  const stream = randomStream(seed, 'closures test');
  const rows: [number, number, number][] = [];
  for (let scan = 0; scan < scans; scan++) {
    for (let i = 0; i < N; i++) {
      for (let j = i + 1; j < N; j++) if (present(i, j, scan)) rows.push([i, j, scan]);
    }
  }
  const column = (f: () => number) => Float64Array.from(rows, f);
  const re = column(() => stream.normal());
  const im = column(() => stream.normal());
  const sigma = column(() => stream.between(0.01, 0.2));
  return {
    count: rows.length,
    station1: Int32Array.from(rows, ([i]) => i),
    station2: Int32Array.from(rows, ([, j]) => j),
    scan: Int32Array.from(rows, ([, , scan]) => scan),
    u: column(() => stream.between(1e9, 8e9)),
    v: column(() => stream.between(1e9, 8e9)),
    re,
    im,
    sigma,
    sigmaPhase: sigma.map((s, k) => s / Math.hypot(re[k] as number, im[k] as number)),
  };
}

/** Rank by elimination with whole pivoting, written apart from the program's. */
function rank(closures: readonly Closure[], columns: number): number {
  const rows = closures.map(({ rows: at, signs }) => {
    const row = new Array<number>(columns).fill(0);
    at.forEach((k, m) => {
      row[k] = (row[k] ?? 0) + (signs[m] ?? 0);
    });
    return row;
  });
  let found = 0;
  for (let column = 0; column < columns; column++) {
    const pivot = rows.findIndex((row, r) => r >= found && Math.abs(row[column] ?? 0) > 1e-9);
    if (pivot < 0) continue;
    [rows[found], rows[pivot]] = [rows[pivot] as number[], rows[found] as number[]];
    const top = rows[found] as number[];
    for (let r = found + 1; r < rows.length; r++) {
      const factor = ((rows[r] as number[])[column] ?? 0) / (top[column] ?? 1);
      rows[r] = (rows[r] as number[]).map((value, c) => value - factor * (top[c] ?? 0));
    }
    found++;
  }
  return found;
}

/** Rank by singular values, from a library that the closures do not use. Singular values of such matrices of 0 and ±1 are
 *  0 or of the order of 1. */
function singularRank(closures: readonly Closure[], columns: number): number {
  if (closures.length === 0) return 0;
  const design = Matrix.zeros(closures.length, columns);
  closures.forEach(({ rows, signs }, r) => {
    rows.forEach((row, m) => {
      design.set(r, row, signs[m]);
    });
  });
  const svd = new SingularValueDecomposition(design, {
    autoTranspose: true,
    computeLeftSingularVectors: false,
    computeRightSingularVectors: false,
  });
  return svd.diagonal.filter((value) => value > 1e-6).length;
}

const anyScan = fc.record({
  seed: fc.integer({ min: 0, max: 1e6 }),
  N: fc.integer({ min: 3, max: 7 }),
  missing: fc.array(fc.tuple(fc.nat(6), fc.nat(6)), { maxLength: 6 }),
});

function withMissing(seed: number, N: number, missing: readonly (readonly number[])[]): ClosureData {
  return randomScans(seed, N, 1, (i, j) => !missing.some(([a, b]) => a === i && b === j));
}

describe('Closures', () => {
  test('do not see the phases and gains of stations', () => {
    fc.assert(
      fc.property(anyScan, ({ seed, N, missing }) => {
        const data = withMissing(seed, N, missing);
        const stream = randomStream(seed, 'station errors');
        const gain = Array.from(
          { length: N },
          () => [stream.between(0.3, 3), stream.between(-3, 3)] as const,
        );
        const re = data.re.slice();
        const im = data.im.slice();
        for (let k = 0; k < data.count; k++) {
          const [g1, p1] = gain[data.station1[k] as number] as readonly [number, number];
          const [g2, p2] = gain[data.station2[k] as number] as readonly [number, number];
          const [c, s] = [g1 * g2 * Math.cos(p1 - p2), g1 * g2 * Math.sin(p1 - p2)];
          re[k] = c * (data.re[k] as number) - s * (data.im[k] as number);
          im[k] = c * (data.im[k] as number) + s * (data.re[k] as number);
        }
        for (const triangle of trianglesOf(data, 0, { minimumSnr: 0 })) {
          const moved = closurePhase(triangle, re, im) - closurePhase(triangle, data.re, data.im);
          expect(Math.abs(wrapPhase(moved))).toBeLessThan(1e-11);
        }
        for (const quadrangle of quadranglesOf(data, 0, { minimumSnr: 0 })) {
          const moved =
            logClosureAmplitude(quadrangle, re, im) - logClosureAmplitude(quadrangle, data.re, data.im);
          expect(Math.abs(moved)).toBeLessThan(1e-11);
        }
      }),
      { numRuns: 60, seed: 1 },
    );
  });

  test('chosen per scan are independent and as many as the rank of all that are present', () => {
    fc.assert(
      fc.property(anyScan, ({ seed, N, missing }) => {
        const data = withMissing(seed, N, missing);
        if (data.count === 0) return;
        const [set] = closureSets(data, { minimumSnr: 0 });
        const triangles = trianglesOf(data, 0, { minimumSnr: 0 });
        const quadrangles = quadranglesOf(data, 0, { minimumSnr: 0 });
        expect(set?.triangles.length).toBe(rank(triangles, data.count));
        expect(rank(set?.triangles ?? [], data.count)).toBe(set?.triangles.length);
        expect(set?.quadrangles.length).toBe(rank(quadrangles, data.count));
        expect(rank(set?.quadrangles ?? [], data.count)).toBe(set?.quadrangles.length);
      }),
      { numRuns: 60, seed: 2 },
    );
  });

  test('of 3 to 12 stations with baselines missing are independent, and as many as singular values of the design matrix', () => {
    const arrays = fc.record({
      seed: fc.integer({ min: 0, max: 1e6 }),
      N: fc.integer({ min: 3, max: 12 }),
      missing: fc.double({ min: 0, max: 0.6, noNaN: true }),
    });
    const seen = new Set<number>();
    fc.assert(
      fc.property(arrays, ({ seed, N, missing }) => {
        const stream = randomStream(seed, 'missing baselines');
        const data = randomScans(seed, N, 1, () => stream.uniform() >= missing);
        if (data.count === 0) return;
        seen.add(N);
        const [set] = closureSets(data, { minimumSnr: 0 });
        for (const [chosen, all] of [
          [set?.triangles ?? [], trianglesOf(data, 0, { minimumSnr: 0 })],
          [set?.quadrangles ?? [], quadranglesOf(data, 0, { minimumSnr: 0 })],
        ]) {
          expect(chosen.length).toBe(singularRank(all, data.count));
          expect(singularRank(chosen, data.count)).toBe(chosen.length);
        }
      }),
      { numRuns: 40, seed: 4 },
    );
    expect([...seen].sort((a, b) => a - b)).toEqual([3, 4, 5, 6, 7, 8, 9, 10, 11, 12]);
  });

  test('scatter with the covariance that is stated, all of it: 6,000 draws of noise', () => {
    // An entry of the sample covariance of n draws has the variance (C_aa C_bb + C_ab²)/n (Wishart; Anderson 1958,
    // section 7.2). The first order in 1/snr errs by 1/snr², below 1 % at 20.
    const N = 5;
    const stream = randomStream(12, 'covariance');
    const still = randomScans(3, N, 1);
    const sigma = still.re.map((re, k) => Math.hypot(re, still.im[k]) / stream.between(20, 60));
    const exact = {
      ...still,
      sigma,
      sigmaPhase: sigma.map((s, k) => s / Math.hypot(still.re[k], still.im[k])),
    };
    const [set] = closureSets(exact, { minimumSnr: 0 });
    const draws = 6000;
    const lists = [
      { closures: set.triangles, covariance: set.phaseCovariance, value: closurePhase },
      { closures: set.quadrangles, covariance: set.logAmplitudeCovariance, value: logClosureAmplitude },
    ];
    const sums = lists.map(({ closures }) => new Float64Array(closures.length * closures.length));
    for (let draw = 0; draw < draws; draw++) {
      const re = still.re.map((value, k) => value + sigma[k] * stream.normal());
      const im = still.im.map((value, k) => value + sigma[k] * stream.normal());
      lists.forEach(({ closures, value }, which) => {
        const d = closures.map((closure) =>
          wrapPhase(value(closure, re, im) - value(closure, still.re, still.im)),
        );
        d.forEach((x, a) => {
          d.forEach((y, b) => {
            sums[which][a * d.length + b] += (x * y) / draws;
          });
        });
      });
    }
    lists.forEach(({ closures, covariance }, which) => {
      const n = closures.length;
      let shared = 0;
      for (let a = 0; a < n; a++) {
        for (let b = 0; b < n; b++) {
          const C = covariance[a * n + b];
          const product = covariance[a * n + a] * covariance[b * n + b];
          expect(Math.abs(sums[which][a * n + b] - C)).toBeLessThan(
            4.5 * Math.sqrt((product + C * C) / draws) + 0.01 * Math.sqrt(product),
          );
          if (a !== b && C !== 0) shared++;
        }
      }
      expect(shared).toBeGreaterThan(0);
    });
  });

  test('chosen have the least sum of variances of all independent sets, seen by trying every set of 5 stations', () => {
    for (let seed = 0; seed < 4; seed++) {
      const data = randomScans(seed, 5, 1);
      const variance = data.sigmaPhase.map((value) => value * value);
      const sum = (list: readonly Closure[]) =>
        list.reduce((s, one) => s + closureVariance(one, variance), 0);
      const [set] = closureSets(data, { minimumSnr: 0 });
      const all = trianglesOf(data, 0, { minimumSnr: 0 });
      let least = Number.POSITIVE_INFINITY;
      for (let mask = 0; mask < 1 << all.length; mask++) {
        const chosen = all.filter((_, k) => mask & (1 << k));
        if (chosen.length === 6 && rank(chosen, data.count) === 6) least = Math.min(least, sum(chosen));
      }
      expect(sum(set?.triangles ?? [])).toBeCloseTo(least, 12);
    }
  });

  test('are chosen anew when a station drops out of a scan', () => {
    const data = randomScans(5, 6, 2, (i, j, scan) => scan === 0 || (i !== 2 && j !== 2));
    const sets = closureSets(data, { minimumSnr: 0 });
    // (N−1)(N−2)/2 and N(N−3)/2 for 6 and 5 stations: common practice.
    expect(sets.map((set) => [set.scan, set.triangles.length, set.quadrangles.length])).toEqual([
      [0, 10, 9],
      [1, 6, 5],
    ]);
  });

  test('leave out weak visibilities and short baselines', () => {
    const data = randomScans(6, 5, 1);
    const weakest = data.sigmaPhase.indexOf(Math.max(...data.sigmaPhase));
    const snr = 1 / (data.sigmaPhase[weakest] as number);
    const used = (sets: readonly { triangles: readonly Closure[]; quadrangles: readonly Closure[] }[]) =>
      new Set(
        sets.flatMap((set) => [...set.triangles, ...set.quadrangles].flatMap((closure) => closure.rows)),
      );
    expect(used(closureSets(data, { minimumSnr: snr * 1.01 })).has(weakest)).toBe(false);
    expect(used(closureSets(data, { minimumSnr: snr * 0.99 })).has(weakest)).toBe(true);
    const lengths = data.u.map((u, k) => Math.hypot(u, data.v[k] as number));
    const shortest = lengths.indexOf(Math.min(...lengths));
    const limit = Math.min(...lengths) * 1.01;
    expect(used(closureSets(data, { minimumSnr: 0, shortestWavelengths: limit })).has(shortest)).toBe(false);
  });

  test('take their own limit for amplitudes', () => {
    const data = randomScans(7, 6, 1);
    const [set] = closureSets(data, { minimumSnr: 0, minimumAmplitudeSnr: 1e9 });
    expect([set?.triangles.length, set?.quadrangles.length]).toEqual([10, 0]);
  });

  test('have a symmetric covariance with the variances on its diagonal', () => {
    const data = randomScans(8, 7, 1);
    const [set] = closureSets(data, { minimumSnr: 0 });
    if (!set) throw new Error('no set');
    const n = set.quadrangles.length;
    const variance = logAmplitudeVariances(data);
    set.quadrangles.forEach((quadrangle, a) => {
      const direct = quadrangle.rows.reduce((sum, row) => sum + (variance[row] as number), 0);
      expect(set.logAmplitudeCovariance[a * n + a]).toBeCloseTo(direct, 12);
      for (let b = 0; b < n; b++) {
        expect(set.logAmplitudeCovariance[a * n + b]).toBe(set.logAmplitudeCovariance[b * n + a]);
      }
    });
  });

  test('refuse a baseline that stands twice in a scan', () => {
    const data = randomScans(9, 3, 1);
    const doubled = { ...data, station1: Int32Array.from([0, 0, 1]), station2: Int32Array.from([1, 1, 2]) };
    expect(() => closureSets(doubled, { minimumSnr: 0 })).toThrow(
      new RangeError('closures: baseline 0-1 stands twice in scan 0'),
    );
  });

  test('come scan by scan in order', () => {
    expect(scanNumbers({ scan: Int32Array.from([2, 0, 2, 10, 1]) })).toEqual([0, 1, 2, 10]);
  });
});

describe('Wrapping', () => {
  test('puts every angle into (−π, π] and moves it by whole turns', () => {
    fc.assert(
      fc.property(fc.double({ min: -100, max: 100, noNaN: true }), (angle) => {
        const wrapped = wrapPhase(angle);
        expect(wrapped).toBeGreaterThan(-Math.PI);
        expect(wrapped).toBeLessThanOrEqual(Math.PI);
        const turns = (angle - wrapped) / (2 * Math.PI);
        expect(Math.abs(turns - Math.round(turns))).toBeLessThan(1e-12);
      }),
      { seed: 3 },
    );
  });

  test('gives π for both π and −π', () => {
    expect([wrapPhase(Math.PI), wrapPhase(-Math.PI), wrapPhase(3 * Math.PI)]).toEqual([
      Math.PI,
      Math.PI,
      Math.PI,
    ]);
  });
});
