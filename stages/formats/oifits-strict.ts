/** The rules of OIFITS that make a file invalid, beyond those without which it cannot be read (oifits.ts, oifits-data.ts): mandatory
 *  keywords and columns, the revisions of tables, values that no measurement has, the order of wavelengths, the
 *  correlation table.
 *  Source: Duvert, Young & Hummel 2017, A&A 597, A8 (revision 2); Pauls et al. 2005, PASP 117, 1255 (revision 1). Tables OI_VIS
 *  and OI_T3 and the primary keywords were read as published, other lists are from memory. */

import type { ByteSource } from '../bytes.ts';
import { openFits } from './fits/hdu.ts';
import { headerValue } from './fits/header.ts';
import { readTable, type Table } from './fits/table.ts';
import { ruleBroken } from './oifits-rules.ts';

const PRIMARY = [
  'ORIGIN',
  'DATE',
  'DATE-OBS',
  'CONTENT',
  'TELESCOP',
  'INSTRUME',
  'OBSERVER',
  'OBJECT',
  'INSMODE',
];

const SHARED = ['TARGET_ID', 'TIME', 'MJD', 'INT_TIME'];

/** Of each table: keywords, columns, columns that revision 2 adds, and the revision that stands in a file of OIFITS 2. */
const TABLES: Readonly<Record<string, TableRules>> = {
  OI_TARGET: {
    keywords: [],
    columns: [
      ...[
        'TARGET_ID',
        'TARGET',
        'RAEP0',
        'DECEP0',
        'EQUINOX',
        'RA_ERR',
        'DEC_ERR',
        'SYSVEL',
        'VELTYP',
        'VELDEF',
      ],
      ...['PMRA', 'PMDEC', 'PMRA_ERR', 'PMDEC_ERR', 'PARALLAX', 'PARA_ERR', 'SPECTYP'],
    ],
    revision: 2,
  },
  OI_ARRAY: {
    keywords: ['ARRNAME', 'FRAME', 'ARRAYX', 'ARRAYY', 'ARRAYZ'],
    columns: ['TEL_NAME', 'STA_NAME', 'STA_INDEX', 'DIAMETER', 'STAXYZ'],
    added: ['FOV', 'FOVTYPE'],
    revision: 2,
  },
  OI_WAVELENGTH: { keywords: ['INSNAME'], columns: ['EFF_WAVE', 'EFF_BAND'], revision: 2 },
  OI_VIS: {
    keywords: ['DATE-OBS', 'INSNAME'],
    columns: [
      ...SHARED,
      'VISAMP',
      'VISAMPERR',
      'VISPHI',
      'VISPHIERR',
      'UCOORD',
      'VCOORD',
      'STA_INDEX',
      'FLAG',
    ],
    revision: 2,
    errors: ['VISAMPERR', 'VISPHIERR'],
  },
  OI_VIS2: {
    keywords: ['DATE-OBS', 'INSNAME'],
    columns: [...SHARED, 'VIS2DATA', 'VIS2ERR', 'UCOORD', 'VCOORD', 'STA_INDEX', 'FLAG'],
    revision: 2,
    errors: ['VIS2ERR'],
  },
  OI_T3: {
    keywords: ['DATE-OBS', 'INSNAME'],
    columns: [
      ...SHARED,
      ...[
        'T3AMP',
        'T3AMPERR',
        'T3PHI',
        'T3PHIERR',
        'U1COORD',
        'V1COORD',
        'U2COORD',
        'V2COORD',
        'STA_INDEX',
        'FLAG',
      ],
    ],
    revision: 2,
    errors: ['T3AMPERR', 'T3PHIERR'],
  },
  OI_FLUX: {
    keywords: ['DATE-OBS', 'INSNAME'],
    columns: ['TARGET_ID', 'MJD', 'INT_TIME', 'FLUXDATA', 'FLUXERR', 'FLAG'],
    revision: 1,
    errors: ['FLUXERR'],
  },
  OI_CORR: { keywords: ['CORRNAME', 'NDATA'], columns: ['IINDX', 'JINDX', 'CORR'], revision: 1 },
};

interface TableRules {
  readonly keywords: readonly string[];
  readonly columns: readonly string[];
  readonly added?: readonly string[];
  readonly revision: number;
  /** Columns of errors: none may be below 0 in a row in use. */
  readonly errors?: readonly string[];
}

const FRAMES = ['GEOCENTRIC', 'SKY'];
const AMPLITUDE_TYPES = ['absolute', 'differential', 'correlated flux'];
const PHASE_TYPES = ['absolute', 'differential'];

/** @throws InputProblem naming table, row and rule of the first rule that is broken. Cost: one read of the tables. */
export function requireValidOifits(source: ByteSource): void {
  const hdus = openFits(source);
  const primary = hdus[0].header;
  const isSecond = text(headerValue(primary, 'CONTENT')).toUpperCase() === 'OIFITS2';
  if (isSecond) {
    for (const keyword of PRIMARY) {
      if (headerValue(primary, keyword) === undefined)
        throw ruleBroken(
          `${source.name}, primary header`,
          `the keyword ${keyword} (mandatory in OIFITS 2)`,
          'none',
        );
    }
  }
  const tables = hdus.flatMap((hdu) =>
    hdu.kind === 'table' && Object.hasOwn(TABLES, hdu.extname)
      ? [{ extname: hdu.extname, table: readTable(source, hdu) }]
      : [],
  );
  for (const { extname, table } of tables) requireTableRules(extname, table, isSecond);
  requireCorrelations(tables, isSecond);
}

function requireTableRules(extname: string, table: Table, isSecond: boolean): void {
  const rules = TABLES[extname] as TableRules;
  const revision = headerValue(table.header, 'OI_REVN');
  if (isSecond && revision !== rules.revision)
    throw ruleBroken(
      table.place,
      `OI_REVN ${rules.revision} in a file of OIFITS 2`,
      String(revision ?? 'none'),
    );
  for (const keyword of rules.keywords) {
    if (headerValue(table.header, keyword) === undefined)
      throw ruleBroken(table.place, `the keyword ${keyword}`, 'none');
  }
  for (const column of [...rules.columns, ...(isSecond ? (rules.added ?? []) : [])]) {
    if (!table.has(column))
      throw ruleBroken(table.place, `the column ${column}`, `columns ${table.names.join(', ')}`);
  }
  requireErrors(table, rules.errors ?? []);
  if (extname === 'OI_WAVELENGTH') requireWavelengths(table);
  if (extname === 'OI_ARRAY' && isSecond) requireWord(table, 'FRAME', FRAMES);
  if (extname === 'OI_VIS' && isSecond) {
    requireWord(table, 'AMPTYP', AMPLITUDE_TYPES);
    requireWord(table, 'PHITYP', PHASE_TYPES);
  }
  for (const column of ['TARGET_ID', 'STA_INDEX']) if (table.has(column)) requireFromOne(table, column);
}

/** No error of a measurement in use is below 0. */
function requireErrors(table: Table, columns: readonly string[]): void {
  if (columns.length === 0) return;
  const flags = table.column('FLAG').flags();
  for (const name of columns) {
    const column = table.column(name);
    const odd = column.numbers().findIndex((value, k) => value < 0 && flags[k] === 0);
    if (odd >= 0) {
      const row = Math.floor(odd / column.repeat) + 1;
      throw ruleBroken(
        `${table.place}, row ${row}, column ${name}`,
        'an error of 0 or more in a row in use',
        `${column.numbers()[odd]}`,
      );
    }
  }
}

/** Wavelengths rise or fall throughout, and have a width of 0 or more. */
function requireWavelengths(table: Table): void {
  const waves = table.column('EFF_WAVE').numbers();
  const rises = waves.length < 2 || waves[1] > waves[0];
  for (let k = 1; k < waves.length; k++) {
    if (rises ? waves[k] > waves[k - 1] : waves[k] < waves[k - 1]) continue;
    throw ruleBroken(
      `${table.place}, row ${k + 1}`,
      `wavelengths that ${rises ? 'rise' : 'fall'} from row to row`,
      `EFF_WAVE ${waves[k]} m after ${waves[k - 1]} m`,
    );
  }
  const odd = table
    .column('EFF_BAND')
    .numbers()
    .findIndex((width) => width < 0);
  if (odd >= 0)
    throw ruleBroken(
      `${table.place}, row ${odd + 1}, column EFF_BAND`,
      'a width of 0 or more',
      'a negative one',
    );
}

function requireWord(table: Table, keyword: string, words: readonly string[]): void {
  const value = headerValue(table.header, keyword);
  if (value === undefined || words.some((word) => word.toLowerCase() === text(value).toLowerCase())) return;
  throw ruleBroken(table.place, `${keyword} ${words.join(' or ')}`, text(value));
}

function requireFromOne(table: Table, name: string): void {
  const column = table.column(name);
  const odd = column.numbers().findIndex((value) => !(value >= 1));
  if (odd < 0) return;
  throw ruleBroken(
    `${table.place}, row ${Math.floor(odd / column.repeat) + 1}, column ${name}`,
    'a number from 1',
    `${column.numbers()[odd]}`,
  );
}

/** A table that is referred to by CORRNAME is there, and its entries are correlations of data that there are. */
function requireCorrelations(tables: readonly { extname: string; table: Table }[], isSecond: boolean): void {
  if (!isSecond) return;
  const correlations = tables.filter(({ extname }) => extname === 'OI_CORR').map(({ table }) => table);
  const names = correlations.map(({ header }) => text(headerValue(header, 'CORRNAME')));
  const doubled = names.find((name, k) => names.indexOf(name) !== k);
  if (doubled !== undefined)
    throw ruleBroken(correlations[0].place, 'every CORRNAME once', `${doubled} twice`);
  for (const { extname, table } of tables) {
    const name = headerValue(table.header, 'CORRNAME');
    if (extname === 'OI_CORR' || name === undefined || names.includes(text(name))) continue;
    throw ruleBroken(table.place, `an OI_CORR with CORRNAME ${text(name)}`, names.join(', ') || 'none');
  }
  for (const table of correlations) requireEntries(table);
}

function requireEntries(table: Table): void {
  const count = Number(headerValue(table.header, 'NDATA'));
  const [i, j, values] = ['IINDX', 'JINDX', 'CORR'].map((name) => table.column(name).numbers());
  for (let k = 0; k < table.rows; k++) {
    const place = `${table.place}, row ${k + 1}`;
    if (!(i[k] >= 1 && i[k] < j[k] && j[k] <= count))
      throw ruleBroken(place, `1 <= IINDX < JINDX <= NDATA (${count})`, `IINDX ${i[k]}, JINDX ${j[k]}`);
    if (!(Math.abs(values[k]) <= 1))
      throw ruleBroken(place, 'a correlation from -1 to 1', `CORR ${values[k]}`);
  }
}

function text(value: unknown): string {
  return typeof value === 'string' ? value.trim() : String(value ?? '');
}
