/** Closed-form visibilities of models against values computed elsewhere with mpmath. Forms: Thompson, Moran and
 *  Swenson, 3rd ed., ch. 10 and A3; Bracewell, ch. 12 and 13. */

import { expect, test } from 'vitest';
import { centroidOfModel, type Model, makePart, visibilitiesOfModel } from '../../stages/numerics/models.ts';
import {
  blurredRing,
  crescent,
  double,
  ellipticalGaussian,
  thinRing,
  uniformDisc,
} from '../../stages/numerics/named-models.ts';

const UAS = Math.PI / 180 / 3600e6;
const GIGA = 1e9;

function visibility(model: Model, u: number, v: number): [number, number] {
  const re = new Float64Array(1);
  const im = new Float64Array(1);
  visibilitiesOfModel(re, im, model, Float64Array.of(u), Float64Array.of(v));
  return [re[0] as number, im[0] as number];
}

function expectVisibility(model: Model, u: number, v: number, re: number, im: number, tol: number): void {
  const [foundRe, foundIm] = visibility(model, u, v);
  expect(Math.abs(foundRe - re)).toBeLessThanOrEqual(tol);
  expect(Math.abs(foundIm - im)).toBeLessThanOrEqual(tol);
}

// q = u d: disc 2 J1(pi q) / (pi q), ring J0(pi q), Gaussian exp(-(pi q)^2 / (4 ln 2)). Disc and Gaussian confirmed by
// quadrature of the Hankel transform to 1e-15.
test.each([
  [0, 1, 1, 1],
  [0.25, 0.9248502359002264, 0.8516319137048081, 0.8005296497422068],
  [0.5, 0.7217028449034383, 0.4720012157682348, 0.4106858003783625],
  [0.7654797495, 0.4317548070896342, 1.0113905113909802e-10, 0.12420232038820184],
  [1, 0.18119175498741524, -0.30424217764409384, 0.02844714908763649],
  [1.2196698913, -2.2121798018561275e-11, -0.402759395702553, 0.005014600311952831],
  [1.5, -0.11953932916952319, -0.2658572499583245, 0.0003323434966957301],
  [2, -0.06760345897603454, 0.22027690853993445, 6.548698489244716e-7],
  [3, 0.0375022520099991, -0.18121145350892784, 1.2199688439763301e-14],
])('gives disc, ring and Gaussian at u d = %f', (q, disc, ring, gauss) => {
  expectVisibility(uniformDisc(1), q, 0, disc, 0, 1e-14);
  expectVisibility(thinRing(1), 0, q, ring, 0, 1e-14);
  expectVisibility(ellipticalGaussian(1), q * 0.6, q * 0.8, gauss, 0, 1e-14);
});

// Annulus: area-weighted difference of two discs (also by quadrature); blurred ring: J0 times the Gaussian's transform.
test.each([
  [1, 0.8983709698976254, 0.9002839911822428, 0.8927828390405806, 0.874703567580941, 0.9497132954343708],
  [2, 0.625044957284069, 0.6307962841507437, 0.6100344353061704, 0.5853876979487147, 0.8088824030293831],
  [
    4, -0.07961079010710354, -0.07716826155690004, -0.06749935368783964, 0.1174287304371742,
    0.3767553365107218,
  ],
  [
    6, -0.3828585037931729, -0.402750961370347, -0.2980050377979796, 0.008072207601744439,
    -0.001357442364746182,
  ],
  [
    8, -0.1208148614613564, -0.1383992824022683, -0.08101723732321792, 0.0001901504959142598,
    -0.1322578642612955,
  ],
])('gives models of microarcseconds at %f gigawavelengths', (u, annulus, ring, blurred, gauss, disc) => {
  expectVisibility(crescent(48 * UAS, 36 * UAS), u * GIGA, 0, annulus, 0, 1e-12);
  expectVisibility(thinRing(42 * UAS), u * GIGA, 0, ring, 0, 1e-12);
  expectVisibility(blurredRing(42 * UAS, 10 * UAS), u * GIGA, 0, blurred, 0, 1e-12);
  expectVisibility(ellipticalGaussian(40 * UAS), u * GIGA, 0, gauss, 0, 1e-12);
  expectVisibility(uniformDisc(42 * UAS), u * GIGA, 0, disc, 0, 1e-12);
});

// Disc of radius 28 uas less one of 20 uas at (5, -3) uas; confirmed by the transform of 2001 by 2001 pixels to 1.3e-5.
test.each([
  [1, 0, 0.8789777565874013, 0.1508222243689011],
  [0, 1, 0.8716177509879374, -0.0907177693242033],
  [3, 2, -0.09575794906767703, 0.1428777676216874],
  [-3, -2, -0.09575794906767703, -0.1428777676216874],
  [5, -4, -0.2503608146085608, -0.01333238509447377],
])('gives the crescent at (%f, %f) gigawavelengths', (u, v, re, im) => {
  expectVisibility(crescent(56 * UAS, 40 * UAS, 5 * UAS, -3 * UAS), u * GIGA, v * GIGA, re, im, 1e-12);
});

test("finds the crescent's centroid", () => {
  // -Rn^2 (a, b) / (Rp^2 - Rn^2) = (-5.20833333333, 3.125) uas.
  const { x, y } = centroidOfModel(crescent(56 * UAS, 40 * UAS, 5 * UAS, -3 * UAS));
  expect(Math.abs(x / UAS + 5.20833333333)).toBeLessThan(1e-11);
  expect(Math.abs(y / UAS - 3.125)).toBeLessThan(1e-12);
});

// V = (1 + f exp(-2 pi i (u dl + v dm))) / (1 + f), f = 0.4, (30, -15) uas.
test.each([
  [2, 1, 0.7710534031305625, -0.2800180040005267],
  [6, -3, 0.9547198401355877, -0.1543505237698651],
  [0, 0, 1, 0],
])('gives the double at (%f, %f) gigawavelengths', (u, v, re, im) => {
  expectVisibility(double(0.4, 30 * UAS, -15 * UAS), u * GIGA, v * GIGA, re, im, 1e-13);
});

// 50 by 30 uas, position angle 40 degrees from north through east; confirmed by 801 by 801 pixels to 1e-9.
test.each([
  [2, 1, 0.3906321342540826],
  [-1, 3, 0.3263296677230474],
  [4, 0, 0.1237089886814399],
])('gives the elliptical Gaussian at (%f, %f) gigawavelengths', (u, v, re) => {
  const model = ellipticalGaussian(50 * UAS, 30 * UAS, (40 * Math.PI) / 180);
  expectVisibility(model, u * GIGA, v * GIGA, re, 0, 1e-13);
});

test('gives the asymmetric ring', () => {
  // J0(x) - 2 i b1 J1(x) cos(theta - phi0), x = pi u d (Jacobi and Anger), u d = 1.1, b1 = 0.3, phi0 = 0.7,
  // theta = 0.2; confirmed by quadrature to 1e-20. Angles here run from u to v, position angles from v to u.
  const ring: Model = {
    parts: [makePart('ring', { length: 1, asymmetry: 0.3, brightest: Math.PI / 2 - 0.7 })],
    blur: 0,
  };
  const u = 1.1 * Math.cos(0.2);
  const v = 1.1 * Math.sin(0.2);
  expectVisibility(ring, u, v, -0.3736386459163091, -0.08210118753951211, 1e-13);
});

test('gives a point at 10 uas east the phase of van Cittert and Zernike', () => {
  // -2 pi u l = -17.4532925199433 degrees at 1e9 wavelengths: Thompson, Moran and Swenson, 3rd ed., ch. 3; mpmath.
  const [re, im] = visibility({ parts: [makePart('point', { x: 10 * UAS })], blur: 0 }, GIGA, 0);
  expect(Math.abs((Math.atan2(im, re) * 180) / Math.PI + 17.4532925199433)).toBeLessThan(1e-12);
});
