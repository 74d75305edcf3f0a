/** Rules of OIFITS that several tables share. */

import { InputProblem } from '../problem.ts';
import type { Column, Table } from './fits/table.ts';

/** The problem of a rule of the standard that the file breaks. */
export function ruleBroken(place: string, expected: string, found: string): InputProblem {
  return new InputProblem({
    code: 'oifits-rule',
    place,
    expected,
    found,
    advice: 'The file breaks a rule of OIFITS: correct it with the program that wrote it.',
  });
}

/** The column, whose rows must hold `repeat` values. @throws InputProblem */
export function exactly(table: Table, name: string, repeat: number): Column {
  const column = table.column(name);
  if (column.repeat === repeat) return column;
  throw ruleBroken(`${table.place}, column ${name}`, `${repeat} values in a row`, `TFORM ${column.form}`);
}

/** @throws InputProblem naming the row of the second of two equal values. */
export function uniqueIn(values: ArrayLike<number | string>, what: string, place: string): void {
  const seen = new Map<number | string, number>();
  for (let row = 0; row < values.length; row++) {
    const value = values[row] as number | string;
    const before = seen.get(value);
    if (before !== undefined) {
      throw ruleBroken(
        place,
        `every ${what} once`,
        `${what} ${value} as number ${before + 1} and ${row + 1}`,
      );
    }
    seen.set(value, row);
  }
}
