/** Julian dates, sidereal time and Earth rotation against published values. */

import { describe, expect, test } from 'vitest';
import {
  calendarDate,
  earthRotationAngle,
  gmst1982,
  julianDate,
  mjdOfJulianDate,
  parseUtc,
  SIDEREAL_DEGREES_PER_DAY,
} from '../../stages/numerics/time.ts';

// Meeus, Astronomical Algorithms, 2nd ed., chapter 7, examples 7.a, 7.b and the table of p. 62.
const MEEUS: readonly (readonly [number, number, number, 'gregorian' | 'julian', number])[] = [
  [1957, 10, 4.81, 'gregorian', 2436116.31],
  [333, 1, 27.5, 'julian', 1842713.0],
  [2000, 1, 1.5, 'gregorian', 2451545.0],
  [1999, 1, 1.0, 'gregorian', 2451179.5],
  [1987, 1, 27.0, 'gregorian', 2446822.5],
  [1987, 6, 19.5, 'gregorian', 2446966.0],
  [1988, 1, 27.0, 'gregorian', 2447187.5],
  [1988, 6, 19.5, 'gregorian', 2447332.0],
  [1900, 1, 1.0, 'gregorian', 2415020.5],
  [1600, 1, 1.0, 'gregorian', 2305447.5],
  [1600, 12, 31.0, 'gregorian', 2305812.5],
  [837, 4, 10.3, 'julian', 2026871.8],
  [-123, 12, 31.0, 'julian', 1676496.5],
  [-122, 1, 1.0, 'julian', 1676497.5],
  [-1000, 7, 12.5, 'julian', 1356001.0],
  [-1000, 2, 29.0, 'julian', 1355866.5],
  [-1001, 8, 17.9, 'julian', 1355671.4],
  [-4712, 1, 1.5, 'julian', 0.0],
];

describe('Julian dates (Meeus, chapter 7)', () => {
  test.each(MEEUS)('give %d-%d-%d (%s) as JD %d', (year, month, day, calendar, jd) => {
    expect(Math.abs(julianDate({ year, month, day }, calendar) - jd)).toBeLessThan(1e-6);
  });

  test.each(MEEUS.filter((row) => row[3] === 'gregorian'))(
    'go back to %d-%d-%d',
    (year, month, day, _, jd) => {
      const date = calendarDate(jd);
      expect([date.year, date.month]).toEqual([year, month]);
      expect(Math.abs(date.day - day)).toBeLessThan(1e-6);
    },
  );

  test('have the Unix epoch at JD 2440587.5, MJD 40587 (POSIX; common practice)', () => {
    expect(julianDate({ year: 1970, month: 1, day: 1 })).toBe(2440587.5);
    expect(mjdOfJulianDate(2440587.5)).toBe(40587);
    expect(parseUtc('1970-01-01T00:00:00Z')).toBe(40587);
  });

  test('have J2000.0 at JD 2451545.0, noon of 1 January 2000 (IAU)', () => {
    expect(parseUtc('2000-01-01T12:00:00')).toBe(51544.5);
  });
});

describe('Sidereal time', () => {
  test('is that of Meeus, examples 12.a and 12.b, to 1e-4 s', () => {
    const seconds = (mjd: number) => (gmst1982(mjd) / (2 * Math.PI)) * 86400;
    // 1987 April 10, 0h UT: 13h10m46.3668s; 19h21m UT: 8h34m57.0896s.
    expect(Math.abs(seconds(46895) - (13 * 3600 + 10 * 60 + 46.3668))).toBeLessThan(1e-4);
    expect(Math.abs(seconds(46895.80625) - (8 * 3600 + 34 * 60 + 57.0896))).toBeLessThan(1e-4);
  });

  test('is the IAU SOFA test value of gmst82 at MJD 53736.0, to 1e-12 rad', () => {
    expect(Math.abs(gmst1982(53736) - 1.754174981860675)).toBeLessThan(1e-12);
  });

  test('grows in a day by 360.98564736629 degrees (Meeus eq. 12.4)', () => {
    const grown = ((gmst1982(46896) - gmst1982(46895)) * 180) / Math.PI + 360;
    // The next term of the equation is 0.000388 T² degrees, 3e-9 degrees a day in 1987.
    expect(Math.abs(grown - SIDEREAL_DEGREES_PER_DAY)).toBeLessThan(1e-8);
  });
});

describe('The Earth rotation angle (IERS Conventions 2010, eq. 5.15)', () => {
  test.each([
    // IAU SOFA test value of era00 at MJD 54388.0.
    [54388, 0.4022837240028158],
    // J2000.0: 280.46061837504 degrees, the constant of the equation.
    [51544.5, 4.894961212823757],
    [46895, (197.85628491168 * Math.PI) / 180],
  ])('at MJD %d is %d rad', (mjd, radians) => {
    expect(Math.abs(earthRotationAngle(mjd) - radians)).toBeLessThan(1e-12);
  });
});
