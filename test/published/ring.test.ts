/** Ring measures against the closed form of a blurred thin ring (brightness exp(-(r^2+r0^2)/2s^2) I0(r r0/s^2);
 *  ridge, half-maxima and centre solved with mpmath, peak and centre checked there by an inverse FFT), and the
 *  asymmetry against its definition. */

import { expect, test } from 'vitest';
import { scaledBesselI, thinRingDiameter } from '../../stages/numerics/blurred-ring.ts';
import { measureRing } from '../../stages/numerics/ring.ts';
import { blurredRingImage, UAS } from '../stages/numerics/ring-images.ts';

// diameter, blur, ridge diameter, radial FWHM, centre over ridge; uas.
const TABLE = [
  [42, 10, 41.1131569885504, 10.1146330335936, 6.00501050555228e-5],
  [42, 20, 37.982948468107, 21.7208870012367, 0.278002716384918],
  [20, 8, 18.7231899371464, 8.34627762887491, 0.0939053935581129],
  [50, 5, 49.8186767698694, 5.00918786108231, 2.32397057311953e-29],
] as const;

test.each(TABLE)('measures a ring of %f blurred by %f', (diameter, blur, ridge, width, centre) => {
  const image = blurredRingImage({ nx: 128, pixel: 1, diameter, blur, east: 3.3, north: -2.1 });
  const found = measureRing(image, { centreFraction: 0.005 });
  // The spline of an image sampled at a fifth of the blur errs by 1e-4 of a pixel in places, a ten-thousandth in width.
  expect(found.ring).toBe(true);
  expect(Math.abs(found.diameter / UAS - ridge)).toBeLessThan(1e-3);
  expect(Math.abs((found.width ?? 0) / UAS - width)).toBeLessThan(2e-3);
  expect(Math.abs(found.centralDepression - centre)).toBeLessThan(1e-4);
  expect(Math.abs(found.centreEast / UAS - 3.3)).toBeLessThan(1e-3);
  expect(Math.abs(found.centreNorth / UAS + 2.1)).toBeLessThan(1e-3);
  expect(Math.abs((found.thinRingDiameter ?? 0) / UAS - diameter)).toBeLessThan(2e-3);
});

test('finds no half-maximum inside a ring of 42 blurred by 30', () => {
  const found = measureRing(blurredRingImage({ nx: 128, pixel: 1, diameter: 42, blur: 30 }));
  expect(Math.abs(found.diameter / UAS - 27.7858722546598)).toBeLessThan(1e-3);
  expect(found.width).toBeNull();
  expect(found.thinRingDiameter).toBeNull();
  expect(found.missingInner).toBe(1);
  expect(found.ring).toBe(false);
});

test.each(TABLE)('gives back the thin ring of %f blurred by %f', (diameter, _blur, ridge, width) => {
  expect(Math.abs((thinRingDiameter(ridge, width) ?? 0) / diameter - 1)).toBeLessThan(1e-9);
});

test('agrees with the second-order form of the blurring where the blur is small', () => {
  // Ridge of a thin ring: d - w^2/(4 ln2 d), from the expansion of I1/I0 (Abramowitz and Stegun 9.7.1).
  const blur = 3;
  const ridge = 42 - (blur * blur) / (4 * Math.LN2 * 42);
  expect(Math.abs((thinRingDiameter(ridge, blur) ?? 0) - 42)).toBeLessThan(1e-3);
});

test('gives the modified Bessel functions of the tables', () => {
  // e^-x I0(x) and e^-x I1(x) as in Abramowitz and Stegun, table 9.8; digits from mpmath with 30 digits.
  const table: [number, number, number][] = [
    [1, 0.46575960759364043, 0.2079104153497085],
    [10, 0.12783333716342862, 0.1212626813844556],
    [39.9, 0.06335803550042246, 0.0625589706331623],
    [40.1, 0.06319882471018295, 0.06240576907336814],
    [500, 0.017845706500153168, 0.017827851852898056],
  ];
  for (const [z, i0, i1] of table) {
    const found = scaledBesselI(z);
    expect(Math.abs(found[0] / i0 - 1), `I0(${z})`).toBeLessThan(1e-13);
    expect(Math.abs(found[1] / i1 - 1), `I1(${z})`).toBeLessThan(1e-13);
  }
});

test.each([0, 40, 90, 200, 310])('finds asymmetry 0.2 at a position angle of %d degrees', (angle) => {
  // I(chi) = 1 + 2 b cos(chi - chi0): |integral I e^{i chi}| / integral I = b.
  const image = blurredRingImage({ nx: 96, pixel: 1, diameter: 50, blur: 5, b: 0.2, angle });
  const found = measureRing(image);
  expect(Math.abs(found.asymmetry - 0.2)).toBeLessThan(1e-3);
  const off = found.positionAngleDegrees - angle;
  expect(Math.abs(off - 360 * Math.round(off / 360))).toBeLessThan(0.1);
});
