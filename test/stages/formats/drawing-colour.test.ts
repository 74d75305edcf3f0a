import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  brightness,
  type ColourMap,
  labOfRgb,
  rgbOfLab,
  signed,
} from '../../../stages/formats/drawing/colour.ts';

/** CIELAB of an sRGB byte triple, written again from the formulas with the runtime's own powers: CIE 15:2004 section
 *  8.2.1 and IEC 61966-2-1 section 5, white D65. */
function directLab(bytes: readonly number[]): [number, number, number] {
  const [r, g, b] = bytes.map((byte) => {
    const c = byte / 255;
    return c <= 0.04045 ? c / 12.92 : ((c + 0.055) / 1.055) ** 2.4;
  });
  const f = (t: number) => (t > 216 / 24389 ? Math.cbrt(t) : ((24389 / 27) * t + 16) / 116);
  const x = f((0.4124 * r + 0.3576 * g + 0.1805 * b) / 0.9505);
  const y = f(0.2126 * r + 0.7152 * g + 0.0722 * b);
  const z = f((0.0193 * r + 0.1192 * g + 0.9505 * b) / 1.089);
  return [116 * y - 16, 500 * (x - y), 200 * (y - z)];
}

function labOfMap({ entries }: ColourMap): [number, number, number][] {
  return Array.from({ length: 256 }, (_, i) => directLab([...entries.subarray(3 * i, 3 * i + 3)]));
}

function distance(p: readonly number[], q: readonly number[]): number {
  return Math.hypot(p[0] - q[0], p[1] - q[1], p[2] - q[2]);
}

describe('colour', () => {
  it('gives published values of CIELAB', () => {
    // L* = 50 where Y = (66/116)^3 = 0.184187: definition, CIE 15:2004. Red, green and blue of sRGB under D65 are
    // (53.24, 80.09, 67.20), (87.73, -86.18, 83.18), (32.30, 79.19, -107.86): widely tabulated, from memory.
    const grey = 1.055 * 0.184187 ** (1 / 2.4) - 0.055;
    expect(labOfRgb([grey, grey, grey])[0]).toBeCloseTo(50, 3);
    const primaries = {
      '1,0,0': [53.24, 80.09, 67.2],
      '0,1,0': [87.73, -86.18, 83.18],
      '0,0,1': [32.3, 79.19, -107.86],
    };
    for (const [key, lab] of Object.entries(primaries)) {
      const found = labOfRgb(key.split(',').map(Number) as [number, number, number]);
      // The tables use matrices with more decimals than the standard prints: 0.05.
      found.forEach((value, k) => {
        expect(Math.abs(value - lab[k])).toBeLessThan(0.05);
      });
    }
  });

  it('comes back from CIELAB to the same colour', () => {
    const component = fc.double({ min: 0, max: 1, noNaN: true });
    fc.assert(
      fc.property(component, component, component, (r, g, b) => {
        const back = rgbOfLab(labOfRgb([r, g, b]));
        expect(distance(back, [r, g, b])).toBeLessThan(1e-9);
      }),
    );
  });

  for (const [name, map] of Object.entries({ brightness, signed })) {
    it(`has a map ${name} whose lightness rises with every step of four colours`, () => {
      const lab = labOfMap(map);
      for (let i = 4; i < 256; i += 4) expect(lab[i][0]).toBeGreaterThan(lab[i - 4][0]);
    });

    it(`has a map ${name} in which equal steps are equal differences of colour`, () => {
      const lab = labOfMap(map);
      const steps = Array.from({ length: 15 }, (_, k) => distance(lab[17 * k], lab[17 * k + 17]));
      const mean = steps.reduce((sum, step) => sum + step, 0) / steps.length;
      // Bytes round a colour by up to half a unit, about 0.3 in CIELAB at either end of a step of 5 to 10, and chords
      // of a bent path are shorter than its arc: 12 % together.
      for (const step of steps) expect(Math.abs(step / mean - 1)).toBeLessThan(0.12);
      const light = Array.from({ length: 15 }, (_, k) => lab[17 * k + 17][0] - lab[17 * k][0]);
      const rise = (lab[255][0] - lab[0][0]) / 15;
      for (const step of light) expect(Math.abs(step - rise)).toBeLessThan(0.7);
    });
  }

  it('shows nought of a signed map as a neutral grey between the ends in lightness', () => {
    const lab = labOfMap(signed);
    expect(Math.hypot(lab[127][1], lab[127][2])).toBeLessThan(3);
    expect(Math.abs(lab[127][0] - (lab[0][0] + lab[255][0]) / 2)).toBeLessThan(1);
  });
});
