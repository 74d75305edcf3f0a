/** The checks one by one: each gives a finding, or the reason why there was too little to check. */

import type { Visibilities } from '../data.ts';
import { chiSquareTail } from '../numerics/chi-square.ts';
import { type Closure, closurePhase } from '../numerics/closures.ts';
import { median } from '../numerics/statistics.ts';
import {
  type Agreement,
  agreement,
  amplitudeGroup,
  type Group,
  phaseGroup,
  scatter,
  triangleGroups,
} from './agreement.ts';
import { type BaselineError, errorsOf } from './baseline-errors.ts';
import {
  colocatedPairs,
  type Pair,
  type SharedScan,
  sharedBaselines,
  trivialTriangles,
} from './colocated.ts';
import { type Judged, judge, worstLabel } from './findings.ts';
import { checkPairGains } from './gain-history.ts';
import type { CheckName, CheckParameters } from './parameters.ts';
import { checkStationAmplitudes } from './station-amplitudes.ts';
import { type PairGains, pairGains, type StationGain, stationGains } from './station-gains.ts';

const DEGREES = 180 / Math.PI;

/** All that is measured on the visibilities. */
export interface Measured {
  readonly pairs: readonly Pair[];
  readonly triangles: readonly Closure[];
  readonly triangleGroups: readonly Group[];
  readonly phaseGroups: readonly Group[];
  readonly amplitudeGroups: readonly Group[];
  readonly pairGains: readonly PairGains[];
  readonly stationGains: readonly StationGain[];
}

/** `on` names the part of a check that was not made; the whole when absent. */
export type Outcome =
  | Judged
  | { readonly check: CheckName; readonly on?: string; readonly tooLittle: string };

/** Measures what the checks and the error budget need. */
export function measure(visibilities: Visibilities, parameters: CheckParameters): Measured {
  const pairs = colocatedPairs(visibilities, parameters.colocated);
  const triangles = trivialTriangles(visibilities, pairs, parameters.minimumSnr);
  const shared = sharedBaselines(visibilities, pairs, parameters.minimumSnr);
  const gains = pairGains(visibilities, shared);
  return {
    pairs,
    triangles,
    triangleGroups: triangleGroups(visibilities, triangles),
    phaseGroups: groupsOf(visibilities, shared, phaseGroup),
    amplitudeGroups: groupsOf(visibilities, shared, amplitudeGroup),
    pairGains: gains,
    stationGains: stationGains(visibilities, gains),
  };
}

/** A pair that shares one baseline in a scan has nothing to compare. */
function groupsOf(
  visibilities: Visibilities,
  shared: readonly SharedScan[],
  make: (visibilities: Visibilities, scan: SharedScan) => Group,
): Group[] {
  return shared.filter(({ baselines }) => baselines.length > 1).map((scan) => make(visibilities, scan));
}

/** Outcomes of the checks that need nothing but visibilities, in the order of the declaration. */
export function runChecks(
  visibilities: Visibilities,
  measured: Measured,
  parameters: CheckParameters,
): Outcome[] {
  return [
    checkScatter(
      'closureScatter',
      measured.triangleGroups,
      parameters,
      `${closureDetail(measured)}${culprits(visibilities, measured)}`,
    ),
    checkScatter('redundantPhases', measured.phaseGroups, parameters, ''),
    checkScatter('redundantAmplitudes', measured.amplitudeGroups, parameters, ''),
    checkGainOffset(visibilities, measured, parameters),
    checkGainScatter(visibilities, measured, parameters),
    checkPairGains(visibilities, measured, parameters),
    checkStationAmplitudes(visibilities, parameters),
  ];
}

const VALUES: Readonly<Record<'closureScatter' | 'redundantPhases' | 'redundantAmplitudes', string>> = {
  closureScatter: 'independent closure phases of triangles with two co-located stations',
  redundantPhases: 'independent phase differences on far baselines of co-located stations',
  redundantAmplitudes: 'independent closure amplitudes that must be 1',
};

function checkScatter(
  check: keyof typeof VALUES,
  groups: readonly Group[],
  { least, limits }: CheckParameters,
  further: string,
): Outcome {
  const measured = agreement(groups);
  if (measured.degrees < least) {
    return { check, tooLittle: `${measured.degrees} ${VALUES[check]}, at least ${least} are needed` };
  }
  const detail = `Scatter over the stated errors of ${measured.degrees} ${VALUES[check]}; ${worst(measured)}${further}.`;
  const exceeds = (value: number) => chiSquareTail(measured.degrees * value * value, measured.degrees);
  return judge(check, scatter(measured), limits[check], detail, exceeds);
}

function worst(measured: Agreement): string {
  const found = worstLabel(measured);
  if (found === undefined) return 'none stands out';
  return `largest for ${found.label}, ${found.scatter.toFixed(2)} in ${found.values} scans`;
}

function closureDetail({ triangleGroups }: Measured): string {
  if (triangleGroups.length === 0) return '';
  const offset = median(triangleGroups.flatMap(({ values }) => values)) * DEGREES;
  return `; median closure phase ${offset.toFixed(2)} deg`;
}

/** An error of a baseline is named from so many of its own errors on. */
const SIGNIFICANT = 4;

/** The baseline whose phase explains best what does not close. Where one station of a pair is off towards a third and
 *  nothing else tells the two apart, both are named. */
function culprits(visibilities: Visibilities, { triangles, triangleGroups }: Measured): string {
  const { stations, re, im } = visibilities;
  const scans = [...new Set(triangles.map(({ rows }) => visibilities.scan[rows[0]]))];
  const sets = scans.map((scan, k) => ({
    closures: triangles.filter(({ rows }) => visibilities.scan[rows[0]] === scan),
    covariance: triangleGroups[k].covariance?.(0) ?? new Float64Array(0),
  }));
  const { errors } = errorsOf(visibilities, sets, (triangle) => closurePhase(triangle, re, im));
  const size = ({ estimate, error }: BaselineError) => Math.abs(estimate) / error;
  const best = largest(errors, size);
  if (best === undefined || !(size(best) > SIGNIFICANT)) return '';
  const alike = errors.filter((each) => size(each) > (1 - 1e-9) * size(best));
  const names = alike.map(
    ({ station1, station2 }) => `${stations[station1].name}–${stations[station2].name}`,
  );
  const [value, error] = [Math.abs(best.estimate), best.error].map((x) => (x * DEGREES).toFixed(1));
  return `; a phase of ${value} ± ${error} deg on ${names.join(' or ')} explains most`;
}

function checkGainOffset(
  visibilities: Visibilities,
  measured: Measured,
  parameters: CheckParameters,
): Outcome {
  const found = largest(measured.pairGains, ({ offset }) => Math.abs(offset));
  if (found === undefined) return noGains('gainOffset');
  const detail =
    `Largest mean log gain ratio of ${measured.pairGains.length} co-located pairs: ${pairName(visibilities, found.pair)}, ` +
    `${found.offset.toFixed(3)} over ${found.scans.length} scans; ${farthest(visibilities, measured)}.`;
  return judge('gainOffset', Math.abs(found.offset), parameters.limits.gainOffset, detail);
}

/** Names the station whose gain is farthest from the others', where two pairs or more allow to. */
function farthest({ stations }: Visibilities, { stationGains, pairGains }: Measured): string {
  const found = largest(stationGains, ({ logGain }) => Math.abs(logGain));
  if (found === undefined || pairGains.length < 2)
    return 'which of the two is off, one pair alone does not say';
  const sign = found.logGain < 0 ? 'low' : 'high';
  return `farthest from the others is ${stations[found.station].name}, ${Math.abs(found.logGain).toFixed(3)} ${sign} in ln`;
}

function checkGainScatter(
  visibilities: Visibilities,
  { pairGains }: Measured,
  parameters: CheckParameters,
): Outcome {
  const found = largest(pairGains, ({ scatter }) => scatter);
  if (found === undefined) return noGains('gainScatter');
  const detail =
    `Largest standard deviation of the log gain ratio from scan to scan, less the noise: ` +
    `${pairName(visibilities, found.pair)}, over ${found.scans.length} scans.`;
  return judge('gainScatter', found.scatter, parameters.limits.gainScatter, detail);
}

function noGains(check: CheckName): Outcome {
  return { check, tooLittle: 'no two co-located stations share a far baseline in two scans' };
}

function largest<T>(list: readonly T[], size: (item: T) => number): T | undefined {
  return list.reduce<T | undefined>(
    (best, item) => (best === undefined || size(item) > size(best) ? item : best),
    undefined,
  );
}

export function pairName({ stations }: Visibilities, { a, b }: Pair): string {
  return `${stations[a].name} and ${stations[b].name}`;
}
