/** Times: RFC 3339. An entry's time has one form, UTC with milliseconds, so that texts sort as the times do; a person
 *  may type any RFC 3339 time, or a date. */

import { badTime } from './problem.ts';

const DAY = 86_400_000;
// RFC 3339 section 5.6. A space for the T, which 5.6 leaves to applications, is not taken.
const DATE_TIME = /^(\d{4})-(\d\d)-(\d\d)T(\d\d):(\d\d):(\d\d)(\.\d+)?(?:Z|([+-])(\d\d):(\d\d))$/i;

/** The form that entries have, `YYYY-MM-DDThh:mm:ss.sssZ`. @throws LedgerProblem outside the years 0000 to 9999. */
export function formatTime(date: Date): string {
  const text = Number.isNaN(date.getTime()) ? 'no time' : date.toISOString();
  if (!isTime(text)) throw badTime(text, 'a time between the years 0000 and 9999');
  return text;
}

/** Whether a text is a time in exactly the form that entries have. Leap seconds have no such form. */
export function isTime(text: string): boolean {
  // Every month has these days; the calendar is asked for the others only.
  if (/^\d{4}-(0[1-9]|1[0-2])-([01][1-9]|[12]0|2[1-8])T([01]\d|2[0-3]):[0-5]\d:[0-5]\d\.\d{3}Z$/.test(text))
    return true;
  if (!/^\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d\.\d{3}Z$/.test(text)) return false;
  const milliseconds = Date.parse(text);
  return !Number.isNaN(milliseconds) && new Date(milliseconds).toISOString() === text;
}

/** Milliseconds since 1970 of any RFC 3339 date-time. A leap second counts as the second after it.
 *  @throws LedgerProblem 'bad-call' when it is none. */
export function parseTime(text: string): number {
  const parts = DATE_TIME.exec(text);
  if (parts === null) throw badTime(text, 'a time such as 2026-03-01T12:00:00Z');
  const [year, month, day, hour, minute, second] = parts.slice(1, 7).map(Number) as number[];
  const start = Date.parse(`${parts[1]}-${parts[2]}-${parts[3]}T00:00:00.000Z`);
  const offsetHours = Number(parts[9] ?? 0);
  const offsetMinutes = Number(parts[10] ?? 0);
  const exists = !Number.isNaN(start) && new Date(start).getUTCDate() === day && month >= 1 && year >= 0;
  if (!(exists && hour <= 23 && minute <= 59 && second <= 60 && offsetHours <= 23 && offsetMinutes <= 59)) {
    throw badTime(text, 'a time of the calendar');
  }
  const sign = parts[8] === '-' ? 1 : -1;
  const seconds = hour * 3600 + minute * 60 + second + sign * (offsetHours * 3600 + offsetMinutes * 60);
  const time = start + seconds * 1000 + Math.floor(Number(`0${parts[7] ?? ''}`) * 1000);
  if (second === 60 && !endsMonth(time)) throw badTime(text, 'a leap second at the end of a month in UTC');
  return time;
}

/** The beginning of a time's spelling as entries have it, for comparing by text: a date stays a date.
 *  @throws LedgerProblem 'bad-call'. */
export function timeBound(text: string): string {
  if (/^\d{4}-\d\d-\d\d$/.test(text)) {
    parseTime(`${text}T00:00:00Z`);
    return text;
  }
  return formatTime(new Date(parseTime(text)));
}

// RFC 3339 section 5.7: leap seconds come at the end of a month, 23:59:60 UTC.
function endsMonth(time: number): boolean {
  const second = time - (time % 1000);
  return second % DAY === 0 && new Date(second).getUTCDate() === 1;
}
