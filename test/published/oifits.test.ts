/** OIFITS against a file made outside: a double source of flux ratio 0.4 at (3, -1.5) mas, computed in Python from
 *  V = [1 + f exp(-2 pi i (u dl + v dm))] / (1 + f) with u = UCOORD / EFF_WAVE and written by astropy.
 *  Source of the layout: Duvert, Young & Hummel 2017, A&A 597, A8. */

import { describe, expect, test } from 'vitest';
import { readOifits } from '../../stages/formats/oifits.ts';
import { fixture } from '../stages/formats/fits/fixtures.ts';

const oifits = readOifits(fixture('double.oifits'));
const [vis] = oifits.vis;
const [vis2] = oifits.vis2;
const [t3] = oifits.t3;
const radians = Math.PI / 180;

describe('the double source', () => {
  test('has the tables and rows of the file', () => {
    expect(oifits.revision).toBe(2);
    expect([vis?.rows, vis2?.rows, t3?.rows]).toEqual([6, 6, 4]);
    expect([...(vis?.wavelength.wavelengths ?? [])]).toEqual([
      1.5499999790336005e-6, 1.6000000186977559e-6, 1.6499999446750735e-6,
    ]);
    expect(oifits.arrays[0]?.stations.map(({ xyz }) => xyz)).toEqual([
      [0, 0, 0],
      [60, 10, 0],
      [20, 80, 0],
      [-50, 40, 5],
    ]);
  });

  // Source: check value oifits.file, tolerance 1e-9.
  test('has the squared visibilities and closure phases that Python computed', () => {
    const squared = [0.18575802341210187, 0.18367347976984447, 0.18553015436542966];
    squared.forEach((value, i) => {
      expect(vis2?.squared[i]).toBeCloseTo(value, 9);
    });
    const phases = [
      -37.35117475851025, -40.910369350175586, -43.80258859407965, 43.62495843016628, 35.72627363683431,
      27.509428002913676, 48.176981380038015, 49.96874152199649, 50.82970154735431, -32.7991518086385,
      -26.6679014650134, -20.48231504963902,
    ];
    phases.forEach((phase, i) => {
      expect(t3?.phaseDegrees[i]).toBeCloseTo(phase, 9);
    });
  });

  // Source: the definition of the triple product, T3 = V(AB) V(BC) V(CA) with V(CA) the conjugate of V(AC).
  test('has triple products of OI_VIS that equal OI_T3 to 1e-12', () => {
    if (vis === undefined || t3 === undefined) throw new Error('no tables');
    const rowOf = new Map<string, number>();
    for (let row = 0; row < vis.rows; row++) {
      rowOf.set(`${vis.stations[2 * row]}-${vis.stations[2 * row + 1]}`, row);
    }
    for (let i = 0; i < t3.rows * t3.channels; i++) {
      const row = Math.floor(i / t3.channels);
      const [a, b, c] = t3.stations.subarray(3 * row, 3 * row + 3);
      const at = [`${a}-${b}`, `${b}-${c}`, `${a}-${c}`].map(
        (key) => (rowOf.get(key) as number) * vis.channels + (i % t3.channels),
      );
      const amplitude = at.reduce((product, k) => product * (vis.amplitude[k] as number), 1);
      const [ab, bc, ac] = at.map((k) => (vis.phaseDegrees[k] as number) * radians);
      const phase = (ab as number) + (bc as number) - (ac as number);
      const expected = (t3.phaseDegrees[i] as number) * radians;
      expect(Math.abs(amplitude - (t3.amplitude[i] as number))).toBeLessThan(1e-12);
      expect(Math.abs(Math.sin((phase - expected) / 2))).toBeLessThan(1e-12);
    }
  });
});
