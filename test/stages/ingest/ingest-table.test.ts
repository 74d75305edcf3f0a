import { describe, expect, it } from 'vitest';
import {
  C,
  FREQUENCY,
  POINT,
  pointVisibility,
  REFERENCE_MJD,
  rows,
  STATIONS,
  times,
  uvFile,
} from '../uv-synthetic.ts';
import { problemOf, runIngest } from './run-ingest.ts';

const names = new Map(STATIONS.map((station) => [station.number, station.name]));

/** The synthetic rows as a table, u and v counted from station 1 to station 2 in metres, phases in degrees. */
function csv(change: (fields: string[], k: number) => string[] = (fields) => fields): Uint8Array {
  const lines = rows({ days: times(2, 4) }).map((row, k) => {
    const [re, im] = pointVisibility(row.u, row.v);
    const amplitude = 1000 * Math.hypot(re, im);
    const phase = (Math.atan2(im, re) * 180) / Math.PI;
    const fields = [
      names.get(row.number1) as string,
      names.get(row.number2) as string,
      `${row.day * 24}`,
      `${-row.u * C}`,
      `${-row.v * C}`,
    ];
    return change([...fields, `${amplitude}`, `${phase}`, '10'], k).join(',');
  });
  return new TextEncoder().encode(
    `# invented data\nfirst,second,hour,u,v,mJy,deg,noise\n${lines.join('\n')}\n`,
  );
}

const parameters = {
  columns: {
    station1: 'first',
    station2: { column: 'second' },
    time: { column: 'hour', unit: 'h' },
    u: { column: 'u', unit: 'm' },
    v: { column: 'v', unit: 'm' },
    amplitude: { column: 'mJy', unit: 'mJy' },
    phase: 'deg',
    sigma: { column: 'noise', unit: 'mJy' },
  },
  timeOrigin: REFERENCE_MJD,
  table: {
    target: 'INVENTED',
    ra: 187.5,
    dec: 12.25,
    frequency: FREQUENCY,
    bandwidth: 2e9,
    array: 'TESTARRAY',
    remark: 'invented data',
    stations: {},
  },
};

describe('a table of visibilities', () => {
  it('gives what the same data give as random groups', () => {
    const { visibilities, report } = runIngest(csv(), parameters);
    const groups = runIngest(uvFile(rows({ days: times(2, 4), weight: 5e3 }))).visibilities;
    expect(report.format).toBe('csv');
    expect(visibilities.count).toBe(groups.count);
    const at = (names: string[], scan: number, data: typeof groups) =>
      [...data.scan].findIndex(
        (each, k) =>
          each === scan &&
          names.includes(data.stations[data.station1[k]].name) &&
          names.includes(data.stations[data.station2[k]].name),
      );
    for (const scan of [0, 1]) {
      const [a, b] = [at(['ONE', 'FOUR'], scan, visibilities), at(['ONE', 'FOUR'], scan, groups)];
      // Stations of a table stand in the order of their names: FOUR, ONE; so the baseline is turned round.
      expect(visibilities.u[a] / -groups.u[b]).toBeCloseTo(1, 6);
      expect(visibilities.re[a]).toBeCloseTo(groups.re[b], 5);
      expect(visibilities.im[a]).toBeCloseTo(-groups.im[b], 5);
      expect(visibilities.sigma[a]).toBeCloseTo(groups.sigma[b], 12);
      expect((visibilities.timeMjd[a] - groups.timeMjd[b]) * 86400).toBeCloseTo(0, 2);
    }
  });

  it('warns when the last line has no end: a number there may have lost digits', () => {
    const warning = 'The last line has no line break: the table may be cut short.';
    expect(runIngest(csv(), parameters).stage.warnings).not.toContain(warning);
    expect(runIngest(csv().slice(0, -1), parameters).stage.warnings).toContain(warning);
  });

  it('keeps the phase −2π(ux + vy)', () => {
    const { visibilities } = runIngest(csv(), { ...parameters, averaging: 'none' });
    for (let k = 0; k < visibilities.count; k++) {
      const expected = -2 * Math.PI * (visibilities.u[k] * POINT.x + visibilities.v[k] * POINT.y);
      expect(Math.cos(expected)).toBeCloseTo(visibilities.re[k] / 0.8, 6);
      expect(Math.sin(expected)).toBeCloseTo(visibilities.im[k] / 0.8, 6);
    }
  });

  it('checks u and v where positions are given: the reversed sign is an error', () => {
    // GMST of the day by Meeus eq. 12.4; the generator's own sidereal time is moved to it through the right ascension.
    const gmst = (280.46061837 + 360.98564736629 * (REFERENCE_MJD - 51544.5)) % 360;
    const stations = Object.fromEntries(STATIONS.map((station) => [station.name, station.xyz]));
    const table = { ...parameters.table, ra: (((187.5 + gmst - 201.3) % 360) + 360) % 360, stations };
    const checked = runIngest(csv(), { ...parameters, table });
    expect(checked.report.uv.finding).toContain('the sign is that of the format');
    const turned = csv((f) => [f[0], f[1], f[2], `${-Number(f[3])}`, `${-Number(f[4])}`, ...f.slice(5)]);
    expect(problemOf(turned, { ...parameters, table }).code).toBe('uv-sign');
    const right = runIngest(turned, { ...parameters, table, uvSign: 'reversed' });
    expect(right.visibilities.u).toEqual(checked.visibilities.u);
  });

  it('warns about stations without position', () => {
    expect(runIngest(csv(), parameters).stage.warnings?.[0]).toBe(
      'No position is known of EIGHT, FOUR, ONE, SEVEN: written as (0, 0, 0).',
    );
  });

  it('drops and counts what has no sigma, no value or a flag', () => {
    const bad = csv((f, k) => [
      ...f.slice(0, 6),
      k === 3 ? 'nan' : f[6],
      ['0', '-1', 'nan', '10', 'inf'][k] ?? '10',
    ]);
    const { report } = runIngest(bad, parameters);
    expect(report.samples.dropped).toEqual({
      'weight infinite': 1,
      'flagged by a negative weight': 1,
      'weight not a number': 1,
      'value not finite': 1,
      'weight zero': 1,
    });
  });

  it('drops what a column of flags marks', () => {
    const text = new TextDecoder().decode(csv()).split('\n');
    const flagged = text.map((line, k) =>
      k === 0 || line === '' ? line : `${line},${k === 1 ? 'bad' : k === 5 ? 'true' : 'false'}`,
    );
    const columns = { ...parameters.columns, flag: 'bad' };
    const { report } = runIngest(new TextEncoder().encode(flagged.join('\n')), { ...parameters, columns });
    expect(report.samples.dropped).toEqual({ 'flagged in the file': 1 });
  });

  it('asks for its description', () => {
    expect(problemOf(csv()).message).toBe(
      'parameters: table-undescribed: expected for a table: columns (what stands where, in which unit) and table (target, ra, dec, frequency), got no columns and no table. Add them to the stage.',
    );
  });
});
