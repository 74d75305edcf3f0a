/** Which stations a row of uv data belongs to: baseline codes and their like. Common practice. */

import type { InputProblem } from '../problem.ts';
import type { Hdu } from './fits/hdu.ts';
import { uvProblem } from './uv-problem.ts';

/** No array has more stations or subarrays; beyond it a number is damage. */
const MOST_NUMBERED = 65535;

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
  const isNumber = (value: number, least: number) => value >= least && value <= MOST_NUMBERED;
  for (let row = 0; row < count; row++) {
    const [i, j, s] = [first[row], second[row], array?.[row] ?? 1].map(Math.round);
    if (!(isNumber(i, 1) && isNumber(j, 1) && isNumber(s, 0))) {
      const of = array === undefined ? '' : `, SUBARRAY ${array[row]}`;
      throw badBaseline(place(row), `ANTENNA1 ${first[row]}, ANTENNA2 ${second[row]}${of}`);
    }
    number1[row] = i;
    number2[row] = j;
    subarray[row] = s;
  }
  return { number1, number2, subarray };
}

/** Station numbers and subarray of a baseline code: 256·i + j plus (subarray − 1)/100, or 2048·i + j + 65536 with more
 *  than 255 stations, which leaves no digits for a subarray in single precision. The whole part is rounded first, since
 *  scaling may leave 257.9999. Undefined for no code. Common practice. */
export function decodeBaseline(
  code: number,
): { number1: number; number2: number; subarray: number } | undefined {
  const whole = Math.round(code);
  const hundredths = Math.round((code - whole) * 100);
  const isLong = whole > 65536;
  if (hundredths < 0 || (isLong && hundredths > 0)) return undefined;
  const [base, factor] = isLong ? [whole - 65536, 2048] : [whole, 256];
  const number1 = Math.floor(base / factor);
  const number2 = base - factor * number1;
  const isCode = number1 >= 1 && number2 >= 1 && number1 < factor;
  return isCode ? { number1, number2, subarray: hundredths + 1 } : undefined;
}

function badBaseline(place: string, found: string): InputProblem {
  return uvProblem(
    'bad-baseline',
    place,
    `a baseline of two stations with numbers from 1 to ${MOST_NUMBERED}`,
    found,
  );
}
