import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { beamOf } from '../../stages/figure/beam.ts';
import { describeFindings } from '../../stages/figure/findings.ts';
import { histogram } from '../../stages/figure/posterior-plot.ts';
import {
  blurred,
  centroid,
  evenDraws,
  MICROARCSEC,
  profileRadii,
  radialProfile,
} from '../../stages/figure/sky.ts';
import { drawImage } from '../../stages/imaging/measure-draws.ts';
import { inventedBasis, inventedPosterior } from './figure-synthetic.ts';

const N = 65;
const PIXEL = 2 * MICROARCSEC;

/** A circular Gaussian of unit peak and a FWHM in pixels, about a place in pixels east and north. */
function gaussian(fwhm: number, east = 0, north = 0) {
  const pixels = Float64Array.from({ length: N * N }, (_, p) => {
    const x = (N - 1) / 2 - (p % N) - east;
    const y = Math.floor(p / N) - (N - 1) / 2 - north;
    return Math.exp((-4 * Math.LN2 * (x * x + y * y)) / (fwhm * fwhm));
  });
  return { nx: N, ny: N, pixelRadians: PIXEL, pixels };
}

describe('beam', () => {
  it('is that of a Gaussian coverage, whose Fourier transform is known', () => {
    // exp(-u²/2s²) transforms to exp(-2π²s²x²), FWHM sqrt(2 ln 2)/(π s): common practice. Points at ±s on both axes
    // have the same second moments.
    const [s, t] = [3e9, 1e9];
    const beam = beamOf(Float64Array.of(s, -s, 0, 0), Float64Array.of(0, 0, t, -t));
    const fwhm = (each: number) => Math.sqrt(2 * Math.LN2) / (Math.PI * (each / Math.SQRT2));
    expect(beam?.minor).toBeCloseTo(fwhm(s), 20);
    expect(beam?.major).toBeCloseTo(fwhm(t), 20);
    // The coverage is long from east to west, so the beam is long from north to south.
    expect(beam?.positionAngleDegrees).toBeCloseTo(0, 9);
  });

  it('turns with the coverage', () => {
    // A line of long baselines at position angle 30 degrees: u = r sin 30, v = r cos 30. The beam is longest across.
    const [sin, cos] = [0.5, Math.sqrt(3) / 2];
    const along = [3e9 * sin, 3e9 * cos];
    const across = [1e9 * cos, -1e9 * sin];
    const beam = beamOf(Float64Array.of(along[0], across[0]), Float64Array.of(along[1], across[1]));
    expect(beam?.positionAngleDegrees).toBeCloseTo(120, 9);
  });

  it('is none when all baselines are parallel', () => {
    expect(beamOf(Float64Array.of(1e9, 2e9), Float64Array.of(2e9, 4e9))).toBeNull();
    expect(beamOf(new Float64Array(0), new Float64Array(0))).toBeNull();
  });
});

describe('sky', () => {
  it('blurs a Gaussian to a wider Gaussian of the same flux', () => {
    // Widths add in quadrature, the peak falls as the area grows: common practice.
    const wide = blurred(gaussian(6), 8 * PIXEL);
    const wanted = gaussian(10);
    for (let p = 0; p < N * N; p += 7) expect(wide.pixels[p]).toBeCloseTo(wanted.pixels[p] * 0.36, 5);
  });

  it('averages around the centre, wherever that is', () => {
    const image = gaussian(12, 4, -3);
    const centre = centroid(image);
    expect(centre.east / PIXEL).toBeCloseTo(4, 4);
    expect(centre.north / PIXEL).toBeCloseTo(-3, 4);
    const radii = profileRadii(image, centre, Number.POSITIVE_INFINITY);
    const profile = radialProfile(image, centre, radii);
    radii.forEach((radius, k) => {
      const r = radius / PIXEL;
      // A cubic spline through pixels of a Gaussian 12 wide errs by less than 1e-4.
      expect(Math.abs(profile[k] - Math.exp((-4 * Math.LN2 * r * r) / 144))).toBeLessThan(2e-4);
    });
    expect(radii[radii.length - 1] / PIXEL).toBeCloseTo(28, 0);
  });

  it('makes the image of a draw by the definition', () => {
    const basis = inventedBasis(3);
    const posterior = inventedPosterior(basis, 5);
    const image = drawImage(basis, posterior, 4);
    for (const p of [0, 999, 2000, 4095]) {
      let sum = posterior.flux[4] * basis.mean[p];
      for (let k = 0; k < 3; k++) sum += posterior.coefficients[12 + k] * basis.components[k][p];
      expect(image.pixels[p]).toBeCloseTo(sum, 15);
    }
  });

  it('takes draws evenly and never more than there are', () => {
    const posterior = inventedPosterior(inventedBasis(1), 10);
    expect(evenDraws(posterior, 4)).toEqual([0, 2, 5, 7]);
    expect(evenDraws(posterior, 100)).toHaveLength(10);
  });
});

describe('histogram', () => {
  it('counts every value once', () => {
    const values = fc.float64Array({ minLength: 1, maxLength: 300, min: -1e6, max: 1e6, noNaN: true });
    fc.assert(
      fc.property(values, (sample) => {
        const { counts, width } = histogram(sample);
        expect(counts.reduce((sum, count) => sum + count, 0)).toBe(sample.length);
        expect(width).toBeGreaterThan(0);
      }),
    );
  });
});

describe('findings', () => {
  it('are told in one line', () => {
    const finding = (check: string, found: 'within limits' | 'marginal' | 'out of limits') => ({
      check,
      finding: found,
    });
    expect(describeFindings([])).toBe('Calibration: no check was made');
    expect(describeFindings([finding('a', 'within limits'), finding('b', 'within limits')])).toBe(
      'Calibration: 2 checks within limits',
    );
    expect(describeFindings([finding('a', 'out of limits'), finding('b', 'marginal')])).toBe(
      'Calibration: marginal: b; out of limits: a',
    );
  });
});
