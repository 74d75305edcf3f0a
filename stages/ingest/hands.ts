/** Which products of the STOKES axis make the chosen polarisation. Codes: FITS Standard 4.0, section 8.6.
 *
 *  Stokes I is the weighted mean of the parallel hands, sigma = 1/sqrt(w1 + w2); with equal weights that is
 *  (RR + LL)/2 (Thompson, Moran & Swenson, 3rd ed., section 4.7). A single hand with weight stands for both, as it does
 *  for a source without circular (or, for linear feeds, linear) polarisation. Two hands that are the same number, bit
 *  for bit, are one measurement of Stokes I that was written twice with half its weight each: the formula then gives its
 *  own value and sigma back (common practice). */

import { STOKES_NAMES } from '../formats/uv-groups.ts';
import { InputProblem } from '../problem.ts';
import type { Choices } from './choices.ts';

const PARALLEL: readonly (readonly string[])[] = [['I'], ['RR', 'LL'], ['XX', 'YY']];

export interface Hands {
  /** Indices along the STOKES axis, one or two. */
  readonly indices: readonly number[];
  readonly names: readonly string[];
}

/** @throws InputProblem when the file lacks what was chosen */
export function chooseHands(codes: readonly number[], choice: Choices['polarisation'], place: string): Hands {
  const names = codes.map((code) => STOKES_NAMES.get(code) ?? `code ${code}`);
  const wanted =
    choice === 'stokes-i' ? PARALLEL.find((hands) => hands.some((hand) => names.includes(hand))) : [choice];
  const found = (wanted ?? []).filter((hand) => names.includes(hand));
  if (found.length === 0) {
    throw new InputProblem({
      code: 'no-such-polarisation',
      place,
      expected: choice === 'stokes-i' ? 'Stokes I or a parallel hand (RR, LL, XX, YY)' : choice,
      found: names.join(', '),
      advice: 'Choose among these with the parameter polarisation.',
    });
  }
  return { indices: found.map((hand) => names.indexOf(hand)), names: found };
}
