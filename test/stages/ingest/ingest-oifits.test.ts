import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { memorySink } from '../../../stages/bytes.ts';
import type { Visibilities } from '../../../stages/data.ts';
import { writeVisibilities } from '../../../stages/formats/visibilities-write.ts';
import { all, type OiFile, setCard, setValue, sourceOfFile, validFile } from '../formats/oifits-files.ts';
import { project, REFERENCE_MJD, rows, STATIONS, times, uvFile } from '../uv-synthetic.ts';
import { problemOf, runIngest } from './run-ingest.ts';

const fixture = (name: string) => readFileSync(new URL(`../../data/fits/${name}`, import.meta.url));

describe('OIFITS', () => {
  it('gives the complex visibilities of one wavelength, as astropy wrote them', () => {
    const { visibilities, report, stage } = runIngest(fixture('double.oifits'), { channels: [2] });
    expect(report.format).toBe('oifits');
    expect(visibilities.count).toBe(6);
    expect(visibilities.wavelengthMetres).toBeCloseTo(1.6e-6, 12);
    // Source: test/data/scripts/make-oifits-fixtures.py, V = (1 + f exp(−2πi(u l + v m)))/(1 + f), f = 0.4,
    // (l, m) = (3, −1.5) mas, and the station positions below; the errors are 0.01.
    const mas = Math.PI / 180 / 3.6e6;
    const xy = [
      [0, 0],
      [60, 10],
      [20, 80],
      [-50, 40],
    ];
    for (let k = 0; k < 6; k++) {
      const [a, b] = [visibilities.station1[k], visibilities.station2[k]];
      const [u, v] = [0, 1].map((axis) => (xy[b][axis] - xy[a][axis]) / Math.fround(1.6e-6));
      expect(visibilities.u[k]).toBeCloseTo(u, 2);
      expect(visibilities.v[k]).toBeCloseTo(v, 2);
      const phase = -2 * Math.PI * (u * 3 * mas - v * 1.5 * mas);
      expect(visibilities.re[k]).toBeCloseTo((1 + 0.4 * Math.cos(phase)) / 1.4, 10);
      expect(visibilities.im[k]).toBeCloseTo((0.4 * Math.sin(phase)) / 1.4, 10);
      expect(visibilities.sigma[k]).toBeCloseTo(0.01, 12);
    }
    expect(stage.warnings?.[0]).toBe(
      'The visibilities are normalised: a total flux of 1 is written as 1 Jy.',
    );
    expect(stage.warnings?.[1]).toBe(
      '1 OI_VIS2 and 1 OI_T3 are left out: the complex visibilities of OI_VIS hold what they say.',
    );
  });

  it('gives squared visibilities and triple products where complex ones lack a reference', () => {
    const text = Buffer.from(fixture('double.oifits')).toString('latin1');
    // The card's length stays; the sums, which would be wrong, get names that mean nothing.
    const differential = text
      .replace("'absolute'    ", "'differential'")
      .replaceAll('CHECKSUM=', 'UNCHECKS=')
      .replaceAll('DATASUM =', 'UNDATASU=');
    expect(differential).not.toBe(text);
    const bytes = Buffer.from(differential, 'latin1');
    expect(bytes.length).toBe(text.length);
    const { visibilities, stage } = runIngest(bytes, { channels: [2] });
    expect(visibilities.count).toBe(0);
    expect(stage.warnings?.join(' ')).toContain(
      '1 OI_VIS of data are left out: their amplitudes or phases lack a reference.',
    );
    // Source: the same script. V2 = |V|^2, T3PHI = arg V12 V23 conj(V13).
    const mas = Math.PI / 180 / 3.6e6;
    const V = (u: number, v: number) => {
      const phase = -2 * Math.PI * (u * 3 * mas - v * 1.5 * mas);
      return [(1 + 0.4 * Math.cos(phase)) / 1.4, (0.4 * Math.sin(phase)) / 1.4];
    };
    const { squared, triples } = visibilities as Required<Visibilities>;
    expect([squared.count, triples.count > 0]).toEqual([6, true]);
    for (let k = 0; k < 6; k++) {
      const [re, im] = V(squared.u[k], squared.v[k]);
      expect(squared.value[k]).toBeCloseTo(re * re + im * im, 10);
    }
    for (let t = 0; t < triples.count; t++) {
      const [u1, v1, u2, v2] = [triples.u1[t], triples.v1[t], triples.u2[t], triples.v2[t]];
      const angle = ([re, im]: number[]) => Math.atan2(im, re);
      const phase = angle(V(u1, v1)) + angle(V(u2, v2)) - angle(V(u1 + u2, v1 + v2));
      expect(Math.sin(triples.phase[t] - phase)).toBeCloseTo(0, 9);
    }
  });

  describe('with two arrays', () => {
    // WICK stands in both arrays, at two places; Lamp was seen by both.
    const twoArrays = (change: (file: OiFile) => void = () => {}) => {
      const file = validFile();
      file.tables = file.tables.filter(({ extname }) => !['OI_VIS', 'OI_T3', 'OI_FLUX'].includes(extname));
      setValue('OI_VIS2', 'TARGET_ID', 0, 4)(file);
      setValue('OI_VIS2', 'TARGET_ID', 1, 4)(file);
      change(file);
      const source = sourceOfFile(file);
      return source.read(0, source.size);
    };
    const namesOf = (bytes: Uint8Array) =>
      runIngest(bytes, { target: 'Lamp' }).visibilities.stations.map(({ name }) => name);

    it('keeps stations of one name apart by the name of their array', () => {
      const { visibilities } = runIngest(twoArrays(), { target: 'Lamp' });
      const { stations, squared } = visibilities as Required<Visibilities>;
      expect(stations.map(({ name }) => name)).toEqual(['WICK', 'FLINT', 'EMBER', 'WICK (FAR)', 'COAL']);
      // Two baselines at two wavelengths of NEAR, one at three of FAR.
      const pairs = Array.from(squared.station1, (first, k) => `${first}-${squared.station2[k]}`).sort();
      expect(pairs).toEqual(['0-1', '0-1', '0-2', '0-2', '3-4', '3-4', '3-4']);
      const without = runIngest(twoArrays(), { target: 'Lamp', leaveOut: ['WICK (FAR)'] });
      expect(without.visibilities.squared?.count).toBe(4);
    });

    it('takes one station described twice for one', () => {
      const near = twoArrays((file) => {
        const [first, second] = file.tables.filter(({ extname }) => extname === 'OI_ARRAY');
        second.cards = second.cards.map(([name, value]) => [name, name === 'FRAME' ? 'GEOCENTRIC' : value]);
        const places = first.columns.find(({ name }) => name === 'STAXYZ') as unknown as {
          values: number[];
        };
        const place = places.values.slice(0, 3);
        second.columns = second.columns.map((each) =>
          each.name === 'STAXYZ' ? { ...each, values: [...place, 9, 9, 9] } : each,
        );
      });
      expect(namesOf(near)).toEqual(['WICK', 'FLINT', 'EMBER', 'COAL']);
    });

    it('calls a station without name by its telescope or number, and refuses two of one name', () => {
      expect(namesOf(twoArrays(setValue('OI_ARRAY', 'STA_NAME', 1, '')))).toContain('FLINT');
      const bare = all(setValue('OI_ARRAY', 'STA_NAME', 1, ''), setValue('OI_ARRAY', 'TEL_NAME', 1, ''));
      expect(namesOf(twoArrays(bare))).toContain('station 2');
      expect(
        problemOf(twoArrays(setValue('OI_ARRAY', 'STA_NAME', 1, 'WICK')), { target: 'Lamp' }).message,
      ).toBe(
        'OI_ARRAY NEAR, STA_INDEX 2: doubled-station: expected a STA_NAME of its own for every station of the array, got "WICK". Correct the table with the program that wrote the file.',
      );
    });

    it('says that correlations are not used, and that a flux without unit is taken for Jy', () => {
      const file = validFile();
      file.tables = file.tables.filter(({ extname }) => extname !== 'OI_VIS2');
      setCard('OI_VIS', 'AMPTYP', 'correlated flux')(file);
      setValue('OI_VIS', 'UCOORD', 0, 60)(file);
      const source = sourceOfFile(file);
      const { stage } = runIngest(source.read(0, source.size), {
        ...{ target: 'Lantern', bands: [1], channels: [1], rules: 'ignore', uvSign: 'as-written' },
      });
      expect(stage.warnings).toContain(
        'The correlations in OI_CORR are not used: errors count as independent.',
      );
      expect(stage.warnings).toContain(
        'The correlated fluxes of data, HDU 7 (OI_VIS) have no unit: they are taken for Jy.',
      );
    });

    it('refuses a target whose name is that of two', () => {
      const bytes = twoArrays(setValue('OI_TARGET', 'TARGET', 0, 'Lamp'));
      expect(problemOf(bytes, { target: 'Lamp' }).found).toBe('Lamp, Lamp');
    });
  });

  it('does not average wavelengths that lie far apart', () => {
    expect(problemOf(fixture('double.oifits')).code).toBe('wide-band');
    expect(runIngest(fixture('double.oifits'), { channels: [1, 2] }).report.samples.read).toBe(12);
  });

  it('with several targets asks which one', () => {
    expect(problemOf(fixture('two-arrays.oifits')).message).toContain(
      'several-targets: expected one target, or the parameter target, got ALPHA, BETA',
    );
  });

  it('of our own comes back as it went in', () => {
    const first = runIngest(uvFile(rows({ days: times(3, 4) })));
    const again = runIngest(first.bytes);
    const close = (name: 'u' | 'v' | 're' | 'im' | 'sigma' | 'timeMjd', digits: number) => {
      for (const [k, value] of first.visibilities[name].entries()) {
        expect(again.visibilities[name][k] / value).toBeCloseTo(1, digits);
      }
    };
    for (const name of ['u', 'v', 're', 'im', 'sigma'] as const) close(name, 9);
    close('timeMjd', 12);
    expect(again.visibilities.scan).toEqual(first.visibilities.scan);
    expect(again.visibilities.stations).toEqual(first.visibilities.stations);
  });

  it('with u and v of the wrong sign is an error when the positions tell', () => {
    // Sidereal time by Meeus eq. 12.4, moved to the generator's through the right ascension.
    const gmst = (280.46061837 + 360.98564736629 * (REFERENCE_MJD - 51544.5)) % 360;
    const file = (sign: number) => {
      const sink = memorySink();
      writeVisibilities(sink, twoStations(sign, 187.5 + gmst - 201.3));
      return sink.bytes();
    };
    expect(runIngest(file(1)).report.uv.finding).toContain('the sign is that of the format');
    expect(problemOf(file(-1)).code).toBe('uv-sign');
    expect(runIngest(file(-1), { uvSign: 'reversed' }).visibilities.u[0]).toBeCloseTo(
      runIngest(file(1)).visibilities.u[0],
      3,
    );
  });
});

/** Two rows of one baseline, u and v from station 1 to station 2. */
function twoStations(sign: number, raDegrees: number): Visibilities {
  const days = [0.25, 0.35];
  const [a, b] = [STATIONS[1], STATIONS[0]];
  const wavelengthMetres = 1.3e-3;
  const uv = days.map((day) =>
    project(
      b.xyz.map((value, axis) => value - a.xyz[axis]),
      day,
    ).map((seconds) => (sign * seconds * 299792458) / wavelengthMetres),
  );
  const column = (value: (k: number) => number) => Float64Array.from(days, (_, k) => value(k));
  return {
    target: { name: 'INVENTED', raDegrees: ((raDegrees % 360) + 360) % 360, decDegrees: 12.25 },
    arrayName: 'TESTARRAY',
    remark: 'invented data',
    stations: [a, b].map(({ name, xyz }) => ({ name, xyz })),
    wavelengthMetres,
    bandwidthMetres: 1e-6,
    count: 2,
    station1: Int32Array.of(0, 0),
    station2: Int32Array.of(1, 1),
    scan: Int32Array.of(0, 1),
    timeMjd: column((k) => REFERENCE_MJD + days[k]),
    integrationSeconds: column(() => 10),
    u: column((k) => uv[k][0]),
    v: column((k) => uv[k][1]),
    re: column(() => 1),
    im: column(() => 0.5),
    sigma: column(() => 0.01),
    sigmaPhase: column(() => 0.01),
  };
}
