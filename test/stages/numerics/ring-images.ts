/** Images for the tests of ring measures, from closed forms; FITS pixel order, lengths in microarcseconds. */

/** One microarcsecond, radians. */
export const UAS = Math.PI / 180 / 3600e6;

export interface BlurredRingOptions {
  readonly nx: number;
  readonly ny?: number;
  readonly pixel: number;
  readonly diameter: number;
  readonly blur: number;
  readonly east?: number;
  readonly north?: number;
  /** Brightness along the ring 1 + 2 b cos(chi - angle); position angle in degrees. */
  readonly b?: number;
  readonly angle?: number;
}

export function imageOf(
  nx: number,
  ny: number,
  pixel: number,
  brightness: (east: number, north: number) => number,
) {
  const pixels = Float64Array.from({ length: nx * ny }, (_, k) =>
    brightness(((nx - 1) / 2 - (k % nx)) * pixel, (Math.floor(k / nx) - (ny - 1) / 2) * pixel),
  );
  return { nx, ny, pixelRadians: pixel * UAS, pixels };
}

/** exp(-x) I0(x) by the integral representation (Abramowitz and Stegun 9.6.16), midpoint rule over half a turn; its
 *  error falls faster than any power once the points resolve the peak of width 1/sqrt(x). */
function besselI0(x: number): number {
  const n = Math.ceil(16 + 5 * Math.sqrt(x));
  let sum = 0;
  for (let k = 0; k < n; k++) sum += Math.exp(x * (Math.cos((Math.PI * (k + 0.5)) / n) - 1));
  return sum / n;
}

/** A thin ring blurred by a circular Gaussian of FWHM `blur`; with `b` the brightness is modulated after blurring. */
export function blurredRingImage(options: BlurredRingOptions) {
  const { nx, ny = nx, pixel, diameter, blur, east = 0, north = 0, b = 0, angle = 0 } = options;
  const s = blur / 2.354820045030949;
  return imageOf(nx, ny, pixel, (x, y) => {
    const r = Math.hypot(x - east, y - north);
    const chi = Math.atan2(x - east, y - north);
    const falloff = Math.exp(-((r - diameter / 2) ** 2) / (2 * s * s));
    if (falloff < 1e-40) return 0;
    return (
      falloff * besselI0((r * diameter) / (2 * s * s)) * (1 + 2 * b * Math.cos(chi - (angle * Math.PI) / 180))
    );
  });
}
