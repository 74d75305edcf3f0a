/** What the formats demand of a column: its shape, and that nothing in it is undefined. */

import { InputProblem, InternalError } from '../problem.ts';
import type { Column } from './fits/table.ts';

/** @throws InputProblem when a row holds another number of values than the rest of the table demands. */
export function requireRepeat(column: Column, repeat: number, place: string): void {
  if (column.repeat === repeat) return;
  throw new InputProblem({
    code: 'wrong-shape',
    place: `${place}, column ${column.name}`,
    expected: `${repeat} values in a row`,
    found: `TFORM ${column.form}`,
    advice: 'The table contradicts the rest of the file: make the file again.',
  });
}

/** The numbers of a column. @throws InputProblem naming the row when one is not finite. */
export function requireFiniteColumn(column: Column, place: string): Float64Array {
  const values = column.numbers();
  const odd = values.findIndex((value) => !Number.isFinite(value));
  if (odd < 0) return values;
  throw new InputProblem({
    code: 'not-finite',
    place: `${place}, column ${column.name}, row ${Math.floor(odd / column.repeat) + 1}`,
    expected: 'a finite number',
    found: `${values[odd]}`,
    advice: 'Give the output of a stage, which holds no undefined values.',
  });
}

/** @throws InternalError when a stage hands over a value that is not finite. */
export function requireFiniteValues(values: Float64Array, where: string): void {
  const odd = values.findIndex((value) => !Number.isFinite(value));
  if (odd >= 0) throw new InternalError(where, `value ${odd} is ${values[odd]}`);
}
