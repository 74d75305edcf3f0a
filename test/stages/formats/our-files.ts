/** One file of each format with invented content, as our writers write it. An independent reader has looked at exactly
 *  these bytes: test/data/scripts/verify-ours.py. */

import { memorySink } from '../../../stages/bytes.ts';
import type { Basis, Posterior, SkyImage, Visibilities } from '../../../stages/data.ts';
import { writeBasis } from '../../../stages/formats/basis.ts';
import { appendGroupsHdu } from '../../../stages/formats/fits/groups.ts';
import { appendImageHdu } from '../../../stages/formats/fits/image.ts';
import { appendEmptyPrimary, appendTableHdu } from '../../../stages/formats/fits/table.ts';
import { writePosterior } from '../../../stages/formats/posterior.ts';
import { startSkyCube, writeSkyImage } from '../../../stages/formats/sky-image.ts';
import { writeVisibilities } from '../../../stages/formats/visibilities-write.ts';

export const microarcsec = Math.PI / 648_000_000_000;

const ramp = (n: number, step = 1, from = 0) => Float64Array.from({ length: n }, (_, i) => from + i * step);

export const image: SkyImage = { nx: 5, ny: 4, pixelRadians: 2.5 * microarcsec, pixels: ramp(20, 0.125) };

export const basis: Basis = {
  nx: 3,
  ny: 2,
  pixelRadians: 4 * microarcsec,
  resolutionRadians: 15 * microarcsec,
  mean: ramp(6, 0.1),
  components: [ramp(6, -0.25), ramp(6, 1, -2)],
  eigenvalues: Float64Array.of(3.5, 1.25),
  totalVariance: 5.1,
  scores: ramp(6, 0.3),
  families: ['ring', 'disc', 'a family with a rather long name'],
};

export const posterior: Posterior = {
  count: 3,
  components: 2,
  flux: Float64Array.of(0.5, 0.6, 0.7),
  coefficients: ramp(6, 0.01),
};

export const visibilities: Visibilities = {
  target: { name: 'LANTERN', raDegrees: 187.70593, decDegrees: 12.39112 },
  arrayName: 'INVENTED',
  remark:
    'Invented data: a synthetic observation whose remark is long enough that it needs more than a single card.',
  stations: [
    { name: 'AA', xyz: [1234567.891, -2345678.912, 3456789.123] },
    { name: 'BB', xyz: [-5000000.5, 1000000.25, 3800000.125] },
    { name: 'STATION-OF-A-LONG-NAME', xyz: [0, 0, -6356752.3] },
  ],
  wavelengthMetres: 0.0013034454695652173,
  bandwidthMetres: 1.1e-5,
  count: 3,
  station1: Int32Array.of(0, 0, 1),
  station2: Int32Array.of(1, 2, 2),
  scan: Int32Array.of(0, 0, 1),
  timeMjd: Float64Array.of(62000.25, 62000.25, 62000.5),
  integrationSeconds: Float64Array.of(240, 240, 180),
  u: Float64Array.of(1.5e9, -2.25e9, 0),
  v: Float64Array.of(-3.1e9, 4.7e9, 1),
  re: Float64Array.of(0.5, -0.25, 0),
  im: Float64Array.of(-0.125, 0, 0.75),
  sigma: Float64Array.of(0.01, 0.02, 0.03),
  sigmaPhase: Float64Array.of(0.02, 0.08, 0.04),
};

/** Nothing but squared visibilities and triple products; one product has no amplitude, one no phase. */
export const optical: Visibilities = {
  ...visibilities,
  wavelengthMetres: 1.6e-6,
  bandwidthMetres: 1e-7,
  count: 0,
  ...Object.fromEntries(['station1', 'station2', 'scan'].map((key) => [key, new Int32Array(0)])),
  ...Object.fromEntries(
    ['timeMjd', 'integrationSeconds', 'u', 'v', 're', 'im', 'sigma', 'sigmaPhase'].map((key) => [
      key,
      new Float64Array(0),
    ]),
  ),
  squared: {
    count: 2,
    station1: Int32Array.of(0, 2),
    station2: Int32Array.of(1, 0),
    scan: Int32Array.of(0, 1),
    timeMjd: Float64Array.of(62000.25, 62000.5),
    u: Float64Array.of(1.5e7, -2.25e7),
    v: Float64Array.of(-3.1e7, 4.7e7),
    value: Float64Array.of(0.25, -0.0625),
    sigma: Float64Array.of(0.01, 0.125),
  },
  triples: {
    count: 3,
    station1: Int32Array.of(0, 1, 2),
    station2: Int32Array.of(1, 2, 0),
    station3: Int32Array.of(2, 0, 1),
    scan: Int32Array.of(0, 0, 1),
    timeMjd: Float64Array.of(62000.25, 62000.25, 62000.5),
    u1: Float64Array.of(1.5e7, -2.25e7, 1e7),
    v1: Float64Array.of(-3.1e7, 4.7e7, 0),
    u2: Float64Array.of(2e7, 3e7, -4e7),
    v2: Float64Array.of(0, -1e7, 2.5e7),
    amplitude: Float64Array.of(0.125, 0, 0.5),
    sigmaAmplitude: Float64Array.of(0.03125, Number.POSITIVE_INFINITY, 0.25),
    phase: Float64Array.of(-0.5, 3, 0),
    sigmaPhase: Float64Array.of(0.125, 0.25, Number.POSITIVE_INFINITY),
  },
};

function bytes(write: (sink: ReturnType<typeof memorySink>) => void): Uint8Array {
  const sink = memorySink();
  write(sink);
  return sink.bytes().slice();
}

export const ourFiles: Readonly<Record<string, () => Uint8Array>> = {
  'image.fits': () => bytes((sink) => writeSkyImage(sink, image, [['OBJECT', "INVENTED 'LANTERN'"]])),
  'cube.fits': () =>
    bytes((sink) => {
      const cube = startSkyCube(sink, { nx: 5, ny: 4, count: 2, pixelRadians: image.pixelRadians });
      cube.plane(image.pixels);
      cube.plane(ramp(20, -0.5));
      cube.end();
    }),
  'basis.fits': () => bytes((sink) => writeBasis(sink, basis)),
  'posterior.fits': () => bytes((sink) => writePosterior(sink, posterior)),
  'visibilities.fits': () => bytes((sink) => writeVisibilities(sink, visibilities)),
  'optical.fits': () => bytes((sink) => writeVisibilities(sink, optical)),
  'forms.fits': () =>
    bytes((sink) => {
      appendEmptyPrimary(sink);
      appendTableHdu(sink, {
        extname: 'FORMS',
        rows: 2,
        columns: [
          { name: 'FLAG', form: '3L', values: [1, 0, 1, 0, 0, 1] },
          { name: 'BYTE', form: '1B', values: [0, 255] },
          { name: 'SHORT', form: '1I', values: [-32768, 32767] },
          { name: 'LONG', form: '2J', values: [1, -2, 3, -2147483648] },
          { name: 'BIG', form: '1K', values: [-9007199254740991, 5] },
          { name: 'TEXT', form: '5A', values: ['ab', "c'd e"] },
          { name: 'SINGLE', form: '1E', values: [0.25, -1.5e20] },
          { name: 'DOUBLE', form: '2D', values: [0.1, 0.2, -1e-300, 1e300] },
          { name: 'COMPLEX', form: '1M', values: [1, -2, 0.5, 0.25] },
        ],
      });
      appendImageHdu(sink, { shape: [3], bitpix: 16, data: [[-5, 0, 300]], first: false });
    }),
  'groups.fits': () =>
    bytes((sink) =>
      appendGroupsHdu(sink, {
        parameters: [
          { name: 'UU---SIN', scale: 0.5, zero: 0 },
          { name: 'DATE', scale: 1, zero: 2460000.5 },
        ],
        axes: [
          { ctype: 'COMPLEX', n: 3, crval: 1, crpix: 1, cdelt: 1 },
          { ctype: 'STOKES', n: 1, crval: -1, crpix: 1, cdelt: -1 },
        ],
        count: 2,
        blocks: [
          {
            count: 2,
            parameters: [
              [4, 5],
              [2460000.75, 2460001],
            ],
            data: [1, 2, 3, 4, 5, 6],
          },
        ],
      }),
    ),
};
