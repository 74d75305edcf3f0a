/** Units against outside values. */

import { describe, expect, test } from 'vitest';
import { convert, isUnit } from '../../stages/units.ts';

// What a general units library accepts and rejects as VOUnits 1.0 (IVOA Recommendation 2014-05-23): astropy 5.2.1,
// format "vounit".
const accepted = [
  ...[
    'Jy',
    'mJy',
    'uJy',
    'arcsec',
    'marcsec',
    'uarcsec',
    'mas',
    'arcmin',
    'deg',
    'rad',
    'urad',
    's',
    'min',
    'h',
  ],
  ...['d', 'yr', 'Hz', 'MHz', 'GHz', 'K', 'm', 'km', 'mm', 'um', 'nm', 'W', 'sr', 'pc', 'kpc', 'Mpc', 'AU'],
  ...[
    'solMass',
    'mag',
    'beam',
    'Jy/beam',
    'mJy/beam',
    'Jy.sr**-1',
    'W.m**-2.Hz**-1',
    'km/s',
    'm.s**-1',
    'Jy**2',
  ],
  ...['10**-26W', 'sqrt(Hz)', 'Ohm', ''],
];
const rejected = [
  ...[
    'jy',
    'Sec',
    'GHZ',
    'ghz',
    'Jy per beam',
    'Jy/beam/sr',
    'arcsecond',
    'degree',
    'uv',
    'hr',
    'microarcsec',
  ],
  ...['μas', 'µas'],
  // One `/` in all, whatever the brackets (VOUnits 1.0, section 2.3).
  ...['(W/m**2)/Hz', 'W/(m/s)'],
];

// SI brochure, 9th edition; IAU 2012 B2 (au), IAU 2015 B2 (pc); computed with 30 digits by a library of arbitrary
// precision and given to 18 to 21.
const factors: readonly (readonly [value: number, from: string, to: string, expected: string])[] = [
  [1, 'deg', 'rad', '0.0174532925199432958'],
  [1, 'arcmin', 'rad', '0.000290888208665721596'],
  [1, 'arcsec', 'rad', '4.84813681109535994e-6'],
  [1, 'mas', 'rad', '4.84813681109535994e-9'],
  [1, 'uas', 'rad', '4.84813681109535994e-12'],
  [1, 'uarcsec', 'rad', '4.84813681109535994e-12'],
  [1, 'rad', 'uas', '206264806247.096355'],
  [1, 'rad', 'arcsec', '206264.806247096355'],
  [1, 'd', 's', '86400'],
  [1, 'a', 's', '31557600'],
  [1, 'yr', 's', '31557600'],
  [1, 'Jy', 'W.m**-2.Hz**-1', '1e-26'],
  [1, 'AU', 'm', '149597870700'],
  [1, 'pc', 'm', '30856775814913672.8'],
  [1, 'hPa', 'Pa', '100'],
  [1, 'GHz', 'Hz', '1e9'],
  [1, 'h', 's', '3600'],
  // Quotients within 1e-11 of a tie between two doubles; the nearest by Python's fractions module.
  [38304028719947, 'm', 'AU', '256.04661711235843'],
  [4820728124209, 'm', 'AU', '32.224577139044804'],
  // GM_sun 1.3271244e20 (IAU 2015 B3 nominal) over G 6.67430e-11 (CODATA 2018), to the digits given.
  [1, 'solMass', 'kg', '1.9884098707e30'],
];

describe('units', () => {
  test.each(accepted)('accepts `%s`', (unit) => expect(isUnit(unit)).toBe(true));

  test.each(rejected)('rejects `%s`', (unit) => expect(isUnit(unit)).toBe(false));

  // VOUnits 1.0, table of known units: these time and angle units take no prefix (from memory).
  test.each(['kmin', 'mh', 'kd', 'mdeg', 'karcmin'])('rejects the prefix of `%s`', (unit) => {
    expect(isUnit(unit)).toBe(false);
  });

  // uas is no unit of the standard: the trade writes it so (common practice).
  test('accepts `uas` besides the standard', () => expect(isUnit('uas')).toBe(true));

  // Every factor is rounded once, so the nearest double to the exact value is demanded, not a tolerance.
  test.each(factors)('converts %d %s to %s as %s', (value, from, to, expected) => {
    expect(convert(value, from, to)).toBe(Number(expected));
  });
});
