/** What we write, as an independent program reads it. astropy and fitsverify looked at exactly these bytes (digest);
 *  the committed result of test/data/scripts/verify-ours.py says what they found. When a writer changes on purpose, the
 *  script is run again. */

import { createHash } from 'node:crypto';
import { describe, expect, test } from 'vitest';
import { fixtureBytes } from './fits/fixtures.ts';
import { basis, image, microarcsec, ourFiles, posterior, visibilities } from './our-files.ts';

interface Verified {
  sha256: string;
  fitsverify: string[];
  hdus: { extname: string; header: Record<string, unknown>; content: never }[];
}

const verified: Record<string, Verified> = JSON.parse(
  Buffer.from(fixtureBytes('ours-verified.json')).toString('utf8'),
);
const hdusOf = (name: string) => (verified[name] as Verified).hdus;
const contentOf = (name: string, hdu: number) =>
  hdusOf(name)[hdu]?.content as unknown as Record<string, unknown>;

test.each(Object.entries(ourFiles))('%s has the bytes that were looked at', (name, make) => {
  expect(createHash('sha256').update(make()).digest('hex')).toBe(verified[name]?.sha256);
});

test.each(Object.keys(ourFiles))(
  '%s has no error, and no warning but of the axis that random groups lack',
  (name) => {
    const said = verified[name]?.fitsverify as string[];
    expect(said.at(-1)).toMatch(
      name === 'groups.fits' ? /3 warning\(s\) and 0 error/ : /0 warning\(s\) and 0 error/,
    );
  },
);

describe('astropy reads', () => {
  test('the image and its pixel size', () => {
    expect(contentOf('image.fits', 0)).toEqual({ shape: [4, 5], data: [...image.pixels] });
    const header = hdusOf('image.fits')[0]?.header as { CDELT1: number; CDELT2: number };
    const degrees = (2.5 * microarcsec * 180) / Math.PI;
    expect(header.CDELT2 / degrees).toBeCloseTo(1, 14);
    expect(header.CDELT1).toBe(-header.CDELT2);
    expect(hdusOf('image.fits')[0]?.header.OBJECT).toBe("INVENTED 'LANTERN'");
  });

  test('the basis', () => {
    const planes = [basis.mean, ...basis.components].flatMap((plane) => [...plane]);
    expect(contentOf('basis.fits', 0)).toEqual({ shape: [3, 2, 3], data: planes });
    expect(contentOf('basis.fits', 1)).toEqual({ EIGENVALUE: [...basis.eigenvalues] });
    expect(hdusOf('basis.fits')[1]?.header.TOTVAR).toBe(5.1);
    expect(hdusOf('basis.fits')[0]?.header.RESOLUTN).toBeCloseTo(15e-6, 18);
    const { FAMILY, SCORE } = contentOf('basis.fits', 2) as { FAMILY: string[]; SCORE: number[][] };
    expect(FAMILY.map((name) => name.trimEnd())).toEqual(basis.families);
    expect(SCORE.flat()).toEqual([...basis.scores]);
  });

  test('the posterior', () => {
    const { FLUX, COEFFICIENT } = contentOf('posterior.fits', 1) as {
      FLUX: number[];
      COEFFICIENT: number[][];
    };
    expect(FLUX).toEqual([...posterior.flux]);
    expect(COEFFICIENT.flat()).toEqual([...posterior.coefficients]);
  });

  test('the visibilities', () => {
    expect(hdusOf('visibilities.fits')[0]?.header.REMARK).toBe(visibilities.remark);
    const vis = contentOf('visibilities.fits', 4) as Record<string, number[]>;
    expect(vis.STA_INDEX).toEqual([
      [1, 2],
      [1, 3],
      [2, 3],
    ]);
    // |0.5 - 0.125i|, and its phase: Python's cmath.
    expect(vis.VISAMP?.[0]).toBeCloseTo(0.5153882032022076, 15);
    expect(vis.VISPHI?.[0]).toBeCloseTo(-14.036243467926479, 13);
    expect(vis.VISPHI?.slice(1)).toEqual([180, 90]);
    expect(vis.UCOORD?.[0]).toBeCloseTo(1.5e9 * visibilities.wavelengthMetres, 8);
    const { STAXYZ } = contentOf('visibilities.fits', 2) as { STAXYZ: number[][] };
    expect(STAXYZ).toEqual(visibilities.stations.map(({ xyz }) => xyz));
  });

  test('squared visibilities and triple products, undefined where nothing was measured', () => {
    const squares = contentOf('optical.fits', 5) as Record<string, number[]>;
    expect(squares.VIS2DATA).toEqual([0.25, -0.0625]);
    expect(squares.STA_INDEX).toEqual([
      [1, 2],
      [3, 1],
    ]);
    expect(squares.UCOORD?.[0]).toBeCloseTo(24, 13); // 1.5e7 wavelengths of 1.6 um
    const triples = contentOf('optical.fits', 6) as Record<string, (number | null)[]>;
    expect(triples.T3AMP).toEqual([0.125, null, 0.5]);
    expect(triples.T3AMPERR).toEqual([0.03125, null, 0.25]);
    // 0.5 rad and 3 rad in degrees: 90/pi and 540/pi, Python's math.
    expect(triples.T3PHI?.[0]).toBeCloseTo(-28.64788975654116, 13);
    expect(triples.T3PHI?.[1]).toBeCloseTo(171.88733853924697, 12);
    expect(triples.T3PHI?.[2]).toBeNull();
    expect(triples.STA_INDEX).toEqual([
      [1, 2, 3],
      [2, 3, 1],
      [3, 1, 2],
    ]);
  });

  test('every form of column, an image extension and random groups', () => {
    expect(contentOf('forms.fits', 1)).toEqual({
      FLAG: [
        [true, false, true],
        [false, false, true],
      ],
      BYTE: [0, 255],
      SHORT: [-32768, 32767],
      LONG: [
        [1, -2],
        [3, -2147483648],
      ],
      BIG: [-9007199254740991, 5],
      TEXT: ['ab   ', "c'd e"],
      SINGLE: [0.25, Math.fround(-1.5e20)],
      DOUBLE: [
        [0.1, 0.2],
        [-1e-300, 1e300],
      ],
      COMPLEX: [
        [1, -2],
        [0.5, 0.25],
      ],
    });
    expect(contentOf('forms.fits', 2)).toEqual({ shape: [3], data: [-5, 0, 300] });
    expect(contentOf('groups.fits', 0)).toEqual({
      data: [1, 2, 3, 4, 5, 6],
      parameters: { 'UU---SIN': [4, 5], DATE: [2460000.75, 2460001] },
    });
  });
});
