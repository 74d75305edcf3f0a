/** The check of (u,v) for formats that count them as CONVENTIONS do: OIFITS and tables. */

import type { Station } from '../data.ts';
import type { Choices } from './choices.ts';
import type { Records } from './records.ts';
import { compareUv } from './uv-agreement.ts';
import { judgeUv, type UvVerdict } from './uv-verdict.ts';

/** Compares u and v (wavelengths, station 1 to station 2) with the positions, where there are any, and turns them round
 *  in place when `uvSign` says so. A station at (0, 0, 0) has no known position; its baselines are not compared.
 *  Sidereal time is computed.
 *  @throws InputProblem when `uvSign` is `check` and the sign is wrong */
export function checkOurs(
  records: Records,
  stations: readonly Station[],
  target: { readonly raDegrees: number; readonly decDegrees: number },
  choices: Choices,
  facts: { readonly place: string; readonly wavelengthMetres: number; readonly statedJ2000: boolean },
): UvVerdict {
  const known = stations.map(({ xyz }) => xyz.some((value) => value !== 0));
  const rows = Array.from({ length: records.count }, (_, k) => k).filter(
    (k) => known[records.station1[k]] && known[records.station2[k]],
  );
  const comparison = compareUv(
    {
      count: rows.length,
      // compareUv counts from the second station to the first.
      u: Float64Array.from(rows, (k) => -records.u[k]),
      v: Float64Array.from(rows, (k) => -records.v[k]),
      unitsPerMetre: 1 / facts.wavelengthMetres,
      timeMjd: Float64Array.from(rows, (k) => records.timeMjd[k]),
      station1: Int32Array.from(rows, (k) => records.station1[k]),
      station2: Int32Array.from(rows, (k) => records.station2[k]),
    },
    {
      positions: stations.map((station) => station.xyz),
      ...target,
      siderealTime: undefined,
      statedJ2000: facts.statedJ2000,
    },
  );
  const verdict = judgeUv(comparison, choices.uvSign, facts.place, false);
  if (verdict.turn < 0) {
    for (let k = 0; k < records.count; k++) {
      records.u[k] = -records.u[k];
      records.v[k] = -records.v[k];
    }
  }
  return verdict;
}

/** Largest |(u,v)|. */
export function longestOf(records: Records): number {
  let longest = 0;
  for (let k = 0; k < records.count; k++) {
    longest = Math.max(longest, records.u[k] * records.u[k] + records.v[k] * records.v[k]);
  }
  return Math.sqrt(longest);
}

/** Warnings about stations at (0, 0, 0), which stands for unknown. */
export function withoutPosition(stations: readonly Station[]): string[] {
  const names = stations
    .filter(({ xyz }) => xyz.every((value) => value === 0))
    .map((station) => station.name);
  if (names.length === 0) return [];
  return [`No position is known of ${names.join(', ')}: written as (0, 0, 0).`];
}
