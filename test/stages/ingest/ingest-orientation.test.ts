/** Orientation from end to end: the data alone never betray a picture turned by 180°. */

import { describe, expect, it } from 'vitest';
import { memorySink } from '../../../stages/bytes.ts';
import { writeUvGroups } from '../../../stages/formats/uv-groups.ts';
import {
  C,
  DEC,
  FREQUENCY,
  POINT,
  pointVisibility,
  project,
  RA,
  REFERENCE_JD,
  rows,
  STATIONS,
  times,
  uvFile,
} from '../uv-synthetic.ts';
import { runIngest } from './run-ingest.ts';

const wrapped = (phase: number) => phase - 2 * Math.PI * Math.round(phase / (2 * Math.PI));

describe('a point source east and south of the centre', () => {
  it('has the phase −2π(ux + vy) in our convention (check value vcz.sign)', () => {
    const { visibilities } = runIngest(uvFile(rows({ days: times(3, 1) })));
    for (let k = 0; k < visibilities.count; k++) {
      const phase = Math.atan2(visibilities.im[k], visibilities.re[k]);
      const expected = -2 * Math.PI * (visibilities.u[k] * POINT.x + visibilities.v[k] * POINT.y);
      expect(Math.abs(wrapped(phase - expected))).toBeLessThan(1e-5);
    }
    // Far enough from 0 for a wrong sign to show: turns, not thousandths of them.
    expect(Math.max(...visibilities.u.map((u) => Math.abs(u * POINT.x)))).toBeGreaterThan(0.1);
    // vcz.sign: u = 1e9, l = 10 µas gives −17.4532925199433 degrees.
    const k = visibilities.u.findIndex((u) => u > 5e8);
    const alongU = -360 * visibilities.u[k] * POINT.x;
    expect(alongU / -17.4532925199433).toBeCloseTo((visibilities.u[k] / 1e9) * 3, 9);
  });

  it('reaches us right through our own writer, whose u and v come from the delay that each station sees', () => {
    // A wave from direction s reaches a station at r earlier by r·s/c, so the product of the signals of 1 and 2 has the
    // phase +2πν (r1 − r2)·s/c (Thompson, Moran & Swenson, 3rd ed., section 2.1); delay tracking takes s0 off.
    const day = 0.31;
    const [one, four] = [STATIONS[1], STATIONS[0]];
    const baseline = one.xyz.map((value, axis) => value - four.xyz[axis]);
    const [u, v, w] = project(baseline, day);
    // (r1 − r2)·(s − s0)/c from the two directions themselves, the second displaced by (x, y) on the sky.
    const dec = (DEC * Math.PI) / 180 + POINT.y;
    const ra = RA + ((POINT.x / Math.cos(dec)) * 180) / Math.PI;
    const [, , displaced] = project(baseline, day, ra, (dec * 180) / Math.PI);
    const phase = 2 * Math.PI * FREQUENCY * (displaced - w);
    const [re, im] = [0.8 * Math.cos(phase), 0.8 * Math.sin(phase)];
    // The generator's formula agrees with that of the delays.
    expect(pointVisibility(u, v)[1]).toBeCloseTo(im, 4);
    const sink = memorySink();
    const hand = { re: Float32Array.of(re), im: Float32Array.of(im), weight: Float32Array.of(100) };
    writeUvGroups(sink, {
      target: { name: 'INVENTED', raDegrees: RA, decDegrees: DEC },
      arrayName: 'TESTARRAY',
      remark: 'invented data',
      frequencyHz: FREQUENCY,
      bandwidthHz: 2e9,
      stations: [one, four],
      referenceDate: REFERENCE_JD,
      gst0Degrees: 201.3,
      degreesPerDay: 360.985647,
      count: 1,
      station1: Int32Array.of(0),
      station2: Int32Array.of(1),
      timeJd: Float64Array.of(REFERENCE_JD + day),
      u: Float64Array.of(u),
      v: Float64Array.of(v),
      w: Float64Array.of(w),
      integrationSeconds: Float64Array.of(10),
      rr: hand,
      ll: hand,
    });
    const { visibilities, report } = runIngest(sink.bytes());
    expect(report.remark).toBe('invented data');
    expect(visibilities.remark).toBe('invented data');
    const expected = -2 * Math.PI * (visibilities.u[0] * POINT.x + visibilities.v[0] * POINT.y);
    expect(Math.abs(wrapped(Math.atan2(visibilities.im[0], visibilities.re[0]) - expected))).toBeLessThan(
      1e-4,
    );
    expect(visibilities.u[0]).toBeCloseTo((-u * C) / visibilities.wavelengthMetres, -3);
  });
});
