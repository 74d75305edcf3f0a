/** Calendar, Julian dates and sidereal time. Dates are UTC; UT1 is taken as UTC (CONVENTIONS).
 *
 *  Julian date: Meeus, Astronomical Algorithms, 2nd ed., chapter 7. Mean sidereal time of Greenwich: IAU 1982 (Aoki et
 *  al. 1982, Astron. Astrophys. 105, 359; Meeus chapter 12). Earth rotation angle: IERS Conventions (2010), eq. 5.15. */

const DAY_SECONDS = 86400;
const MJD_ZERO = 2400000.5;
const J2000 = 2451545;
const TURN = 2 * Math.PI;

/** Degrees by which the mean sidereal time of Greenwich grows in a day of UT1 (Meeus eq. 12.4, linear term). */
export const SIDEREAL_DEGREES_PER_DAY = 360.98564736629;

export interface CalendarDate {
  readonly year: number;
  /** 1 to 12. */
  readonly month: number;
  /** With its fraction, from 1. */
  readonly day: number;
}

/** Julian date of a calendar date; years count astronomically (the year before 1 is 0). Meeus eq. 7.1. */
export function julianDate(date: CalendarDate, calendar: 'gregorian' | 'julian' = 'gregorian'): number {
  const early = date.month <= 2;
  const year = early ? date.year - 1 : date.year;
  const month = early ? date.month + 12 : date.month;
  const century = Math.floor(year / 100);
  const correction = calendar === 'gregorian' ? 2 - century + Math.floor(century / 4) : 0;
  return (
    Math.floor(365.25 * (year + 4716)) + Math.floor(30.6001 * (month + 1)) + date.day + correction - 1524.5
  );
}

/** Gregorian date of a Julian date, from 1582 on. Meeus, chapter 7, the inverse of eq. 7.1. */
export function calendarDate(jd: number): CalendarDate {
  const whole = Math.floor(jd + 0.5);
  const century = Math.floor((whole - 1867216.25) / 36524.25);
  const b = whole + 1 + century - Math.floor(century / 4) + 1524;
  const c = Math.floor((b - 122.1) / 365.25);
  const d = Math.floor(365.25 * c);
  const e = Math.floor((b - d) / 30.6001);
  const month = e < 14 ? e - 1 : e - 13;
  return {
    year: month > 2 ? c - 4716 : c - 4715,
    month,
    day: b - d - Math.floor(30.6001 * e) + (jd + 0.5 - whole),
  };
}

export function mjdOfJulianDate(jd: number): number {
  return jd - MJD_ZERO;
}

export function julianDateOfMjd(mjd: number): number {
  return mjd + MJD_ZERO;
}

const UTC_TEXT = /^(\d{4})-(\d{2})-(\d{2})T(\d{2}):(\d{2}):(\d{2}(?:\.\d+)?)Z?$/;

/** MJD of a date and time such as `2031-04-07T21:30:00Z` (ISO 8601, UTC, the Z may be missing); undefined when the
 *  text is anything else or names no existing day or time. Resolution about a microsecond. */
export function parseUtc(text: string): number | undefined {
  const match = UTC_TEXT.exec(text);
  if (match === null) return undefined;
  const [year, month, day, hour, minute, second] = match.slice(1).map(Number);
  if (!(year >= 1583 && hour <= 23 && minute <= 59 && second < 60)) return undefined;
  const midnight = julianDate({ year, month, day });
  const back = calendarDate(midnight);
  if (back.month !== month || back.day !== day) return undefined;
  return mjdOfJulianDate(midnight) + (hour * 3600 + minute * 60 + second) / DAY_SECONDS;
}

/** `2031-04-07` for the day in which a MJD lies. */
export function formatDate(mjd: number): string {
  const { year, month, day } = calendarDate(julianDateOfMjd(Math.floor(mjd)));
  const pad = (value: number, width: number) => `${Math.round(value)}`.padStart(width, '0');
  return `${pad(year, 4)}-${pad(month, 2)}-${pad(day, 2)}`;
}

/** Greenwich mean sidereal time, IAU 1982, radians in [0, 2π), for a MJD of UT1. */
export function gmst1982(mjd: number): number {
  const t = (mjd - (J2000 - MJD_ZERO)) / 36525;
  const dayFraction = mjd - Math.floor(mjd);
  const atMidnight = 24110.54841 + (8640184.812866 + (0.093104 - 6.2e-6 * t) * t) * t;
  // The polynomial holds at midnight; read at any time, its linear term is the excess of the sidereal rate over one
  // turn a day, so adding the solar time since midnight completes it.
  return positiveTurn(((atMidnight + dayFraction * DAY_SECONDS) / DAY_SECONDS) * TURN);
}

/** Earth rotation angle, radians in [0, 2π), for a MJD of UT1. */
export function earthRotationAngle(mjd: number): number {
  const days = mjd - (J2000 - MJD_ZERO);
  const fraction = mjd - Math.floor(mjd);
  // Tu + 1/2 is an integer plus the fraction of the day since midnight: whole turns are left out before adding.
  return positiveTurn(TURN * (fraction - 0.5 + 0.779057273264 + 0.00273781191135448 * days));
}

function positiveTurn(radians: number): number {
  const rest = radians - TURN * Math.floor(radians / TURN);
  return rest >= TURN ? 0 : rest;
}
