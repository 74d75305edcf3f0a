/** The files of published numbers that lie beside the plates: numbers.json with full precision for programs, and
 *  numbers.tex with one macro per number, rounded for reading. Rounding: stages/formats/drawing/rounding.ts. */

import type { PublishedNumber } from '../ledger/entry.ts';
import { roundedNumber as roundedText, roundNumber } from '../stages/formats/drawing/rounding.ts';
import { texComment, texMacroNames, texUnit } from './tex.ts';

/** What heads the files: the recipe's name and the run's number in its book. */
export interface NumbersHeading {
  readonly recipe: string;
  readonly run: number;
}

/** Returns numbers.json: recipe, run and every published number as its run entry holds it. */
export function formatNumbersJson(numbers: readonly PublishedNumber[], heading: NumbersHeading): string {
  const { recipe, run } = heading;
  return `${JSON.stringify({ recipe, run, numbers }, null, 2)}\n`;
}

/** Returns numbers.tex, which needs no package and works in text and in mathematics:
 *  `\newcommand{\RingDiameter}{\ensuremath{{42.10}^{+0.83}_{-0.71}\,\mathrm{\mu as}}}`. */
export function formatNumbersTex(numbers: readonly PublishedNumber[], heading: NumbersHeading): string {
  const names = texMacroNames(numbers.map((number) => number.name));
  const lines = numbers.map((number, i) => {
    const comment = texComment(`${number.name}: entry ${number.entry}, ${number.output}, ${number.key}`);
    return `\\newcommand{\\${names[i]}}{\\ensuremath{${texNumber(number)}}}% ${comment}\n`;
  });
  return [
    `% Published numbers of recipe ${texComment(heading.recipe)}, run ${heading.run}. Intervals hold 68 %.\n`,
    ...lines,
  ].join('');
}

/** Returns a number rounded to two significant digits of its uncertainty, as text: the value, the ends of its interval
 *  (null without one), and all in one piece, `42.10 +0.83 −0.71`. */
export function roundedNumber(
  value: number,
  low: number | null,
  high: number | null,
): {
  readonly value: string;
  readonly low: string | null;
  readonly high: string | null;
  readonly text: string;
} {
  const rounded = roundNumber(value, low, high);
  const power = rounded.exponent === 0 ? '' : `e${rounded.exponent}`;
  const end = (text: string | undefined) => (text === undefined ? null : `${text}${power}`);
  return {
    value: `${rounded.value}${power}`,
    low: end(rounded.low),
    high: end(rounded.high),
    text: roundedText(value, low, high),
  };
}

/** A value with as many decimals as `like` shows, and one more. */
export function roundedLike(value: number, like: string): string {
  return value.toFixed(Math.min(6, (like.split('.')[1]?.length ?? 0) + 1));
}

function texNumber({ value, low, high, unit }: PublishedNumber): string {
  const rounded = roundNumber(value, low, high);
  const words = Number.isFinite(value) ? `{${rounded.value}}` : `\\mathrm{${rounded.value}}`;
  const interval = rounded.up === undefined ? '' : `^{+${rounded.up}}_{-${rounded.down}}`;
  const power = rounded.exponent === 0 ? '' : `\\times 10^{${rounded.exponent}}`;
  const written = texUnit(unit);
  return `${words}${interval}${power}${written === '' ? '' : `\\,${written}`}`;
}
