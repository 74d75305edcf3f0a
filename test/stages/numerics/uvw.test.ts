/** Identities of the rotation to (u, v, w). */

import fc from 'fast-check';
import { expect, test } from 'vitest';
import { uvwRotation } from '../../../stages/numerics/uvw.ts';

const angle = fc.double({ min: -3.2, max: 3.2, noNaN: true });
const metres = fc.double({ min: -1e7, max: 1e7, noNaN: true });

test('keeps lengths and angles', () => {
  fc.assert(
    fc.property(
      angle,
      angle,
      fc.tuple(metres, metres, metres),
      fc.tuple(metres, metres, metres),
      (H, d, a, b) => {
        const rotate = uvwRotation(H, d);
        const dot = (p: readonly number[], q: readonly number[]) =>
          p.reduce((sum, value, axis) => sum + value * (q[axis] as number), 0);
        expect(Math.abs(dot(rotate(a), rotate(b)) - dot(a, b))).toBeLessThan(1e-14 * 3e14 * 3);
      },
    ),
    { seed: 6 },
  );
});

test('points w to the source: at Greenwich hour angle H it stands over longitude −H', () => {
  const [H, d] = [0.7, 0.3];
  const towards = [Math.cos(d) * Math.cos(-H), Math.cos(d) * Math.sin(-H), Math.sin(d)] as const;
  const [u, v, w] = uvwRotation(H, d)(towards);
  expect([u, v]).toEqual([expect.closeTo(0, 12), expect.closeTo(0, 12)]);
  expect(w).toBeCloseTo(1, 12);
});

test('has u to the east and v to the north for a source overhead', () => {
  // On the equator at longitude 0, source overhead: east is +Y, north is +Z.
  const rotate = uvwRotation(0, 0);
  expect(rotate([0, 1, 0])).toEqual([1, 0, 0]);
  expect(rotate([0, 0, 1])).toEqual([0, 1, 0]);
});
