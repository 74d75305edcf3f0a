/** Which stations a row of uv data belongs to: baseline codes and their like. Common practice. */

import type { InputProblem } from '../problem.ts';
import type { Hdu } from './fits/hdu.ts';
import { uvProblem } from './uv-problem.ts';

/** Parameters that hold the stations: one code, or station numbers and subarray in parameters of their own. */
export interface StationParameters {
  readonly baseline: number | undefined;
  readonly antenna1: number | undefined;
  readonly antenna2: number | undefined;
  readonly subarray: number | undefined;
}

/** Station numbers and subarrays of rows. @throws InputProblem for a row without two stations */
export function stationsOf(
  hdu: Hdu,
  parameters: StationParameters,
  parameter: (at: number) => Float64Array,
  from: number,
  count: number,
) {
  const number1 = new Int32Array(count);
  const number2 = new Int32Array(count);
  const subarray = new Int32Array(count);
  const place = (row: number) => `${hdu.place}, row ${from + row + 1}`;
  if (parameters.baseline !== undefined) {
    const codes = parameter(parameters.baseline);
    for (let row = 0; row < count; row++) {
      const decoded = decodeBaseline(codes[row]);
      if (decoded === undefined) throw badBaseline(place(row), `BASELINE ${codes[row]}`);
      number1[row] = decoded.number1;
      number2[row] = decoded.number2;
      subarray[row] = decoded.subarray;
    }
    return { number1, number2, subarray };
  }
  const first = parameter(parameters.antenna1 as number);
  const second = parameter(parameters.antenna2 as number);
  const array = parameters.subarray === undefined ? undefined : parameter(parameters.subarray);
  for (let row = 0; row < count; row++) {
    number1[row] = Math.round(first[row]);
    number2[row] = Math.round(second[row]);
    subarray[row] = array === undefined ? 1 : Math.round(array[row]);
    if (!(number1[row] >= 1 && number2[row] >= 1)) {
      throw badBaseline(place(row), `ANTENNA1 ${first[row]}, ANTENNA2 ${second[row]}`);
    }
  }
  return { number1, number2, subarray };
}

/** Station numbers and subarray of a baseline code: 256·i + j, or 2048·i + j + 65536 with more than 255 stations, plus
 *  (subarray − 1)/100. The whole part is rounded first, since scaling may leave 257.9999. Undefined for no code.
 *  Common practice. */
export function decodeBaseline(
  code: number,
): { number1: number; number2: number; subarray: number } | undefined {
  const whole = Math.round(code);
  const subarray = Math.max(1, Math.round((code - whole) * 100) + 1);
  const [base, factor] = whole > 65536 ? [whole - 65536, 2048] : [whole, 256];
  const number1 = Math.floor(base / factor);
  const number2 = base - factor * number1;
  return number1 >= 1 && number2 >= 1 && number1 < factor ? { number1, number2, subarray } : undefined;
}

function badBaseline(place: string, found: string): InputProblem {
  return uvProblem('bad-baseline', place, 'a baseline of two stations with numbers from 1', found);
}
