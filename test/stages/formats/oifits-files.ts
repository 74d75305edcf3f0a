/** Makes the OIFITS files of the tests of its rules: valid files as objects, changes that each break one rule, and bytes.
 *  All content is invented. */

import { appendEmptyPrimary, appendTableHdu, type NewColumn } from '../../../stages/formats/fits/table.ts';
import { written } from './fits/fixtures.ts';

export interface OiTable {
  extname: string;
  rows: number;
  cards: [string, string | number][];
  columns: NewColumn[];
}

export interface OiFile {
  primary: [string, string][];
  tables: OiTable[];
}

const column = (name: string, form: string, values: NewColumn['values'], unit?: string): NewColumn => ({
  name,
  form,
  values,
  ...(unit === undefined ? {} : { unit }),
});
const filled = (names: string, rows: number, value = 0, form = '1D') =>
  names.split(' ').map((name) => {
    const repeat = form.endsWith('A') ? 1 : Number.parseInt(form, 10);
    return column(name, form, new Array(rows * repeat).fill(form.endsWith('A') ? 'UNKNOWN' : value));
  });

interface DataTable {
  extname: string;
  array: string;
  instrument: string;
  channels: number;
  /** TARGET_ID of each row. */
  targets: number[];
  /** STA_INDEX, row after row. */
  stations: number[];
  cards?: [string, string | number][];
  values: string;
  coordinates: string;
  more?: NewColumn[];
}

/** A table of data whose values are all 0.1. */
function dataTable(data: DataTable): OiTable {
  const { extname, array, instrument, channels, targets, stations, cards = [], more = [] } = data;
  const rows = targets.length;
  const isFlux = extname === 'OI_FLUX';
  return {
    extname,
    rows,
    cards: [
      ['OI_REVN', isFlux ? 1 : 2],
      ['DATE-OBS', '2031-03-10'],
      ['ARRNAME', array],
      ['INSNAME', instrument],
      ...cards,
    ],
    columns: [
      column('TARGET_ID', '1I', targets),
      ...(isFlux ? [] : filled('TIME', rows)),
      ...filled('MJD', rows, 60000),
      ...filled('INT_TIME', rows, 10),
      ...filled(data.values, rows, 0.1, `${channels}D`).map((each) =>
        each.name === 'FLUXDATA' ? { ...each, unit: 'Jy' } : each,
      ),
      ...(data.coordinates === '' ? [] : filled(data.coordinates, rows)),
      column('STA_INDEX', `${stations.length / rows}I`, stations),
      ...filled('FLAG', rows, 0, `${channels}L`),
      ...more,
    ],
  };
}

function arrayTable(name: string, frame: string, stations: string[], indices: number[]): OiTable {
  const rows = stations.length;
  return {
    extname: 'OI_ARRAY',
    rows,
    cards: [
      ['OI_REVN', 2],
      ['ARRNAME', name],
      ['FRAME', frame],
      ['ARRAYX', 1],
      ['ARRAYY', 2],
      ['ARRAYZ', 3],
    ],
    columns: [
      column('TEL_NAME', '8A', stations),
      column('STA_NAME', '8A', stations),
      column('STA_INDEX', '1I', indices),
      ...filled('DIAMETER', rows, 0, '1E'),
      column(
        'STAXYZ',
        '3D',
        indices.flatMap((index) => [60 * index, 10 - index, name.length]),
      ),
      ...filled('FOV', rows),
      column('FOVTYPE', '6A', new Array(rows).fill('FWHM')),
    ],
  };
}

function wavelengthTable(name: string, waves: number[]): OiTable {
  return {
    extname: 'OI_WAVELENGTH',
    rows: waves.length,
    cards: [
      ['OI_REVN', 2],
      ['INSNAME', name],
    ],
    columns: [column('EFF_WAVE', '1E', waves), ...filled('EFF_BAND', waves.length, 1e-7, '1E')],
  };
}

/** The cards that OIFITS 2 wants in the primary header. */
export const PRIMARY_CARDS: readonly [string, string][] = [
  ...['ORIGIN', 'TELESCOP', 'INSTRUME', 'OBSERVER', 'OBJECT', 'INSMODE'].map((name): [string, string] => [
    name,
    'invented',
  ]),
  ['DATE', '2031-03-10'],
  ['DATE-OBS', '2031-03-10'],
  ['CONTENT', 'OIFITS2'],
];

/** A valid file of OIFITS 2: two targets, two arrays with a station of one name, two instruments of two and of three
 *  wavelengths (these falling), every kind of data, correlations, fluxes and polarisation. */
export function validFile(): OiFile {
  const near = { array: 'NEAR', instrument: 'TWO', channels: 2 };
  const far = { array: 'FAR', instrument: 'THREE', channels: 3 };
  const ofPairs = { values: 'VIS2DATA VIS2ERR', coordinates: 'UCOORD VCOORD' };
  return {
    primary: [...PRIMARY_CARDS],
    tables: [
      {
        extname: 'OI_TARGET',
        rows: 2,
        cards: [['OI_REVN', 2]],
        columns: [
          column('TARGET_ID', '1I', [1, 4]),
          column('TARGET', '16A', ['Lantern', 'Lamp']),
          ...filled('RAEP0 DECEP0 EQUINOX RA_ERR DEC_ERR SYSVEL', 2),
          ...filled('VELTYP VELDEF', 2, 0, '8A'),
          ...filled('PMRA PMDEC PMRA_ERR PMDEC_ERR PARALLAX PARA_ERR', 2),
          ...filled('SPECTYP', 2, 0, '16A'),
        ],
      },
      arrayTable('NEAR', 'GEOCENTRIC', ['WICK', 'FLINT', 'EMBER'], [1, 2, 3]),
      arrayTable('FAR', 'SKY', ['WICK', 'COAL'], [7, 2]),
      wavelengthTable('TWO', [1.6e-6, 1.7e-6]),
      wavelengthTable('THREE', [2.3e-6, 2.2e-6, 2.1e-6]),
      dataTable({
        ...near,
        extname: 'OI_VIS',
        targets: [1, 4],
        stations: [1, 2, 1, 3],
        values: 'VISAMP VISAMPERR VISPHI VISPHIERR',
        coordinates: 'UCOORD VCOORD',
        cards: [
          ['AMPTYP', 'absolute'],
          ['PHITYP', 'absolute'],
        ],
      }),
      dataTable({
        ...near,
        ...ofPairs,
        extname: 'OI_VIS2',
        targets: [1, 1],
        stations: [1, 2, 1, 3],
        cards: [['CORRNAME', 'CORR']],
        more: [column('CORRINDX_VIS2DATA', '1J', [1, 3])],
      }),
      dataTable({
        ...far,
        ...ofPairs,
        extname: 'OI_VIS2',
        targets: [4],
        stations: [7, 2],
      }),
      dataTable({
        ...near,
        extname: 'OI_T3',
        targets: [1],
        stations: [1, 2, 3],
        values: 'T3AMP T3AMPERR T3PHI T3PHIERR',
        coordinates: 'U1COORD V1COORD U2COORD V2COORD',
      }),
      dataTable({
        ...far,
        extname: 'OI_FLUX',
        targets: [4, 4],
        stations: [7, 2],
        values: 'FLUXDATA FLUXERR',
        coordinates: '',
        cards: [['CALSTAT', 'U']],
      }),
      {
        extname: 'OI_CORR',
        rows: 1,
        cards: [
          ['OI_REVN', 1],
          ['CORRNAME', 'CORR'],
          ['NDATA', 4],
        ],
        columns: [column('IINDX', '1J', [1]), column('JINDX', '1J', [2]), column('CORR', '1D', [0.5])],
      },
      {
        extname: 'OI_INSPOL',
        rows: 2,
        cards: [
          ['OI_REVN', 1],
          ['NPOL', 1],
          ['ARRNAME', 'FAR'],
          ['ORIENT', 'NORTH'],
          ['MODEL', 'invented'],
        ],
        columns: [
          column('TARGET_ID', '1I', [4, 1]),
          column('INSNAME', '16A', ['THREE', 'THREE']),
          ...filled('MJD_OBS MJD_END', 2, 60000),
          ...['JXX', 'JYY', 'JXY', 'JYX'].map((name) => column(name, '3C', new Array(12).fill(0.5))),
          column('STA_INDEX', '1I', [2, 7]),
        ],
      },
    ],
  };
}

/** The same as OIFITS 1: no CONTENT, no tables and columns of revision 2, revision 1 throughout. */
export function validFirst(): OiFile {
  const { tables } = validFile();
  const added = ['FOV', 'FOVTYPE', 'CORRINDX_VIS2DATA'];
  const laterCards = ['CORRNAME', 'AMPTYP', 'PHITYP'];
  return {
    primary: [],
    tables: tables
      .filter(({ extname }) => !['OI_FLUX', 'OI_CORR', 'OI_INSPOL'].includes(extname))
      .map((table) => ({
        ...table,
        cards: table.cards.flatMap(([name, value]): OiTable['cards'] =>
          laterCards.includes(name) ? [] : [[name, name === 'OI_REVN' ? 1 : value]],
        ),
        columns: table.columns.filter(({ name }) => !added.includes(name)),
      })),
  };
}

export function sourceOfFile({ primary, tables }: OiFile) {
  return written((sink) => {
    appendEmptyPrimary(sink, primary);
    for (const table of tables) appendTableHdu(sink, table);
  });
}

export type Change = (file: OiFile) => void;

const tablesOf = (file: OiFile, extname: string) => file.tables.filter((table) => table.extname === extname);
const firstOf = (file: OiFile, extname: string) => tablesOf(file, extname)[0] as OiTable;

/** Removes a column of the first table of this name. */
export const without =
  (extname: string, name: string): Change =>
  (file) => {
    const table = firstOf(file, extname);
    table.columns = table.columns.filter((each) => each.name !== name);
  };

/** Removes all tables of this name. */
export const withoutTables =
  (...extnames: string[]): Change =>
  (file) => {
    file.tables = file.tables.filter(({ extname }) => !extnames.includes(extname));
  };

/** A second table like the first of this name. */
export const twice =
  (extname: string): Change =>
  (file) => {
    file.tables.push({ ...firstOf(file, extname) });
  };

export const setValue =
  (extname: string, name: string, at: number, value: number | string): Change =>
  (file) => {
    const table = firstOf(file, extname);
    table.columns = table.columns.map((each) => {
      if (each.name !== name) return each;
      const values = [...(each.values as (number | string)[])].map((old, k) => (k === at ? value : old));
      return { ...each, values: values as NewColumn['values'] };
    });
  };

/** Gives a column another form, with as many values as that needs. */
export const setForm =
  (extname: string, name: string, form: string): Change =>
  (file) => {
    const table = firstOf(file, extname);
    const old = table.columns.find((each) => each.name === name) as NewColumn;
    const [changed] = filled(name, table.rows, 1, form);
    table.columns = table.columns.map((each) =>
      each.name === name ? { ...changed, ...(old.unit === undefined ? {} : { unit: old.unit }) } : each,
    );
  };

/** Sets a keyword of the first table of this name, adds it, or with null takes it away. */
export const setCard =
  (extname: string, name: string, value: string | number | null): Change =>
  (file) => {
    const table = firstOf(file, extname);
    table.cards = table.cards.filter(([each]) => each !== name);
    if (value !== null) table.cards.push([name, value]);
  };

export const addColumn =
  (extname: string, name: string, form: string, value = 1): Change =>
  (file) => {
    const table = firstOf(file, extname);
    table.columns.push(...filled(name, table.rows, value, form));
  };

export const withoutUnit =
  (extname: string, name: string): Change =>
  (file) => {
    const table = firstOf(file, extname);
    table.columns = table.columns.map((each) => (each.name === name ? { ...each, unit: '' } : each));
  };

export const all =
  (...changes: Change[]): Change =>
  (file) => {
    for (const change of changes) change(file);
  };
