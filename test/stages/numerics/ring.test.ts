/** Ring measures: identities (turning, shifting, scaling an image), a slow minimisation of the scatter, a direct integral
 *  for the centre, and images that are no ring. */

import fc from 'fast-check';
import { expect, test } from 'vitest';
import { measureRing } from '../../../stages/numerics/ring.ts';
import { makeSplineImage, splineCeiling, splineValue } from '../../../stages/numerics/spline-image.ts';
import { blurredRingImage, imageOf, UAS } from './ring-images.ts';

const CRESCENT = { nx: 80, pixel: 2, diameter: 42, blur: 12, b: 0.3 };

test('turns with the image', () => {
  const still = measureRing(blurredRingImage({ ...CRESCENT, angle: 30 }));
  for (const turn of [45, 130, 290]) {
    const turned = measureRing(blurredRingImage({ ...CRESCENT, angle: 30 + turn }));
    // The grid does not turn with the image: the spline's error, 1e-3 of a pixel.
    expect(Math.abs(turned.diameter / still.diameter - 1)).toBeLessThan(1e-4);
    expect(Math.abs((turned.width ?? 0) / (still.width ?? 1) - 1)).toBeLessThan(1e-3);
    expect(Math.abs(turned.asymmetry - still.asymmetry)).toBeLessThan(1e-3);
    const moved = (turned.positionAngleDegrees - still.positionAngleDegrees + 360) % 360;
    expect(Math.abs(moved - turn)).toBeLessThan(0.2);
  }
});

test('turns exactly with the pixels by a quarter', () => {
  const image = blurredRingImage({ ...CRESCENT, angle: 30, east: 5, north: 3 });
  const { nx, pixels } = image;
  // A quarter turn from north to east: what lay at (east, north) lies at (north, -east).
  const turned = pixels.map((_, k) => {
    const [i, j] = [k % nx, Math.floor(k / nx)];
    return pixels[(nx - 1 - i) * nx + j];
  });
  const still = measureRing(image);
  const moved = measureRing({ ...image, pixels: turned });
  expect(moved.positionAngleDegrees - still.positionAngleDegrees).toBeCloseTo(90, 6);
  expect(moved.centreEast / UAS).toBeCloseTo(still.centreNorth / UAS, 6);
  expect(moved.centreNorth / UAS).toBeCloseTo(-still.centreEast / UAS, 6);
});

test('does not depend on place, brightness or pixel size', () => {
  const still = measureRing(blurredRingImage({ ...CRESCENT, angle: 200 }));
  const moved = measureRing(blurredRingImage({ ...CRESCENT, angle: 200, east: -17.3, north: 9.1 }));
  expect(Math.abs(moved.diameter / still.diameter - 1)).toBeLessThan(1e-4);
  expect(Math.abs((moved.centreEast - still.centreEast) / UAS + 17.3)).toBeLessThan(0.02);
  expect(Math.abs((moved.centreNorth - still.centreNorth) / UAS - 9.1)).toBeLessThan(0.02);
  const fine = measureRing(blurredRingImage({ ...CRESCENT, nx: 160, pixel: 1, angle: 200 }));
  expect(Math.abs(fine.diameter / still.diameter - 1)).toBeLessThan(1e-4);
  const image = blurredRingImage({ ...CRESCENT, angle: 200 });
  const bright = measureRing({ ...image, pixels: image.pixels.map((value) => value * 1e6) });
  expect(bright.diameter / still.diameter).toBeCloseTo(1, 9);
  expect(bright.asymmetry).toBeCloseTo(still.asymmetry, 9);
});

test('finds the centre about which the ridge radii scatter least', () => {
  const image = imageOf(64, 64, 2.5, (x, y) => {
    const r = Math.hypot(x - 6, (y + 4) / 0.9);
    return Math.exp(-((r - 21) ** 2) / 60) * (1 + 0.4 * Math.sin(Math.atan2(x - 6, y + 4) - 1));
  });
  const spline = makeSplineImage(image.pixels, 64, 64);
  const scatter = (east: number, north: number) => {
    const radii = Array.from({ length: 72 }, (_, k) => {
      const chi = (2 * Math.PI * k) / 72;
      const steps = Array.from({ length: 800 }, (_, s) => s * 0.05);
      const along = (r: number) =>
        splineValue(
          spline,
          31.5 - (east + r * Math.sin(chi)) / 2.5,
          31.5 + (north + r * Math.cos(chi)) / 2.5,
        );
      return steps.reduce((best, r) => (along(r) > along(best) ? r : best), 0);
    });
    const mean = radii.reduce((a, b) => a + b) / 72;
    return Math.sqrt(radii.reduce((sum, r) => sum + (r - mean) ** 2, 0) / 72);
  };
  const found = measureRing(image);
  const [east, north] = [found.centreEast / UAS, found.centreNorth / UAS];
  const least = scatter(east, north);
  for (const [dx, dy] of [
    [0.7, 0],
    [-0.7, 0],
    [0, 0.7],
    [0, -0.7],
  ]) {
    expect(scatter(east + dx, north + dy)).toBeGreaterThan(least);
  }
});

test('takes the mean brightness within a quarter of the radius over that of the ridge', () => {
  const found = measureRing(blurredRingImage({ nx: 120, pixel: 1, diameter: 42, blur: 20 }));
  // Direct integral of the closed form over the disc; ridge radius and brightness from the published table.
  const s = 20 / 2.354820045030949;
  const i0 = (x: number) => {
    let sum = 0;
    for (let k = 0; k < 2000; k++) sum += Math.exp(x * Math.cos((Math.PI * (k + 0.5)) / 2000));
    return sum / 2000;
  };
  const brightness = (r: number) => Math.exp(-(r * r + 21 * 21) / (2 * s * s)) * i0((r * 21) / (s * s));
  const ridge = 18.9914742340535;
  const radius = ridge / 4;
  let centre = 0;
  for (let k = 0; k < 500; k++) centre += brightness(radius * Math.sqrt((k + 0.5) / 500)) / 500;
  expect(Math.abs(found.centralDepression - centre / brightness(ridge))).toBeLessThan(1e-3);
});

test.each([
  ['a Gaussian', (x: number, y: number) => Math.exp(-(x * x + y * y) / 400)],
  ['a disc', (x: number, y: number) => 1 / (1 + Math.exp((Math.hypot(x, y) - 21) / 2))],
  [
    'a double',
    (x: number, y: number) =>
      Math.exp(-((x - 20) ** 2 + y * y) / 60) + 0.8 * Math.exp(-((x + 20) ** 2 + y * y) / 60),
  ],
  ['an off-centre spot', (x: number, y: number) => Math.exp(-((x - 25) ** 2 + (y - 10) ** 2) / 100)],
  [
    'a ring around a bright core',
    (x: number, y: number) =>
      Math.exp(-((Math.hypot(x, y) - 24) ** 2) / 30) + 0.8 * Math.exp(-(x * x + y * y) / 60),
  ],
])('says that %s is no ring, and why', (_name, brightness) => {
  const found = measureRing(imageOf(64, 64, 2, brightness));
  expect(found.ring).toBe(false);
  expect(found.reasons.length).toBeGreaterThan(0);
});

test('takes half-maxima above the background', () => {
  const ring = blurredRingImage({ nx: 128, pixel: 1, diameter: 42, blur: 10 });
  const peak = Math.max(...ring.pixels);
  const found = measureRing({ ...ring, pixels: ring.pixels.map((value) => value + peak / 5) });
  expect(Math.abs(found.background / peak - 0.2)).toBeLessThan(1e-3);
  // The ring's own FWHM, of the published table.
  expect(Math.abs((found.width ?? 0) / UAS - 10.1146330335936)).toBeLessThan(0.01);
});

test('sees the axis ratio of a slightly elliptical ridge', () => {
  const image = imageOf(96, 96, 1.5, (x, y) => Math.exp(-((Math.hypot(x / 26, y / 24) - 1) ** 2) * 40));
  // An ellipse has r = mean (1 + e cos 2 chi) to first order in e = (a-b)/(a+b).
  expect(Math.abs(measureRing(image).roundness - 24 / 26)).toBeLessThan(0.005);
});

test('refuses what is no image', () => {
  const image = blurredRingImage({ ...CRESCENT, angle: 0 });
  const dark = { ...image, pixels: image.pixels.map(() => -1) };
  const broken = { ...image, pixels: image.pixels.map((value, k) => (k === 7 ? Number.NaN : value)) };
  expect(() => measureRing(dark)).toThrow('measureRing: no pixel is brighter than zero');
  expect(() => measureRing(broken)).toThrow('measureRing: a pixel is not a finite number');
  expect(() => measureRing({ ...image, ny: 3 })).toThrow(
    /^measureRing: 6400 pixels of .* rad do not make an image of 80 by 3, at least 8 by 8$/,
  );
});

test('no value of a spline exceeds the ceiling of its place', () => {
  const pixels = fc.array(fc.double({ min: -1, max: 1, noNaN: true }), { minLength: 72, maxLength: 72 });
  fc.assert(
    fc.property(pixels, (values) => {
      const spline = makeSplineImage(Float64Array.from(values), 9, 8);
      for (let row = 0; row <= 7; row += 0.125) {
        for (let column = 0; column <= 8; column += 0.125) {
          if (splineValue(spline, column, row) > splineCeiling(spline, column, row)) return false;
        }
      }
      return spline.ceilings.filter((value) => value < Number.POSITIVE_INFINITY).length === 6 * 5;
    }),
  );
});
