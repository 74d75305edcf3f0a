/** (u, v, w) against values computed outside from Thompson, Moran & Swenson, 3rd ed., eq. 4.1. */

import { expect, test } from 'vitest';
import { type Triple, uvwRotation } from '../../stages/numerics/uvw.ts';

const DEGREE = Math.PI / 180;
const XYZ: Triple = [2e6, -3e6, 4e6];

// Hour angle in hours, declination in degrees, (u, v, w) in metres. The first is (Y, Z, X) by inspection; the others
// were computed independently in 40 digits.
test.each([
  [0, 0, [-3000000, 4000000, 2000000]],
  [0, 90, [-3000000, -2000000, 4000000]],
  [6, 0, [2000000, 4000000, 3000000]],
  [2.5, 35, [-1162537.162856264, 1318996.9806566995, 5090064.27366066]],
  [-3.25, -22.5, [-3481717.0602581613, 3337009.654976961, -2396249.75219567]],
])('at hour angle %d h and declination %d degrees agrees to 1e-9', (hours, declination, expected) => {
  const uvw = uvwRotation(hours * 15 * DEGREE, declination * DEGREE)(XYZ);
  const length = Math.hypot(...XYZ);
  uvw.forEach((value, axis) => {
    expect(Math.abs(value - (expected[axis] as number))).toBeLessThan(1e-9 * length);
  });
});

test('runs along the ellipse u² + ((v − Z cos δ)/sin δ)² = X² + Y² (ibid., section 4.1)', () => {
  const declination = 35 * DEGREE;
  for (let hours = -12; hours < 12; hours += 0.7) {
    const [u, v] = uvwRotation(hours * 15 * DEGREE, declination)(XYZ);
    const vertical = (v - XYZ[2] * Math.cos(declination)) / Math.sin(declination);
    expect((u * u + vertical * vertical) / (XYZ[0] ** 2 + XYZ[1] ** 2)).toBeCloseTo(1, 12);
  }
});
