/** From measured draws to numbers with credible intervals, definitions and remarks. */

import type { Numbers, NumberValue } from '../data.ts';
import type { RingMeasurement } from '../numerics/ring.ts';
import { angleDifference, circularMean, quantiles } from '../numerics/statistics.ts';
import { massInSuns } from './gravitational-radius.ts';
import type { MeasuredDraws } from './measure-draws.ts';

export interface Calibration {
  readonly alpha?: number;
  /** pc */
  readonly distance?: number;
}

/** Microarcseconds per radian. */
export const UAS_PER_RADIAN = 206264806247.09637;
/** Part of the draws that must have a ring before numbers are given. */
export const LEAST_RINGS = 0.5;

const INTERVAL = 'Median of the posterior draws that have a ring, with 68 % and 95 % intervals. ';
const NO_BIAS = " The interval does not hold the method's own bias.";

const DEFINITIONS = {
  diameter: `Twice the mean radius of the ridge (largest brightness along each ray) over position angle.${NO_BIAS}`,
  width: `Mean full width at half maximum along the rays from the centre.${NO_BIAS}`,
  asymmetry:
    'First Fourier mode of the brightness on the ridge: |sum I e^{i chi}| / sum I, 0 for an even ring.',
  'position-angle':
    'Argument of the first Fourier mode of the brightness on the ridge, north through east; circular mean of the draws ' +
    'with intervals about it, which may run below 0 or above 360.',
  'central-depression':
    'Mean brightness within a quarter of the ridge radius over the mean brightness on the ridge: 0 is black, 1 no ' +
    'depression. A contrast at the resolution of the image.',
  roundness: 'Short axis over long axis of the ridge, from the second Fourier mode of its radii.',
  'thin-ring-diameter':
    'Diameter of a thin ring that, blurred by a Gaussian, has this ridge and width; the blur makes the ridge smaller by ' +
    `about w^2/(4 ln2 d).${NO_BIAS}`,
} as const;

const DARK_CENTRE =
  'The dark centre is a measured contrast. It is no picture of a horizon and no proof of one.';
const BIAS =
  "The intervals are those of the posterior. They do not hold the method's own bias, which is measured by injecting " +
  'known sources into the same coverage.';
const WIDTH_BOUND = "The ring's width bounds the diameter's uncertainty from above.";

/** Share of the draws that have a ring. */
export function ringFraction({ count, rings }: MeasuredDraws): number {
  return rings.length / count;
}

/** The numbers document. Values that do not exist are absent. */
export function makeRingNumbers(
  draws: MeasuredDraws,
  calibration: Calibration,
  resolutionRadians = 0,
): Numbers {
  const fraction: NumberValue = {
    value: ringFraction(draws),
    unit: '',
    definition:
      'Fraction of the posterior draws that have a ring: both half-maxima on most rays, radius scatter below a tenth, a dark centre.',
  };
  if (!(ringFraction(draws) >= LEAST_RINGS)) {
    return {
      values: { 'ring-fraction': fraction },
      remarks: [
        `No ring: ${draws.rings.length} of ${draws.count} draws have one, so no number of a ring is given.`,
      ],
    };
  }
  const measured = ringValues(draws.rings);
  return {
    values: { ...measured, 'ring-fraction': fraction, ...calibrated(measured.diameter, calibration) },
    remarks: [
      DARK_CENTRE,
      BIAS,
      WIDTH_BOUND,
      ...resolutionRemarks(resolutionRadians),
      ...calibrationRemarks(calibration),
    ],
  };
}

function resolutionRemarks(resolutionRadians: number): string[] {
  if (!(resolutionRadians > 0)) return [];
  const resolution = (resolutionRadians * UAS_PER_RADIAN).toFixed(1);
  return [
    `The images have a resolution of ${resolution} uas (FWHM): diameter, width and central depression are those of the ` +
      'blurred ring. Of rings seen at different resolutions compare the thin-ring diameters.',
  ];
}

function ringValues(rings: readonly RingMeasurement[]): Record<string, NumberValue> {
  const lengths = (pick: (ring: RingMeasurement) => number | null) =>
    rings
      .map(pick)
      .filter((value) => value !== null)
      .map((value) => value * UAS_PER_RADIAN);
  const thin = lengths((ring) => ring.thinRingDiameter);
  return {
    diameter: interval(
      lengths((ring) => ring.diameter),
      'uas',
      DEFINITIONS.diameter,
    ),
    width: interval(
      lengths((ring) => ring.width),
      'uas',
      DEFINITIONS.width,
    ),
    asymmetry: interval(
      rings.map((ring) => ring.asymmetry),
      '',
      DEFINITIONS.asymmetry,
    ),
    'position-angle': angleInterval(rings.map((ring) => ring.positionAngleDegrees)),
    'central-depression': interval(
      rings.map((ring) => ring.centralDepression),
      '',
      DEFINITIONS['central-depression'],
    ),
    roundness: interval(
      rings.map((ring) => ring.roundness),
      '',
      DEFINITIONS.roundness,
    ),
    ...(thin.length > rings.length / 2
      ? { 'thin-ring-diameter': interval(thin, 'uas', DEFINITIONS['thin-ring-diameter']) }
      : {}),
  };
}

function interval(values: readonly number[], unit: string, definition: string): NumberValue {
  const [low95, low, value, high, high95] = quantiles(values, [0.025, 0.16, 0.5, 0.84, 0.975]);
  return { value, unit, low, high, low95, high95, definition: INTERVAL + definition };
}

function angleInterval(degrees: readonly number[]): NumberValue {
  const centre = circularMean(degrees).degrees;
  const about = degrees.map((angle) => angleDifference(angle, centre));
  const [low95, low, high, high95] = quantiles(about, [0.025, 0.16, 0.84, 0.975]).map((d) => centre + d);
  return { value: centre, unit: 'deg', low, high, low95, high95, definition: DEFINITIONS['position-angle'] };
}

function calibrated(diameter: NumberValue, { alpha, distance }: Calibration): Record<string, NumberValue> {
  if (alpha === undefined) return {};
  const angle = scaled(
    diameter,
    1 / alpha,
    'uas',
    `Angular gravitational radius G M / (c^2 D): diameter over alpha = ${alpha}.`,
  );
  if (distance === undefined) return { 'gravitational-radius': angle };
  const perUas = massInSuns(1 / UAS_PER_RADIAN, distance);
  const mass = scaled(angle, perUas, 'solMass', `Mass at a distance of ${distance} pc, taken as exact.`);
  return { 'gravitational-radius': angle, mass };
}

function scaled(number: NumberValue, factor: number, unit: string, definition: string): NumberValue {
  const times = (value: number | undefined) => (value === undefined ? undefined : value * factor);
  return {
    value: number.value * factor,
    unit,
    low: times(number.low),
    high: times(number.high),
    low95: times(number.low95),
    high95: times(number.high95),
    definition,
  };
}

function calibrationRemarks({ alpha, distance }: Calibration): string[] {
  if (alpha === undefined) {
    return distance === undefined ? [] : ['A distance without alpha gives no mass: state alpha too.'];
  }
  return [
    `The gravitational radius assumes that the ring's diameter is ${alpha} gravitational radii, that is, that the ring ` +
      'lies where the calibration says and that general relativity holds; spin and inclination alone move a photon ' +
      'ring by up to 13 %. The interval does not hold that.',
  ];
}

/** A sentence when the diameter's uncertainty (half its 95 % interval) is not below the ring's width; else null. */
export function widthViolated({ values }: Numbers): string | null {
  const { diameter, width } = values;
  if (!diameter || !width) return null;
  const half = ((diameter.high95 ?? 0) - (diameter.low95 ?? 0)) / 2;
  if (half < width.value) return null;
  return `the diameter's 95 % interval of ±${half.toFixed(1)} uas is not below the ring's width of ${width.value.toFixed(1)} uas: the posterior holds different images`;
}
