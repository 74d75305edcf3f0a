/** Identities of geodesy and of the source's elevation. */

import fc from 'fast-check';
import { expect, test } from 'vitest';
import { elevation, geocentric, geodetic } from '../../../stages/numerics/geodesy.ts';

test('goes from geodetic to geocentric and back, poles included', () => {
  fc.assert(
    fc.property(
      fc.double({ min: -3.14, max: 3.14, noNaN: true }),
      fc.double({ min: -Math.PI / 2, max: Math.PI / 2, noNaN: true }),
      fc.double({ min: -500, max: 9000, noNaN: true }),
      (longitude, latitude, height) => {
        const back = geodetic(geocentric({ longitude, latitude, height }));
        expect(Math.abs(back.latitude - latitude)).toBeLessThan(1e-13);
        expect(Math.abs(back.height - height)).toBeLessThan(1e-7);
        // Longitude means less and less towards a pole.
        expect(Math.abs(back.longitude - longitude) * Math.cos(latitude)).toBeLessThan(1e-12);
      },
    ),
    { seed: 5 },
  );
});

test('puts the pole and the equator at the ellipsoid’s axes (WGS84: 6356752.3142 m and 6378137 m)', () => {
  expect(geocentric({ longitude: 0, latitude: 0, height: 0 })).toEqual([6378137, 0, 0]);
  expect(geocentric({ longitude: 0, latitude: Math.PI / 2, height: 0 })[2]).toBeCloseTo(6356752.3142, 4);
});

test('has a source overhead at hour angle 0 when declination is latitude, and the pole at the latitude', () => {
  expect(elevation(0.6, 0.6, 0)).toBeCloseTo(Math.PI / 2, 7);
  expect(elevation(0.6, Math.PI / 2, 1.2)).toBeCloseTo(0.6, 12);
  expect(elevation(0.6, 0, Math.PI / 2)).toBeCloseTo(0, 12);
});
