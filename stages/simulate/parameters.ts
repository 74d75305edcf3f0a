/** Parameters of `simulate` as the computation uses them: typed, SI and radians, with the checks that need more than
 *  one parameter. Ranges of single ones were checked against the declaration before. */

import { geocentric, geodetic } from '../numerics/geodesy.ts';
import { parseUtc } from '../numerics/time.ts';
import { InputProblem } from '../problem.ts';

export const RADIANS_PER_DEGREE = Math.PI / 180;
export const RADIANS_PER_UAS = Math.PI / (180 * 3600e6);

export interface SimulatedStation {
  readonly name: string;
  readonly xyz: readonly [number, number, number];
  /** Radians. */
  readonly longitude: number;
  readonly latitude: number;
  readonly elevationLimit: number;
  readonly sefd: number;
  readonly gainError: number;
  readonly gainFactor: number;
}

export interface RingTruth {
  /** Jy. */
  readonly flux: number;
  /** Radians: diameter, width, offsets, field; positionAngle too. */
  readonly diameter: number;
  readonly width: number;
  readonly asymmetry: number;
  readonly positionAngle: number;
  readonly east: number;
  readonly north: number;
  readonly floor: number;
  readonly field: number;
  readonly pixels: number;
}

/** A planted fault, as declared: hours since the start, degrees or seconds. */
export interface Fault {
  readonly fault:
    | 'gain-drop'
    | 'non-closing-phase'
    | 'noise-understated'
    | 'stations-swapped'
    | 'clock-offset';
  readonly station?: string;
  readonly other?: string;
  readonly from: number;
  readonly duration: number;
  readonly value: number;
}

export interface Simulation {
  readonly target: { readonly name: string; readonly raDegrees: number; readonly decDegrees: number };
  readonly frequency: number;
  readonly bandwidth: number;
  readonly array: string;
  readonly stations: readonly SimulatedStation[];
  readonly startMjd: number;
  /** Seconds. */
  readonly duration: number;
  readonly record: number;
  readonly scan: number;
  readonly interval: number;
  readonly quantisationEfficiency: number;
  readonly phasesUnknown: boolean;
  /** Standard deviations: of the log amplitude, of the phase in radians. */
  readonly nonClosing: { readonly amplitude: number; readonly phase: number };
  readonly noiseFactor: number;
  readonly faults: readonly Fault[];
  readonly truth: RingTruth | undefined;
  /** Jy, radians. */
  readonly extended: { readonly flux: number; readonly fwhm: number } | undefined;
  /** Radians. */
  readonly resolution: number;
  readonly seed: number;
}

/** Parameters as the declaration in simulate.ts leaves them: units Hz, m, s, Jy, deg, uas. */
interface Declared {
  readonly target: { readonly name: string; readonly ra: number; readonly dec: number };
  readonly band: { readonly frequency: number; readonly bandwidth: number };
  readonly array: string;
  readonly stations: readonly DeclaredStation[];
  readonly start: string;
  readonly duration: number;
  readonly record: number;
  readonly scan: number;
  readonly interval: number;
  readonly quantisationEfficiency: number;
  readonly phaseErrors: 'unknown' | 'none';
  readonly nonClosing: { readonly amplitude: number; readonly phase: number };
  readonly noiseFactor: number;
  readonly faults?: readonly Fault[];
  readonly truth?: RingTruth;
  readonly extended?: { readonly flux: number; readonly fwhm: number };
  readonly resolution: number;
  readonly seed: number;
}

interface DeclaredStation {
  readonly name: string;
  readonly xyz?: readonly number[];
  readonly longitude?: number;
  readonly latitude?: number;
  readonly height?: number;
  readonly sefd: number;
  readonly gainError: number;
  readonly gainFactor: number;
  readonly elevationLimit: number;
}

/** Reads the parameters. @throws InputProblem code `parameter` for a start that is no time, a station with no or two
 *  positions, a doubled name, scans that do not fit. */
export function readParameters(parameters: Readonly<Record<string, unknown>>): Simulation {
  const declared = parameters as unknown as Declared;
  const { target, band, truth, extended } = declared;
  const startMjd = parseUtc(declared.start);
  if (startMjd === undefined) {
    throw parameterProblem(
      'start',
      'a time such as 2031-04-07T21:00:00Z',
      `"${declared.start}"`,
      'Give date and time in UTC.',
    );
  }
  requireSchedule(declared);
  requireUniqueNames(declared.stations);
  return {
    target: { name: target.name, raDegrees: target.ra, decDegrees: target.dec },
    frequency: band.frequency,
    bandwidth: band.bandwidth,
    array: declared.array,
    stations: declared.stations.map(readStation),
    startMjd,
    duration: declared.duration,
    record: declared.record,
    scan: declared.scan,
    interval: declared.interval,
    quantisationEfficiency: declared.quantisationEfficiency,
    phasesUnknown: declared.phaseErrors === 'unknown',
    nonClosing: {
      amplitude: declared.nonClosing.amplitude,
      phase: declared.nonClosing.phase * RADIANS_PER_DEGREE,
    },
    noiseFactor: declared.noiseFactor,
    faults: requireFaults(declared),
    truth: truth && truthInRadians(truth),
    extended: extended && { flux: extended.flux, fwhm: extended.fwhm * RADIANS_PER_UAS },
    resolution: declared.resolution * RADIANS_PER_UAS,
    seed: declared.seed,
  };
}

function truthInRadians(truth: RingTruth): RingTruth {
  return {
    ...truth,
    diameter: truth.diameter * RADIANS_PER_UAS,
    width: truth.width * RADIANS_PER_UAS,
    positionAngle: truth.positionAngle * RADIANS_PER_DEGREE,
    east: truth.east * RADIANS_PER_UAS,
    north: truth.north * RADIANS_PER_UAS,
    field: truth.field * RADIANS_PER_UAS,
  };
}

function readStation(station: DeclaredStation): SimulatedStation {
  const xyz = positionOf(station);
  const { longitude, latitude } = geodetic(xyz);
  return {
    name: station.name,
    xyz,
    longitude,
    latitude,
    elevationLimit: station.elevationLimit * RADIANS_PER_DEGREE,
    sefd: station.sefd,
    gainError: station.gainError,
    gainFactor: station.gainFactor,
  };
}

function positionOf(station: DeclaredStation): [number, number, number] {
  const { xyz, longitude, latitude, height } = station;
  const given = [longitude, latitude, height].filter((value) => value !== undefined).length;
  if (given !== (xyz === undefined ? 3 : 0)) {
    throw parameterProblem(
      `stations, ${station.name}`,
      'either xyz or all of longitude, latitude and height',
      `${xyz === undefined ? 'no xyz' : 'xyz'} and ${given} of the three`,
      'Give the position once.',
    );
  }
  if (xyz !== undefined) {
    const position: [number, number, number] = [xyz[0], xyz[1], xyz[2]];
    const radius = Math.sqrt(xyz[0] * xyz[0] + xyz[1] * xyz[1] + xyz[2] * xyz[2]);
    if (!(radius > 6.3e6 && radius < 1e8)) {
      throw parameterProblem(
        `stations, ${station.name}, xyz`,
        'a place between 6300 km and 100000 km from the centre of the Earth',
        `${Math.round(radius / 1000)} km`,
        'Coordinates are geocentric.',
      );
    }
    return position;
  }
  return geocentric({
    longitude: (longitude ?? 0) * RADIANS_PER_DEGREE,
    latitude: (latitude ?? 0) * RADIANS_PER_DEGREE,
    height: height ?? 0,
  });
}

function requireSchedule({ record, scan, interval, duration }: Declared): void {
  if (!(record <= scan && scan <= interval && scan <= duration)) {
    throw parameterProblem(
      'record, scan, interval, duration',
      'a record no longer than a scan, and a scan no longer than interval and duration',
      `${record} s, ${scan} s, ${interval} s, ${duration} s`,
      'Lengthen what is too short.',
    );
  }
}

/** How many stations a fault is about: least and most. */
const STATIONS_OF = {
  'gain-drop': [1, 1],
  'non-closing-phase': [2, 2],
  'noise-understated': [0, 2],
  'stations-swapped': [2, 2],
  'clock-offset': [0, 0],
} as const;

/** What the value of a fault may not be 0 or below for. */
const FACTORS: readonly Fault['fault'][] = ['gain-drop', 'noise-understated'];

function requireFaults({ faults = [], stations }: Declared): readonly Fault[] {
  const known = stations.map(({ name }) => name);
  for (const [k, { fault, station, other, value }] of faults.entries()) {
    const named = [station, other].filter((name) => name !== undefined);
    const place = `faults, number ${k + 1}`;
    const [least, most] = STATIONS_OF[fault];
    if (!(named.length >= least && named.length <= most) || new Set(named).size !== named.length) {
      throw parameterProblem(
        place,
        `${least === most ? least : `${least} to ${most}`} different stations for ${fault}`,
        named.join(' and ') || 'none',
        'Name them as `station` and `other`.',
      );
    }
    const unknown = named.find((name) => !known.includes(name));
    if (unknown !== undefined)
      throw parameterProblem(place, `stations among ${known.join(', ')}`, unknown, 'Correct the name.');
    if (FACTORS.includes(fault) && !(value > 0))
      throw parameterProblem(place, 'a factor above 0', `${value}`, 'Half the gain is 0.5.');
  }
  return faults;
}

function requireUniqueNames(stations: readonly DeclaredStation[]): void {
  const names = stations.map((station) => station.name);
  const doubled = names.find((name, k) => names.indexOf(name) !== k);
  if (doubled !== undefined) {
    throw parameterProblem('stations', 'every name once', `${doubled} twice`, 'Rename one of them.');
  }
}

export function parameterProblem(
  place: string,
  expected: string,
  found: string,
  advice: string,
): InputProblem {
  return new InputProblem({ code: 'parameter', place: `parameter ${place}`, expected, found, advice });
}
