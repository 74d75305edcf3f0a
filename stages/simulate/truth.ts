/** The truth of a synthetic observation: its visibilities, its image, and its numbers at a resolution. */

import type { Numbers, NumberValue, SkyImage } from '../data.ts';
import { makeDrawing } from '../numerics/draw.ts';
import { visibilitiesOf } from '../numerics/fourier.ts';
import { type Model, makePart, visibilitiesOfModel } from '../numerics/models.ts';
import { measureRing, type RingMeasurement } from '../numerics/ring.ts';
import { convolved } from './convolution.ts';
import { RADIANS_PER_UAS, type RingTruth } from './parameters.ts';

export interface Truth {
  /** Without extended flux, Jy per pixel. */
  readonly image: SkyImage;
  /** The same, convolved with a Gaussian of this FWHM in radians. */
  at(resolution: number): SkyImage;
  /** Writes visibilities; u and v in wavelengths, sign of CONVENTIONS. */
  visibilities(outRe: Float64Array, outIm: Float64Array, u: Float64Array, v: Float64Array): void;
}

/** A blurred ring: visibilities in closed form, images drawn from them. */
export function truthOfRing(ring: RingTruth): Truth {
  const model = modelOfRing(ring);
  const draw = (resolution: number): SkyImage => {
    const blur = Math.sqrt(model.blur * model.blur + resolution * resolution);
    const grid = { nx: ring.pixels, ny: ring.pixels, pixelRadians: ring.field / ring.pixels };
    const pixels = new Float64Array(grid.nx * grid.ny);
    makeDrawing(grid)(pixels, { ...model, blur });
    return { ...grid, pixels };
  };
  return {
    image: draw(0),
    at: draw,
    visibilities: (outRe, outIm, u, v) => visibilitiesOfModel(outRe, outIm, model, u, v),
  };
}

/** A given image: visibilities by direct sums over its pixels. */
export function truthOfImage(image: SkyImage): Truth {
  return {
    image,
    at: (resolution) => convolved(image, resolution),
    visibilities: (outRe, outIm, u, v) => visibilitiesOf(outRe, outIm, image, u, v),
  };
}

function modelOfRing(ring: RingTruth): Model {
  const place = { x: ring.east, y: ring.north, length: ring.diameter };
  const parts = [
    makePart('ring', {
      ...place,
      flux: ring.flux * (1 - ring.floor),
      asymmetry: ring.asymmetry,
      brightest: ring.positionAngle,
    }),
    makePart('disc', { ...place, flux: ring.flux * ring.floor }),
  ];
  return { parts: ring.floor > 0 ? parts : parts.slice(0, 1), blur: ring.width };
}

/** Numbers of the truth: what `measureRing` finds in the image at the resolution, and the flux. */
export function measureTruth(truth: Truth, resolution: number, remark: string): Numbers {
  const image = truth.at(resolution);
  const measured = measureRing(image);
  const where =
    resolution > 0
      ? `of the truth convolved with a Gaussian of ${(resolution / RADIANS_PER_UAS).toFixed(1)} uas FWHM`
      : 'of the truth as it is';
  const flux = truth.image.pixels.reduce((sum, value) => sum + value, 0);
  const values: Record<string, NumberValue> = {
    ...ringValues(measured, where),
    flux: { value: flux, unit: 'Jy', definition: 'sum of the truth image; without extended flux' },
  };
  const remarks = measured.ring
    ? [remark]
    : [remark, `The truth shows no ring: ${measured.reasons.join('; ')}.`];
  return { values, remarks };
}

function ringValues(measured: RingMeasurement, where: string): Record<string, NumberValue> {
  const angle = (radians: number, definition: string): NumberValue => ({
    value: radians / RADIANS_PER_UAS,
    unit: 'uas',
    definition: `${definition} ${where}`,
  });
  const plain = (value: number, unit: string, definition: string): NumberValue => ({
    value,
    unit,
    definition: `${definition} ${where}`,
  });
  const { width, thinRingDiameter } = measured;
  return {
    diameter: angle(measured.diameter, 'twice the mean radius of the ridge'),
    ...(width === null ? {} : { width: angle(width, 'mean FWHM along rays') }),
    asymmetry: plain(measured.asymmetry, '', 'first Fourier mode of the brightness along the ridge'),
    'position-angle': plain(
      measured.positionAngleDegrees,
      'deg',
      'argument of that mode, from north through east,',
    ),
    'central-depression': plain(
      measured.centralDepression,
      '',
      'mean brightness within a quarter of the ridge radius over that on the ridge',
    ),
    roundness: plain(measured.roundness, '', 'short axis over long axis of the ridge'),
    ...(thinRingDiameter === null
      ? {}
      : {
          'thin-ring-diameter': angle(
            thinRingDiameter,
            'diameter of the thin ring that, blurred, has the ridge and width',
          ),
        }),
  };
}
