/** Geodetic and geocentric places and elevations against published values. */

import { expect, test } from 'vitest';
import { elevation, geocentric, geodetic } from '../../stages/numerics/geodesy.ts';

const DEGREE = Math.PI / 180;

test('puts the place of the IAU SOFA test of gd2gc (WGS84, 3.1, -0.5, 2500 m) where it says', () => {
  const xyz = geocentric({ longitude: 3.1, latitude: -0.5, height: 2500 });
  const published = [-5599000.557704994, 233011.672234792, -3040909.470698336];
  xyz.forEach((value, axis) => {
    expect(Math.abs(value - (published[axis] as number))).toBeLessThan(1e-7);
  });
});

test('puts the worked example of IOGP Guidance Note 7-2 (EPSG 9602) where it says, to its last digit', () => {
  const xyz = geocentric({
    latitude: (53 + 48 / 60 + 33.82 / 3600) * DEGREE,
    longitude: (2 + 7 / 60 + 46.38 / 3600) * DEGREE,
    height: 73,
  });
  const published = [3771793.968, 140253.342, 5124304.349];
  // The same formula in 40 digits.
  const exact = [3771793.96764178, 140253.341899613, 5124304.34935054];
  xyz.forEach((value, axis) => {
    expect(Math.abs(value - (published[axis] as number))).toBeLessThan(1e-3);
    expect(Math.abs(value - (exact[axis] as number))).toBeLessThan(1e-6);
  });
});

test('goes back from the published geocentric place of the same example', () => {
  const place = geodetic([3771793.968, 140253.342, 5124304.349]);
  expect(Math.abs(place.latitude / DEGREE - (53 + 48 / 60 + 33.82 / 3600))).toBeLessThan(1e-8);
  expect(Math.abs(place.longitude / DEGREE - (2 + 7 / 60 + 46.38 / 3600))).toBeLessThan(1e-8);
  expect(Math.abs(place.height - 73)).toBeLessThan(1e-3);
});

test('gives the altitude of Meeus, Astronomical Algorithms, 2nd ed., example 13.b, to 1e-4 degrees', () => {
  const altitude = elevation((38 + 55 / 60 + 17 / 3600) * DEGREE, -6.719892 * DEGREE, 64.352133 * DEGREE);
  expect(Math.abs(altitude / DEGREE - 15.1249)).toBeLessThan(1e-4);
});
