/** Invented observations for the tests of `fit`: an array of eight stations that does not exist, a small library with
 *  its components, and data with station phases, gains and noise. Everything from closed forms and slow sums. */

import { EigenvalueDecomposition, Matrix } from 'ml-matrix';
import type { Basis, SkyImage, Visibilities } from '../../../stages/data.ts';
import { randomStream } from '../../../stages/numerics/random.ts';
import { blurredRingImage, imageOf, UAS } from '../numerics/ring-images.ts';

const EARTH = 6371e3;
const WAVELENGTH = 1.3e-3;
/** Name, latitude, east longitude (degrees). The first two stand on one site. */
const STATIONS: [string, number, number][] = [
  ['Alder', -23, -67.8],
  ['Aspen', -23.02, -67.78],
  ['Birch', 19.8, -155.5],
  ['Cedar', 32.7, -109.9],
  ['Elder', 37.1, -3.4],
  ['Hazel', 18.98, -97.3],
  ['Larch', 48, 20],
  ['Rowan', -28, 17],
];

export interface ObservationOptions {
  readonly declination?: number;
  readonly scans?: number;
  /** Jy, of one real component; on all baselines. */
  readonly noise?: number;
  /** Standard deviation of the log gain of every station and scan. */
  readonly gains?: number;
  /** Factors on the gain of stations, by name. */
  readonly badGains?: Readonly<Record<string, number>>;
  readonly stationPhases?: boolean;
  readonly seed?: number;
  /** Jy, seen by the baseline between the first two stations besides the image. */
  readonly extendedFlux?: number;
}

/** Slow sum, from the definition: V(u,v) = sum I exp(-2 pi i (u x + v y)). */
export function slowVisibility(image: SkyImage, u: number, v: number): [number, number] {
  const { nx, ny, pixelRadians, pixels } = image;
  let re = 0;
  let im = 0;
  for (let j = 0; j < ny; j++) {
    for (let i = 0; i < nx; i++) {
      const x = ((nx - 1) / 2 - i) * pixelRadians;
      const y = (j - (ny - 1) / 2) * pixelRadians;
      const phase = -2 * Math.PI * (u * x + v * y);
      re += pixels[j * nx + i] * Math.cos(phase);
      im += pixels[j * nx + i] * Math.sin(phase);
    }
  }
  return [re, im];
}

interface Row {
  readonly a: number;
  readonly b: number;
  readonly scan: number;
  readonly u: number;
  readonly v: number;
}

/** Baselines of stations that see the source above 10 degrees, scan by scan over a day. */
function observedRows(declination: number, scans: number): Row[] {
  const dec = (declination * Math.PI) / 180;
  const xyz = STATIONS.map(([, latitude, longitude]) => {
    const [lat, lon] = [(latitude * Math.PI) / 180, (longitude * Math.PI) / 180];
    return [Math.cos(lat) * Math.cos(lon), Math.cos(lat) * Math.sin(lon), Math.sin(lat)].map(
      (c) => c * EARTH,
    );
  });
  const rows: Row[] = [];
  for (let scan = 0; scan < scans; scan++) {
    // Hour angle of Greenwich; (u, v) of a baseline vector: Thompson, Moran and Swenson, 3rd ed., eq. 4.1.
    const H = -0.3 + (5.2 * scan) / scans;
    const [east, north] = [
      (p: number[]) => Math.sin(H) * p[0] + Math.cos(H) * p[1],
      (p: number[]) =>
        -Math.sin(dec) * Math.cos(H) * p[0] + Math.sin(dec) * Math.sin(H) * p[1] + Math.cos(dec) * p[2],
    ];
    const toward = (p: number[]) =>
      (Math.cos(dec) * Math.cos(H) * p[0] - Math.cos(dec) * Math.sin(H) * p[1] + Math.sin(dec) * p[2]) /
      EARTH;
    const up = xyz.map((p) => toward(p) > Math.sin((10 * Math.PI) / 180));
    for (let a = 0; a < xyz.length; a++) {
      for (let b = a + 1; b < xyz.length; b++) {
        if (!(up[a] && up[b])) continue;
        const difference = xyz[b].map((c, k) => (c - xyz[a][k]) / WAVELENGTH);
        rows.push({ a, b, scan, u: east(difference), v: north(difference) });
      }
    }
  }
  return rows;
}

/** Observes an image. */
export function observe(truth: SkyImage, options: ObservationOptions = {}): Visibilities {
  const { declination = 12, scans = 20, noise = 0.005, gains = 0, badGains = {}, seed = 1 } = options;
  const rows = observedRows(declination, scans);
  const random = randomStream(seed, 'synthetic');
  const station = new Map<string, { logGain: number; phase: number }>();
  for (let scan = 0; scan < scans; scan++) {
    STATIONS.forEach(([name], index) => {
      const logGain = gains * random.normal() + Math.log(badGains[name] ?? 1);
      const phase = options.stationPhases ? random.between(-Math.PI, Math.PI) : 0;
      station.set(`${scan}-${index}`, { logGain, phase });
    });
  }
  const seen = rows.map(({ a, b, scan, u, v }) => {
    const [re, im] = slowVisibility(truth, u, v);
    const extended = u * u + v * v < 1e16 ? (options.extendedFlux ?? 0) : 0;
    const [first, second] = [station.get(`${scan}-${a}`), station.get(`${scan}-${b}`)];
    const gain = Math.exp((first?.logGain ?? 0) + (second?.logGain ?? 0));
    const turn = (first?.phase ?? 0) - (second?.phase ?? 0);
    return {
      re: gain * ((re + extended) * Math.cos(turn) - im * Math.sin(turn)) + noise * random.normal(),
      im: gain * ((re + extended) * Math.sin(turn) + im * Math.cos(turn)) + noise * random.normal(),
    };
  });
  return {
    target: { name: 'Lantern (invented)', raDegrees: 187.7, decDegrees: declination },
    arrayName: 'Arbour (invented)',
    remark: 'invented data',
    stations: STATIONS.map(([name]) => ({ name, xyz: [0, 0, 0] })),
    wavelengthMetres: WAVELENGTH,
    bandwidthMetres: 1e-5,
    count: rows.length,
    station1: Int32Array.from(rows, ({ a }) => a),
    station2: Int32Array.from(rows, ({ b }) => b),
    scan: Int32Array.from(rows, ({ scan }) => scan),
    timeMjd: Float64Array.from(rows, ({ scan }) => 58000 + scan / 100),
    integrationSeconds: new Float64Array(rows.length).fill(300),
    u: Float64Array.from(rows, ({ u }) => u),
    v: Float64Array.from(rows, ({ v }) => v),
    re: Float64Array.from(seen, ({ re }) => re),
    im: Float64Array.from(seen, ({ im }) => im),
    sigma: new Float64Array(rows.length).fill(noise),
    sigmaPhase: Float64Array.from(seen, ({ re, im }) => Math.min(Math.PI, noise / Math.hypot(re, im))),
  };
}

/** Grid of the tests: 160 uas in 40 pixels. */
const GRID = { nx: 40, pixel: 4 };

export function withFlux(image: SkyImage, flux: number): SkyImage {
  const total = image.pixels.reduce((a, b) => a + b);
  return { ...image, pixels: image.pixels.map((value) => (value * flux) / total) };
}

export interface Crescent {
  readonly diameter: number;
  readonly blur: number;
  readonly b: number;
  readonly angle: number;
}

export function crescentImage(crescent: Crescent, pixel = GRID.pixel): SkyImage {
  return withFlux(blurredRingImage({ nx: (GRID.nx * GRID.pixel) / pixel, pixel, ...crescent }), 1);
}

/** Library of crescents, discs, Gaussians and doubles with their centroid at the origin, and its components. */
export function makeLibraryBasis(components: number, images = 500, seed = 7): Basis {
  const random = randomStream(seed, 'library');
  const families = ['crescent', 'disc', 'gaussian', 'double'];
  const members = Array.from({ length: images }, (_, n) => {
    const family = n % 2 === 0 ? 'crescent' : families[1 + ((n >> 1) % 3)];
    return { family, pixels: memberPixels(family, random) };
  });
  return {
    ...componentsOf(
      members.map(({ pixels }) => pixels),
      components,
    ),
    families: members.map(({ family }) => family),
  };
}

function memberPixels(family: string, random: ReturnType<typeof randomStream>): Float64Array {
  const blur = random.between(10, 24);
  if (family === 'crescent') {
    const [diameter, b, angle] = [random.between(22, 62), random.between(0, 0.45), random.between(0, 360)];
    const image = withFlux(blurredRingImage({ ...GRID, diameter, blur, b, angle }), 1);
    const [x, y] = centroid(image);
    const shift = { east: -x, north: -y };
    return withFlux(blurredRingImage({ ...GRID, diameter, blur, b, angle, ...shift }), 1).pixels;
  }
  const s = (family === 'gaussian' ? random.between(20, 60) : blur) / 2.3548;
  const spot = (x: number, y: number) => Math.exp(-(x * x + y * y) / (2 * s * s));
  const turn = random.between(0, Math.PI);
  const [size, ratio] = [random.between(10, 30), random.between(0.3, 1)];
  const shape = {
    gaussian: (x: number, y: number) => {
      const along = (x * Math.sin(turn) + y * Math.cos(turn)) * (0.5 + 0.5 * ratio);
      return spot(along, x * Math.cos(turn) - y * Math.sin(turn));
    },
    disc: (x: number, y: number) => 1 / (1 + Math.exp((Math.hypot(x, y) - size) / (blur / 4))),
    double: (x: number, y: number) => {
      const [dx, dy] = [size * Math.sin(turn), size * Math.cos(turn)];
      const [near, far] = [(2 * ratio) / (1 + ratio), 2 / (1 + ratio)];
      return spot(x - near * dx, y - near * dy) + ratio * spot(x + far * dx, y + far * dy);
    },
  }[family as 'gaussian' | 'disc' | 'double'];
  return withFlux(imageOf(GRID.nx, GRID.nx, GRID.pixel, shape), 1).pixels;
}

/** Centroid, microarcseconds east and north. */
function centroid({ nx, pixels, pixelRadians }: SkyImage): [number, number] {
  let [sum, x, y] = [0, 0, 0];
  pixels.forEach((value, k) => {
    sum += value;
    x += value * ((nx - 1) / 2 - (k % nx));
    y += value * (Math.floor(k / nx) - (nx - 1) / 2);
  });
  return [(x / sum) * (pixelRadians / UAS), (y / sum) * (pixelRadians / UAS)];
}

/** Principal components by the eigenvectors of the matrix of inner products. */
function componentsOf(images: Float64Array[], count: number): Omit<Basis, 'families'> {
  const n = images.length;
  const mean = images[0].map((_, p) => images.reduce((sum, image) => sum + image[p], 0) / n);
  const centred = new Matrix(images.map((image) => Array.from(image, (value, p) => value - mean[p])));
  const gram = centred.mmul(centred.transpose()).div(n - 1);
  const evd = new EigenvalueDecomposition(gram, { assumeSymmetric: true });
  const order = evd.realEigenvalues.map((value, k) => ({ value, k })).sort((a, b) => b.value - a.value);
  const kept = order.slice(0, count);
  const components = kept.map(({ value, k }) => {
    const vector = centred.transpose().mmul(evd.eigenvectorMatrix.getColumnVector(k)).to1DArray();
    return Float64Array.from(vector, (each) => each / Math.sqrt(value * (n - 1)));
  });
  const scores = centred.mmul(new Matrix(components.map((row) => Array.from(row))).transpose());
  return {
    nx: GRID.nx,
    ny: GRID.nx,
    pixelRadians: GRID.pixel * UAS,
    resolutionRadians: 10 * UAS,
    mean,
    components,
    eigenvalues: Float64Array.from(kept, ({ value }) => value),
    totalVariance: order.reduce((sum, { value }) => sum + value, 0),
    scores: Float64Array.from(scores.to1DArray()),
  };
}
