/** From measured draws to numbers with credible intervals, definitions and remarks. */

import type { Numbers, NumberValue } from '../data.ts';
import { randomStream } from '../numerics/random.ts';
import type { RingMeasurement } from '../numerics/ring.ts';
import { angleDifference, circularMean, quantiles } from '../numerics/statistics.ts';
import { type Calibration, calibrated, calibrationRemarks } from './calibrated-ring.ts';
import type { ErrorParts } from './error-parts.ts';
import { interval, UAS_PER_RADIAN } from './intervals.ts';
import type { MeasuredDraws } from './measure-draws.ts';
import { type BiasOfQuantity, correctedDraws, type MethodBias } from './method-bias.ts';
import { type ModelsVerdict, ringVerdict } from './ring-verdict.ts';

/** What is known besides the draws. */
export interface Knowledge {
  readonly resolutionRadians?: number;
  /** The method's bias, from injections. */
  readonly bias?: MethodBias | null;
  /** Whether geometric models prefer a dark centre, and the sentence that says so. */
  readonly models?: ModelsVerdict | null;
  readonly parts?: ErrorParts;
  /** The least depression that the resolution allows a ring of this size to show. */
  readonly deepest?: number | null;
}

const DEFINITIONS = {
  diameter: `Twice the mean radius of the ridge (largest brightness along each ray) over position angle.`,
  width: `Mean full width at half maximum along the rays from the centre.`,
  asymmetry:
    'First Fourier mode of the brightness on the ridge: |sum I e^{i chi}| / sum I, 0 for an even ring.',
  'position-angle':
    'Argument of the first Fourier mode of the brightness on the ridge, north through east; circular mean of the draws ' +
    'with intervals about it, which may run below 0 or above 360.',
  'central-depression':
    'Mean brightness within a quarter of the ridge radius over the mean brightness on the ridge: 0 is black, 1 no ' +
    'depression. A contrast at the resolution of the image. An interval that reaches 0 does not tell it from black.',
  roundness: 'Short axis over long axis of the ridge, from the second Fourier mode of its radii.',
  'thin-ring-diameter':
    'Diameter of a thin ring that, blurred by a Gaussian, has this ridge and width; the blur makes the ridge smaller by ' +
    `about w^2/(4 ln2 d).`,
} as const;

const DARK_CENTRE =
  'The dark centre is a measured contrast. It is no picture of a horizon and no proof of one.';
const PARTS: Readonly<Record<keyof ErrorParts, string>> = {
  noise:
    'Part of the error of the uncorrected diameter that noise alone makes: standard deviation of the posterior while the gains are held.',
  // A variance of 60 draws is good to sqrt(2/60) = 18 %, the root of which is 0.43.
  calibration:
    'Part that the gains add to that of the noise, in quadrature; below 0.4 of the noise it is not told from none.',
  components: 'Spread between the numbers of components that held-out data admit.',
  library: 'Spread between fits in other libraries.',
  method:
    'Error of the corrected diameter as injected rings show it: noise and gains drawn anew, what the method does to one ' +
    'more than to another, and the error of the correction. The interval is of this width; the parts of noise and ' +
    'calibration are in it.',
};
/** A brightness is not negative, and a centre as bright as the ring is no depression; a first mode of what is not negative
 *  is at most its mean. Draws of an image whose pixels may fall below 0 by a little, and corrections, may lie beyond. */
export const BOUNDS: Readonly<Record<string, readonly [number, number]>> = {
  'central-depression': [0, 1],
  asymmetry: [0, 1],
};
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
  { resolutionRadians = 0, bias = null, models = null, parts = {}, deepest = null }: Knowledge = {},
): Numbers {
  const fraction: NumberValue = {
    value: ringFraction(draws),
    unit: '',
    definition:
      'Fraction of the posterior draws that have a ring: both half-maxima on most rays, radius scatter below a tenth, a dark centre.',
  };
  const against = reasonAgainst(draws, models);
  if (against !== null) return { values: { 'ring-fraction': fraction }, remarks: [against] };
  const { values, diameters } = ringValues(draws.rings, bias);
  return {
    values: {
      ...values,
      'ring-fraction': fraction,
      ...partValues(parts),
      ...deepestValue(deepest),
      ...calibrated(diameters, calibration),
    },
    remarks: [
      DARK_CENTRE,
      bias === null ? BIAS : correctedRemark(bias),
      WIDTH_BOUND,
      ...(models === null ? [] : [models.sentence]),
      ...resolutionRemarks(resolutionRadians),
      ...calibrationRemarks(calibration),
    ],
  };
}

/** Why no number of a ring is given; null when they are. */
function reasonAgainst(draws: MeasuredDraws, models: ModelsVerdict | null): string | null {
  const verdict = ringVerdict(ringFraction(draws), models);
  if (verdict === 'ring') return null;
  const found = `${draws.rings.length} of ${draws.count} draws have one`;
  if (verdict === 'undecided')
    return `Undecided: ${found}, though of geometric models one with a dark centre is preferred: ${models?.sentence} No number of a ring is given, since the draws that have one are the clearest.`;
  return models && !models.ringPreferred
    ? `No ring: ${models.sentence} So no number of a ring is given.`
    : `No ring: ${found}, so no number of a ring is given.`;
}

function correctedRemark({ diameter, width }: MethodBias): string {
  const shown = ({ offset, scatter }: BiasOfQuantity) =>
    `${(-offset).toFixed(2)} uas with a scatter of ${scatter.toFixed(2)} uas`;
  return (
    `Values are corrected for the method's own bias, measured on ${diameter.trials} rings injected into the same coverage: ` +
    `the diameter by ${shown(diameter)}, the width by ${shown(width)}. The intervals are as wide as the errors of these rings, ` +
    "which hold noise and gains, and the error of the correction; the posterior's own interval stands with " +
    '`diameter-uncorrected`.'
  );
}

/** Draws with the bias taken out, as wide as the injections say; cut at what cannot be passed. A cut moves no quantile that
 *  stands inside, and no interval loses a truth by it. */
function corrected(
  values: readonly number[],
  bias: BiasOfQuantity | undefined,
  name: string,
): readonly number[] {
  const moved =
    bias === undefined ? values : correctedDraws(values, bias, randomStream(1, `method bias of the ${name}`));
  const bounds = BOUNDS[name];
  return bounds === undefined ? moved : moved.map((value) => Math.min(bounds[1], Math.max(bounds[0], value)));
}

function partValues(parts: ErrorParts): Record<string, NumberValue> {
  return Object.fromEntries(
    Object.entries(parts).map(([part, value]) => [
      `diameter-error-${part}`,
      { value: value as number, unit: 'uas', definition: PARTS[part as keyof ErrorParts] },
    ]),
  );
}

function deepestValue(deepest: number | null): Record<string, NumberValue> {
  if (deepest === null) return {};
  const definition =
    'Central depression that a ring without any light inside would show at this diameter, width and resolution: the ' +
    'instrument can see none deeper.';
  return { 'deepest-depression': { value: deepest, unit: '', definition } };
}

function resolutionRemarks(resolutionRadians: number): string[] {
  if (!(resolutionRadians > 0)) return [];
  const resolution = (resolutionRadians * UAS_PER_RADIAN).toFixed(1);
  return [
    `The images have a resolution of ${resolution} uas (FWHM): diameter, width and central depression are those of the ` +
      'blurred ring. Of rings seen at different resolutions compare the thin-ring diameters.',
  ];
}

function ringValues(
  rings: readonly RingMeasurement[],
  bias: MethodBias | null,
): { values: Record<string, NumberValue>; diameters: readonly number[] } {
  const lengths = (pick: (ring: RingMeasurement) => number | null) =>
    rings
      .map(pick)
      .filter((value) => value !== null)
      .map((value) => value * UAS_PER_RADIAN);
  const thin = lengths((ring) => ring.thinRingDiameter);
  const raw = lengths((ring) => ring.diameter);
  const diameters = corrected(raw, bias?.diameter, 'diameter');
  const own = <T extends 'width' | 'asymmetry' | 'central-depression'>(
    name: T,
    values: readonly number[],
    unit: string,
  ) => interval(corrected(values, bias?.[name], name), unit, DEFINITIONS[name]);
  const depressions = rings.map((ring) => ring.centralDepression);
  const values = {
    diameter: interval(diameters, 'uas', DEFINITIONS.diameter),
    ...(bias === null
      ? {}
      : {
          'diameter-uncorrected': interval(
            raw,
            'uas',
            `${DEFINITIONS.diameter} Without correction for the method's bias.`,
          ),
        }),
    width: own(
      'width',
      lengths((ring) => ring.width),
      'uas',
    ),
    asymmetry: own(
      'asymmetry',
      rings.map((ring) => ring.asymmetry),
      '',
    ),
    'position-angle': angleInterval(
      corrected(
        unwrapped(rings.map((ring) => ring.positionAngleDegrees)),
        bias?.['position-angle'],
        'position angle',
      ),
    ),
    'central-depression': own('central-depression', depressions, ''),
    roundness: interval(
      rings.map((ring) => ring.roundness),
      '',
      DEFINITIONS.roundness,
    ),
    ...(thin.length > rings.length / 2
      ? {
          'thin-ring-diameter': interval(
            corrected(thin, bias?.diameter, 'thin ring'),
            'uas',
            DEFINITIONS['thin-ring-diameter'],
          ),
        }
      : {}),
  };
  return { values, diameters };
}

/** Angles about their mean, so that they can be moved and spread. */
function unwrapped(degrees: readonly number[]): number[] {
  const centre = circularMean(degrees).degrees;
  return degrees.map((angle) => centre + angleDifference(angle, centre));
}

function angleInterval(degrees: readonly number[]): NumberValue {
  const centre = circularMean(degrees).degrees;
  const about = degrees.map((angle) => angleDifference(angle, centre));
  const [low95, low, high, high95] = quantiles(about, [0.025, 0.16, 0.84, 0.975]).map((d) => centre + d);
  return { value: centre, unit: 'deg', low, high, low95, high95, definition: DEFINITIONS['position-angle'] };
}

/** A sentence when the diameter's uncertainty (half its 95 % interval) is not below the ring's width; else null. */
export function widthViolated({ values }: Numbers): string | null {
  const { diameter, width } = values;
  if (!diameter || !width) return null;
  const half = ((diameter.high95 ?? 0) - (diameter.low95 ?? 0)) / 2;
  if (half < width.value) return null;
  return `the diameter's 95 % interval of ±${half.toFixed(1)} uas is not below the ring's width of ${width.value.toFixed(1)} uas: the posterior holds different images`;
}
