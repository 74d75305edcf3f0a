/** Choices that every format shares: channels with their middle frequency, stations, times. */

import { InputProblem } from '../problem.ts';
import type { Choices } from './choices.ts';

export const LIGHT_SPEED = 299792458;

/** Channels farther apart than this fraction of their frequency are not averaged: (u,v) of the outer ones would be off
 *  by half of it. */
const WIDEST_SPAN = 0.05;

/** Middle frequency and summed width of channels that are averaged together.
 *  @throws InputProblem when they lie too far apart. */
export function middleOf(
  frequencies: readonly number[],
  widths: readonly number[],
  place: string,
): { frequencyHz: number; bandwidthHz: number } {
  let sum = 0;
  let width = 0;
  let least = Number.POSITIVE_INFINITY;
  let most = 0;
  for (const [k, frequency] of frequencies.entries()) {
    sum += frequency;
    width += widths[k];
    least = Math.min(least, frequency);
    most = Math.max(most, frequency);
  }
  const frequencyHz = sum / frequencies.length;
  if (!(most - least <= WIDEST_SPAN * frequencyHz)) {
    throw new InputProblem({
      code: 'wide-band',
      place,
      expected: `channels within ${100 * WIDEST_SPAN} % of their frequency, to be averaged together`,
      found: `${least} Hz to ${most} Hz`,
      advice:
        'Choose fewer with the parameters bands and channels, and ingest the others in stages of their own.',
    });
  }
  return { frequencyHz, bandwidthHz: width };
}

/** Indices from 0 of the numbers chosen (from 1), in rising order; all when nothing was chosen.
 *  @throws InputProblem for a number that the file does not have. */
export function chosenNumbers(
  chosen: readonly number[] | undefined,
  count: number,
  what: 'bands' | 'channels',
): number[] {
  if (chosen === undefined) return Array.from({ length: count }, (_, k) => k);
  const wrong = chosen.find((number) => !(number >= 1 && number <= count));
  if (wrong !== undefined) {
    throw new InputProblem({
      code: 'no-such-channel',
      place: `parameter ${what}`,
      expected: `numbers from 1 to ${count}, the ${what} of the file`,
      found: `${wrong}`,
      advice: `Correct the parameter ${what}.`,
    });
  }
  return [...new Set(chosen)].sort((a, b) => a - b).map((number) => number - 1);
}

/** Which of the stations are left out. Numbers of stations that the table lacks are left to the caller.
 *  @throws InputProblem for a name that is no station's. */
export function leftOut(names: readonly string[], choices: Choices): Set<string> {
  const out = new Set(choices.leaveOut.map((name) => name.trim()));
  for (const name of out) {
    if (names.includes(name) || /^\d+$/.test(name)) continue;
    throw new InputProblem({
      code: 'no-such-station',
      place: 'parameter leaveOut',
      expected: `stations of the file: ${names.join(', ')}`,
      found: JSON.stringify(name),
      advice: 'Correct the name.',
    });
  }
  return out;
}

/** A predicate for times by the parameters fromMjd, toMjd, fromHours and toHours. Hours count from 0 h of the day of
 *  the first row.  @throws InputProblem when both kinds are given for one end, or the range is empty. */
export function timeRange(choices: Choices, firstMjd: number): (mjd: number) => boolean {
  const end = (name: 'from' | 'to', otherwise: number) => {
    const mjd = choices[`${name}Mjd`];
    const hours = choices[`${name}Hours`];
    if (mjd !== undefined && hours !== undefined) {
      throw badRange(`parameter ${name}Mjd`, `either ${name}Mjd or ${name}Hours`, 'both');
    }
    if (hours !== undefined) return Math.floor(firstMjd) + hours / 24;
    return mjd ?? otherwise;
  };
  const from = end('from', Number.NEGATIVE_INFINITY);
  const to = end('to', Number.POSITIVE_INFINITY);
  if (!(from <= to))
    throw badRange('parameters of the time range', 'a start before the end', `MJD ${from} to ${to}`);
  return (mjd) => mjd >= from && mjd <= to;
}

function badRange(place: string, expected: string, found: string): InputProblem {
  return new InputProblem({
    code: 'bad-time-range',
    place,
    expected,
    found,
    advice: 'Correct the time range.',
  });
}
