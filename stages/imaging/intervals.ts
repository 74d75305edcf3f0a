/** Numbers with credible intervals from draws. */

import type { NumberValue } from '../data.ts';
import { quantiles } from '../numerics/statistics.ts';

/** Microarcseconds per radian. */
export const UAS_PER_RADIAN = 206264806247.09637;

const INTERVAL = 'Median of the posterior draws that have a ring, with 68 % and 95 % intervals. ';

export function interval(values: readonly number[], unit: string, definition: string): NumberValue {
  const [low95, low, value, high, high95] = quantiles(values, [0.025, 0.16, 0.5, 0.84, 0.975]);
  return { value, unit, low, high, low95, high95, definition: INTERVAL + definition };
}
