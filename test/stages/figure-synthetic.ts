/** Invented data for the tests of the figures: a noisy crescent as eight stations might see it, a small library basis,
 *  and a posterior around it. All from seeded streams. */

import type { Basis, Posterior, SkyImage, Visibilities } from '../../stages/data.ts';
import { MICROARCSEC } from '../../stages/figure/sky.ts';
import { atan2, cos, exp, sin } from '../../stages/numerics/elementary.ts';
import { randomStream } from '../../stages/numerics/random.ts';

export const PIXEL = 2 * MICROARCSEC;
const N = 64;

/** A ring of Gaussian width with brightness rising to one side; unit flux. */
export function crescent(
  diameterUas: number,
  sigmaUas: number,
  asymmetry: number,
  angle: number,
  flux = 0.62,
): SkyImage {
  const pixels = new Float64Array(N * N);
  let sum = 0;
  for (let j = 0; j < N; j++) {
    for (let i = 0; i < N; i++) {
      const x = ((N - 1) / 2 - i) * 2;
      const y = (j - (N - 1) / 2) * 2;
      const r = Math.sqrt(x * x + y * y);
      const s = (r - diameterUas / 2) / sigmaUas;
      const value = exp(-0.5 * s * s) * (1 + asymmetry * cos(atan2(x, y) - angle));
      pixels[j * N + i] = value;
      sum += value;
    }
  }
  return { nx: N, ny: N, pixelRadians: PIXEL, pixels: pixels.map((value) => (flux * value) / sum) };
}

/** Direct sum, CONVENTIONS: V = sum I exp(-2 pi i (u x + v y)). */
function visibility(image: SkyImage, u: number, v: number): [number, number] {
  let [re, im] = [0, 0];
  for (let j = 0; j < image.ny; j++) {
    for (let i = 0; i < image.nx; i++) {
      const value = image.pixels[j * image.nx + i];
      if (value < 1e-6) continue;
      const x = ((image.nx - 1) / 2 - i) * image.pixelRadians;
      const y = (j - (image.ny - 1) / 2) * image.pixelRadians;
      const phase = -2 * Math.PI * (u * x + v * y);
      re += value * cos(phase);
      im += value * sin(phase);
    }
  }
  return [re, im];
}

/** Visibilities of the crescent over `scans` scans. */
export function inventedVisibilities(image: SkyImage, scans = 16): Visibilities {
  const random = randomStream(7, 'figure-test');
  const names = ['AA', 'BB', 'CC', 'DD', 'EE', 'FF', 'GG', 'HH'];
  const places = names.map((_, k) => {
    const angle = 2.4 * k + 0.3;
    const reach = [0.4, 1.2, 2.1, 2.9, 3.4, 3.9, 4.2, 4.6][k] * 1e9;
    return [reach * cos(angle), 0.8 * reach * sin(angle)];
  });
  const rows: number[][] = [];
  for (let scan = 0; scan < scans; scan++) {
    const turn = (scan / scans - 0.5) * 2.2;
    for (let a = 0; a < 8; a++) {
      for (let b = a + 1; b < 8; b++) {
        if (random.uniform() < 0.12) continue;
        const [dx, dy] = [places[a][0] - places[b][0], places[a][1] - places[b][1]];
        rows.push([
          a,
          b,
          scan,
          dx * cos(turn) - dy * sin(turn),
          0.75 * (dx * sin(turn) + dy * cos(turn)) + 0.35e9,
        ]);
      }
    }
  }
  const count = rows.length;
  const column = (k: number) => Float64Array.from(rows, (row) => row[k]);
  const [re, im] = [new Float64Array(count), new Float64Array(count)];
  const sigma = new Float64Array(count);
  rows.forEach(([, , , u, v], k) => {
    const [vr, vi] = visibility(image, u, v);
    sigma[k] = 0.004 + 0.01 * random.uniform();
    re[k] = vr + sigma[k] * random.normal();
    im[k] = vi + sigma[k] * random.normal();
  });
  return {
    target: { name: 'Lantern nucleus', raDegrees: 187.7, decDegrees: 12.4 },
    arrayName: 'INVENTED',
    remark: 'Invented data',
    stations: names.map((name) => ({ name, xyz: [0, 0, 0] as const })),
    wavelengthMetres: 1.3e-3,
    bandwidthMetres: 1e-5,
    count,
    station1: Int32Array.from(rows, (row) => row[0]),
    station2: Int32Array.from(rows, (row) => row[1]),
    scan: Int32Array.from(rows, (row) => row[2]),
    timeMjd: Float64Array.from(rows, (row) => 60000 + row[2] / 50),
    integrationSeconds: new Float64Array(count).fill(300),
    u: column(3),
    v: column(4),
    re,
    im,
    sigma,
    sigmaPhase: new Float64Array(count).fill(0.1),
  };
}

/** Residuals as fit writes them, with another crescent as model. */
export function inventedResiduals(data: Visibilities, model: SkyImage) {
  const fitted = Array.from(data.u, (u, k) => visibility(model, u, data.v[k]));
  const amplitude = Array.from(data.re, (re, k) => Math.sqrt(re * re + data.im[k] * data.im[k]));
  const { scan, station1, station2 } = data;
  const row = new Map(Array.from(scan, (s, k) => [`${s} ${station1[k]} ${station2[k]}`, k]));
  const phase = (n: number) => atan2(data.im[n], data.re[n]);
  const modelPhase = (n: number) => atan2(fitted[n][1], fitted[n][0]);
  const wrap = (angle: number) => angle - 2 * Math.PI * Math.round(angle / (2 * Math.PI));
  const degrees = 180 / Math.PI;
  const closures: { stations: number[]; scan: number; phase: number; sigma: number; model: number }[] = [];
  for (const s of new Set(scan)) {
    for (let b = 1; b < 8; b++) {
      for (let c = b + 1; c < 8; c++) {
        const rows = [`${s} 0 ${b}`, `${s} ${b} ${c}`, `${s} 0 ${c}`].map((key) => row.get(key));
        if (rows.includes(undefined)) continue;
        const [i, j, k] = rows as number[];
        const variance = [i, j, k].reduce(
          (sum, n) => sum + (data.sigma[n] / amplitude[n]) * (data.sigma[n] / amplitude[n]),
          0,
        );
        if (variance > 2) continue;
        const seen = wrap(phase(i) + phase(j) - phase(k));
        const wanted = wrap(modelPhase(i) + modelPhase(j) - modelPhase(k));
        closures.push({
          stations: [0, b, c],
          scan: s,
          phase: seen,
          sigma: Math.sqrt(variance),
          model: wanted,
        });
      }
    }
  }
  return {
    data: 'closure-phases amplitudes',
    stations: data.stations.map(({ name }) => name),
    visibilities: {
      u: Array.from(data.u),
      v: Array.from(data.v),
      station1: Array.from(station1),
      station2: Array.from(station2),
      scan: Array.from(scan),
      amplitude,
      sigma: Array.from(data.sigma),
      modelAmplitude: fitted.map(([re, im]) => Math.sqrt(re * re + im * im)),
    },
    closurePhases: {
      stations: closures.map(({ stations }) => stations),
      scan: closures.map((closure) => closure.scan),
      phaseDegrees: closures.map((closure) => closure.phase * degrees),
      sigmaDegrees: closures.map(({ sigma }) => sigma * degrees),
      modelDegrees: closures.map((closure) => closure.model * degrees),
      residualDegrees: closures.map((closure) => wrap(closure.phase - closure.model) * degrees),
    },
  };
}

/** A basis whose components are orthonormal Fourier-Gauss patterns, with a falling spectrum. */
export function inventedBasis(count = 24): Basis {
  const mean = crescent(42, 7, 0, 0, 1).pixels;
  const components: Float64Array[] = [];
  for (let k = 0; k < count; k++) {
    const pattern = new Float64Array(N * N);
    const [m, n] = [k % 5, Math.floor(k / 5)];
    for (let p = 0; p < N * N; p++) {
      const x = ((N - 1) / 2 - (p % N)) * 2;
      const y = (Math.floor(p / N) - (N - 1) / 2) * 2;
      const r = Math.sqrt(x * x + y * y);
      pattern[p] = exp((-r * r) / 1400) * cos(m * atan2(x, y) + k) * cos((n + 1) * r * 0.08 + m);
    }
    for (const other of components) subtract(pattern, other);
    const norm = Math.sqrt(dot(pattern, pattern));
    components.push(pattern.map((value) => value / norm));
  }
  const eigenvalues = Float64Array.from({ length: count }, (_, k) => 4e-5 * exp(-0.28 * k));
  const total = eigenvalues.reduce((sum, value) => sum + value, 0);
  return {
    nx: N,
    ny: N,
    pixelRadians: PIXEL,
    resolutionRadians: 15 * MICROARCSEC,
    mean,
    components,
    eigenvalues,
    totalVariance: total * 1.012,
    scores: new Float64Array(6 * count),
    families: ['ring', 'ring', 'disc', 'double', 'crescent', 'crescent'],
  };
}

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0;
  for (let p = 0; p < a.length; p++) sum += a[p] * b[p];
  return sum;
}

function subtract(pattern: Float64Array, other: Float64Array): void {
  const overlap = dot(pattern, other);
  for (let p = 0; p < pattern.length; p++) pattern[p] -= overlap * other[p];
}

/** Draws with independent Gaussian coefficients about fixed means. */
export function inventedPosterior(basis: Basis, count = 600): Posterior {
  const random = randomStream(11, 'figure-test posterior');
  const K = basis.components.length;
  const coefficients = new Float64Array(count * K);
  const middle = Array.from(basis.eigenvalues, (value) => 0.5 * Math.sqrt(value) * random.normal());
  for (let s = 0; s < count; s++) {
    for (let k = 0; k < K; k++) {
      coefficients[s * K + k] = middle[k] + 0.12 * Math.sqrt(basis.eigenvalues[k]) * random.normal();
    }
  }
  const flux = Float64Array.from({ length: count }, () => 0.62 + 0.012 * random.normal());
  return { count, components: K, flux, coefficients };
}
