/** An OIFITS file with squared visibilities and triple products only. The source and its very large array are invented. */

import { appendEmptyPrimary, appendTableHdu, type NewColumn } from '../../stages/formats/fits/table.ts';
import { type Model, makePart, visibilitiesOfModel } from '../../stages/numerics/models.ts';
import { randomStream } from '../../stages/numerics/random.ts';
import { written } from './formats/fits/fixtures.ts';
import { PRIMARY_CARDS } from './formats/oifits-files.ts';
import { UAS } from './numerics/ring-images.ts';

export const WAVES = [1.55e-6, 1.65e-6];
/** Metres, east and north; kilometres apart. */
const PLACES = [
  [0, 0],
  [3100, 900],
  [-2200, 2600],
  [800, -4200],
  [5200, 3900],
  [-4700, -1800],
];
export const RING: Model = {
  parts: [makePart('ring', { length: 48 * UAS, asymmetry: 0.2, brightest: 1 })],
  blur: 11 * UAS,
};
const column = (name: string, form: string, values: NewColumn['values']): NewColumn => ({
  name,
  form,
  values,
});

export interface OpticalTables {
  readonly squared: number[];
  readonly flags: number[];
  readonly u: number[];
  readonly stations: number[];
  readonly t3: { readonly amplitudeErrors: number[]; readonly phaseErrors: number[] };
}

/** Exposures while the array turns; noise of 0.005 on V2 and 1 deg on closure phases, or so many times that. */
export function opticalFile(
  exposures: number,
  change: (tables: OpticalTables) => void = () => {},
  noisier = 1,
) {
  const random = randomStream(5, 'optical');
  const value = (u: number, v: number) => {
    const [re, im] = [new Float64Array(1), new Float64Array(1)];
    visibilitiesOfModel(re, im, RING, Float64Array.of(u), Float64Array.of(v));
    return [re[0], im[0]] as const;
  };
  const vis2 = {
    mjd: [] as number[],
    u: [] as number[],
    v: [] as number[],
    stations: [] as number[],
    squared: [] as number[],
    flags: [] as number[],
  };
  const t3 = {
    mjd: [] as number[],
    sides: [[], [], [], []] as number[][],
    stations: [] as number[],
    phases: [] as number[],
  };
  for (let e = 0; e < exposures; e++) {
    const turn = (e * Math.PI) / exposures;
    const places = PLACES.map(([x, y]) => [
      x * Math.cos(turn) - y * Math.sin(turn),
      x * Math.sin(turn) + y * Math.cos(turn),
    ]);
    const side = (a: number, b: number) => [places[b][0] - places[a][0], places[b][1] - places[a][1]];
    const mjd = 60000 + e / 100;
    for (let a = 0; a < 6; a++) {
      for (let b = a + 1; b < 6; b++) {
        const [u, v] = side(a, b);
        vis2.mjd.push(mjd);
        vis2.u.push(u);
        vis2.v.push(v);
        vis2.stations.push(a + 1, b + 1);
        for (const wave of WAVES) {
          const [re, im] = value(u / wave, v / wave);
          vis2.squared.push(re * re + im * im + noisier * 0.005 * random.normal());
          vis2.flags.push(0);
        }
        for (let c = b + 1; c < 6; c++) {
          const [u2, v2] = side(b, c);
          [u, v, u2, v2].forEach((coordinate, k) => {
            t3.sides[k].push(coordinate);
          });
          t3.mjd.push(mjd);
          t3.stations.push(a + 1, b + 1, c + 1);
          for (const wave of WAVES) {
            const angle = ([x, y]: number[]) => {
              const [re, im] = value(x / wave, y / wave);
              return Math.atan2(im, re);
            };
            const sum = angle([u, v]) + angle([u2, v2]) + angle([-u - u2, -v - v2]);
            const degrees = (sum * 180) / Math.PI + noisier * random.normal();
            t3.phases.push(degrees - 360 * Math.round(degrees / 360));
          }
        }
      }
    }
  }
  const errors = { amplitudeErrors: t3.phases.map(() => 0.1), phaseErrors: t3.phases.map(() => noisier) };
  change({ ...vis2, t3: errors });
  const filled = (name: string, form: string, rows: number, constant: number) =>
    column(name, form, new Array(rows).fill(constant));
  return written((sink) => {
    appendEmptyPrimary(sink, PRIMARY_CARDS);
    appendTableHdu(sink, {
      extname: 'OI_TARGET',
      rows: 1,
      cards: [['OI_REVN', 2]],
      columns: [
        column('TARGET_ID', '1I', [1]),
        column('TARGET', '16A', ['Lantern']),
        ...[
          'RAEP0',
          'DECEP0',
          'EQUINOX',
          'RA_ERR',
          'DEC_ERR',
          'SYSVEL',
          'PMRA',
          'PMDEC',
          'PMRA_ERR',
          'PMDEC_ERR',
          'PARALLAX',
          'PARA_ERR',
        ].map((name) => filled(name, '1D', 1, 10)),
        ...['VELTYP', 'VELDEF', 'SPECTYP'].map((name) => column(name, '8A', ['UNKNOWN'])),
      ],
    });
    appendTableHdu(sink, {
      extname: 'OI_ARRAY',
      rows: 6,
      cards: [
        ['OI_REVN', 2],
        ['ARRNAME', 'INVENTED'],
        ['FRAME', 'SKY'],
        ['ARRAYX', 0],
        ['ARRAYY', 0],
        ['ARRAYZ', 0],
      ],
      columns: [
        column('TEL_NAME', '8A', ['A', 'B', 'C', 'D', 'E', 'F']),
        column('STA_NAME', '8A', ['S1', 'S2', 'S3', 'S4', 'S5', 'S6']),
        column('STA_INDEX', '1I', [1, 2, 3, 4, 5, 6]),
        filled('DIAMETER', '1E', 6, 1),
        filled('STAXYZ', '3D', 18, 0),
        filled('FOV', '1D', 6, 1),
        column('FOVTYPE', '6A', new Array(6).fill('FWHM')),
      ],
    });
    appendTableHdu(sink, {
      extname: 'OI_WAVELENGTH',
      rows: 2,
      cards: [
        ['OI_REVN', 2],
        ['INSNAME', 'INS'],
      ],
      columns: [column('EFF_WAVE', '1E', WAVES), column('EFF_BAND', '1E', [1e-8, 1e-8])],
    });
    const cards: [string, string | number][] = [
      ['OI_REVN', 2],
      ['DATE-OBS', '2031-03-10'],
      ['ARRNAME', 'INVENTED'],
      ['INSNAME', 'INS'],
    ];
    const shared = (mjd: number[]) => [
      filled('TARGET_ID', '1I', mjd.length, 1),
      filled('TIME', '1D', mjd.length, 0),
      column('MJD', '1D', mjd),
      filled('INT_TIME', '1D', mjd.length, 30),
    ];
    const rows = vis2.mjd.length;
    appendTableHdu(sink, {
      extname: 'OI_VIS2',
      rows,
      cards,
      columns: [
        ...shared(vis2.mjd),
        column('VIS2DATA', '2D', vis2.squared),
        filled('VIS2ERR', '2D', 2 * rows, noisier * 0.005),
        column('UCOORD', '1D', vis2.u),
        column('VCOORD', '1D', vis2.v),
        column('STA_INDEX', '2I', vis2.stations),
        column('FLAG', '2L', vis2.flags),
      ],
    });
    const triples = t3.mjd.length;
    appendTableHdu(sink, {
      extname: 'OI_T3',
      rows: triples,
      cards,
      columns: [
        ...shared(t3.mjd),
        filled('T3AMP', '2D', 2 * triples, 0.1),
        column('T3AMPERR', '2D', errors.amplitudeErrors),
        column('T3PHI', '2D', t3.phases),
        column('T3PHIERR', '2D', errors.phaseErrors),
        ...['U1COORD', 'V1COORD', 'U2COORD', 'V2COORD'].map((name, k) => column(name, '1D', t3.sides[k])),
        column('STA_INDEX', '3I', t3.stations),
        column('FLAG', '2L', new Array(2 * triples).fill(0)),
      ],
    });
  });
}

export const bytesOf = (source: ReturnType<typeof opticalFile>) => source.read(0, source.size);
