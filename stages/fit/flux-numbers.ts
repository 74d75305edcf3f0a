/** The output `flux`: total flux, and the centroid where it was fitted, with credible intervals. */

import type { Basis, Numbers, NumberValue } from '../data.ts';
import type { PlacedPosterior } from '../imaging/posterior-draws.ts';
import { quantiles } from '../numerics/statistics.ts';

export const UAS_PER_RADIAN = (180 / Math.PI) * 3600e6;

/** @param method  how the posterior was found */
export function fluxNumbers(
  basis: Basis,
  posterior: PlacedPosterior,
  method: string,
  remark: string,
): Numbers {
  const definition =
    'Total flux of the image: median of the posterior with its 68 % and 95 % intervals. A gain common to all stations ' +
    'is held by its prior alone.';
  return {
    values: { flux: numberOf(posterior.flux, 'Jy', definition), ...centroidNumbers(basis, posterior) },
    remarks: [`Posterior ${method}.`, ...(remark ? [remark] : [])],
  };
}

function numberOf(draws: Float64Array, unit: string, definition: string): NumberValue {
  const [low95, low, value, high, high95] = quantiles(draws, [0.025, 0.16, 0.5, 0.84, 0.975]);
  return { value, unit, low, high, low95, high95, definition };
}

/** The place of every draw plus the centroid of its image, which is at the origin as far as the library's images are. */
function centroidNumbers(
  basis: Basis,
  { places, ...posterior }: PlacedPosterior,
): Record<string, NumberValue> {
  if (!places) return {};
  const moments = [basis.mean, ...basis.components].map((pixels) => momentsOf(basis, pixels));
  const draws = places.map(({ east, north }, s) => {
    let [sum, x, y] = moments[0].map((moment) => posterior.flux[s] * moment);
    for (let k = 0; k < posterior.components; k++) {
      const coefficient = posterior.coefficients[s * posterior.components + k];
      sum += coefficient * moments[k + 1][0];
      x += coefficient * moments[k + 1][1];
      y += coefficient * moments[k + 1][2];
    }
    return [(east + x / sum) * UAS_PER_RADIAN, (north + y / sum) * UAS_PER_RADIAN];
  });
  const definition = (direction: string) =>
    `Centroid of the source ${direction} of the phase centre: median of the posterior with its 68 % and 95 % intervals. ` +
    'It holds what is left in the phases of the calibration.';
  return {
    'centroid-east': numberOf(
      Float64Array.from(draws, ([east]) => east),
      'uas',
      definition('east'),
    ),
    'centroid-north': numberOf(
      Float64Array.from(draws, ([, north]) => north),
      'uas',
      definition('north'),
    ),
  };
}

/** Sum, and first moments east and north about the centre of the array, radians. */
function momentsOf({ nx, ny, pixelRadians }: Basis, pixels: Float64Array): [number, number, number] {
  let [sum, x, y] = [0, 0, 0];
  for (let p = 0; p < pixels.length; p++) {
    sum += pixels[p];
    x += pixels[p] * ((nx - 1) / 2 - (p % nx)) * pixelRadians;
    y += pixels[p] * (Math.floor(p / nx) - (ny - 1) / 2) * pixelRadians;
  }
  return [sum, x, y];
}
