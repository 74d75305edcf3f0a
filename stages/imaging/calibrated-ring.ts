/** Gravitational radius and mass of a ring whose calibration is stated: alpha, the ring's diameter in gravitational radii. */

import type { NumberValue } from '../data.ts';
import { randomStream } from '../numerics/random.ts';
import { massInSuns } from './gravitational-radius.ts';
import { interval, UAS_PER_RADIAN } from './intervals.ts';

export interface Calibration {
  readonly alpha?: number;
  readonly alphaError?: number;
  /** pc */
  readonly distance?: number;
  readonly distanceError?: number;
}

/** Angle and mass with the errors of calibration and distance drawn beside those of the diameter. */
export function calibrated(
  diameters: readonly number[],
  { alpha, alphaError = 0, distance, distanceError = 0 }: Calibration,
): Record<string, NumberValue> {
  if (alpha === undefined) return {};
  const random = randomStream(1, 'calibration and distance');
  const angles = diameters.map((diameter) => diameter / positive(alpha, alphaError * random.normal()));
  const ofAlpha = alphaError > 0 ? `${alpha} ± ${alphaError}` : `${alpha}, taken as exact`;
  const angle = interval(
    angles,
    'uas',
    `Angular gravitational radius G M / (c^2 D): diameter over alpha = ${ofAlpha}.`,
  );
  if (distance === undefined) return { 'gravitational-radius': angle };
  const perUas = massInSuns(1 / UAS_PER_RADIAN, 1);
  const masses = angles.map((theta) => theta * perUas * positive(distance, distanceError * random.normal()));
  const ofDistance =
    distanceError > 0 ? `${distance} ± ${distanceError} pc` : `${distance} pc, taken as exact`;
  const mass = interval(masses, 'solMass', `Mass at a distance of ${ofDistance}.`);
  return { 'gravitational-radius': angle, mass };
}

/** A quantity that cannot be negative, moved by its error, kept above a tenth. */
function positive(value: number, step: number): number {
  return Math.max(value / 10, value + step);
}

export function calibrationRemarks({ alpha, distance }: Calibration): string[] {
  if (alpha === undefined) {
    return distance === undefined ? [] : ['A distance without alpha gives no mass: state alpha too.'];
  }
  return [
    `The gravitational radius assumes that the ring's diameter is ${alpha} gravitational radii, that is, that the ring ` +
      'lies where the calibration says and that general relativity holds; spin and inclination alone move a photon ' +
      'ring by up to 13 %. The interval does not hold that.',
  ];
}
