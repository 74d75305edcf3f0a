/** What every table of OIFITS must have: keywords, columns with their forms, revision. A form names the sort of value and how
 *  many stand in a row, NWAVE being the rows of the OI_WAVELENGTH that INSNAME names. The width of integers and, but for
 *  times, the precision of reals is left to the file.
 *  Source: Duvert, Young & Hummel 2017, A&A 597, A8 (revision 2); Pauls et al. 2005, PASP 117, 1255 (revision 1). Tables OI_VIS
 *  and OI_T3 and the primary keywords were read as published, other lists are from memory. */

export interface FormRule {
  /** Letters of TFORM that are legal. */
  readonly letters: string;
  /** Values in a row; `text` for strings of any width. */
  readonly repeat: number | 'NWAVE' | 'text';
  readonly what: string;
}

export interface TableRules {
  /** Keywords that must be there. */
  readonly keywords: readonly string[];
  readonly columns: Readonly<Record<string, FormRule>>;
  /** Columns that revision 2 adds. */
  readonly added?: Readonly<Record<string, FormRule>>;
  /** Columns that may be there. */
  readonly optional?: Readonly<Record<string, FormRule>>;
  /** OI_REVN in a file of OIFITS 2; in one of OIFITS 1 it is 1. */
  readonly revision: number;
  /** Columns of errors: none may be below 0 in a row in use. */
  readonly errors?: readonly string[];
}

export const PRIMARY_KEYWORDS: readonly string[] = [
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

const integers = (repeat: FormRule['repeat'] = 1): FormRule => ({
  letters: 'BIJK',
  repeat,
  what: 'integers (B I J K)',
});
const reals = (repeat: FormRule['repeat'] = 1): FormRule => ({ letters: 'ED', repeat, what: 'reals (E D)' });
const doubles: FormRule = { letters: 'D', repeat: 1, what: 'reals of double precision (D)' };
const complex: FormRule = { letters: 'CM', repeat: 'NWAVE', what: 'complex numbers (C M)' };
const logicals = (repeat: FormRule['repeat']): FormRule => ({ letters: 'L', repeat, what: 'logicals (L)' });
const text: FormRule = { letters: 'A', repeat: 'text', what: 'text (A)' };

const all = (names: string, rule: FormRule) =>
  Object.fromEntries(names.split(' ').map((name) => [name, rule]));

const OF_DATA = ['DATE-OBS', 'INSNAME'];
const shared = { TARGET_ID: integers(), TIME: reals(), MJD: doubles, INT_TIME: reals() };
const ofPairs = { UCOORD: reals(), VCOORD: reals(), STA_INDEX: integers(2), FLAG: logicals('NWAVE') };

export const OIFITS_TABLES: Readonly<Record<string, TableRules>> = {
  OI_TARGET: {
    keywords: [],
    columns: {
      TARGET_ID: integers(),
      TARGET: text,
      ...all('RAEP0 DECEP0 EQUINOX RA_ERR DEC_ERR SYSVEL', reals()),
      ...all('VELTYP VELDEF', text),
      ...all('PMRA PMDEC PMRA_ERR PMDEC_ERR PARALLAX PARA_ERR', reals()),
      SPECTYP: text,
    },
    optional: { CATEGORY: text },
    revision: 2,
  },
  OI_ARRAY: {
    keywords: ['ARRNAME', 'FRAME', 'ARRAYX', 'ARRAYY', 'ARRAYZ'],
    columns: {
      ...all('TEL_NAME STA_NAME', text),
      STA_INDEX: integers(),
      DIAMETER: reals(),
      STAXYZ: reals(3),
    },
    added: { FOV: reals(), FOVTYPE: text },
    revision: 2,
  },
  OI_WAVELENGTH: { keywords: ['INSNAME'], columns: all('EFF_WAVE EFF_BAND', reals()), revision: 2 },
  OI_VIS: {
    keywords: OF_DATA,
    columns: { ...shared, ...all('VISAMP VISAMPERR VISPHI VISPHIERR', reals('NWAVE')), ...ofPairs },
    optional: {
      ...all('RVIS RVISERR IVIS IVISERR', reals('NWAVE')),
      ...all('CORRINDX_VISAMP CORRINDX_VISPHI CORRINDX_RVIS CORRINDX_IVIS', integers()),
    },
    revision: 2,
    errors: ['VISAMPERR', 'VISPHIERR', 'RVISERR', 'IVISERR'],
  },
  OI_VIS2: {
    keywords: OF_DATA,
    columns: { ...shared, ...all('VIS2DATA VIS2ERR', reals('NWAVE')), ...ofPairs },
    optional: { CORRINDX_VIS2DATA: integers() },
    revision: 2,
    errors: ['VIS2ERR'],
  },
  OI_T3: {
    keywords: OF_DATA,
    columns: {
      ...shared,
      ...all('T3AMP T3AMPERR T3PHI T3PHIERR', reals('NWAVE')),
      ...all('U1COORD V1COORD U2COORD V2COORD', reals()),
      STA_INDEX: integers(3),
      FLAG: logicals('NWAVE'),
    },
    optional: all('CORRINDX_T3AMP CORRINDX_T3PHI', integers()),
    revision: 2,
    errors: ['T3AMPERR', 'T3PHIERR'],
  },
  OI_FLUX: {
    keywords: [...OF_DATA, 'CALSTAT'],
    columns: {
      TARGET_ID: integers(),
      MJD: doubles,
      INT_TIME: reals(),
      ...all('FLUXDATA FLUXERR', reals('NWAVE')),
      FLAG: logicals('NWAVE'),
    },
    optional: { STA_INDEX: integers(), CORRINDX_FLUXDATA: integers() },
    revision: 1,
    errors: ['FLUXERR'],
  },
  OI_CORR: {
    keywords: ['CORRNAME', 'NDATA'],
    columns: { ...all('IINDX JINDX', integers()), CORR: reals() },
    revision: 1,
  },
  OI_INSPOL: {
    keywords: ['NPOL', 'ARRNAME', 'ORIENT', 'MODEL'],
    columns: {
      TARGET_ID: integers(),
      INSNAME: text,
      ...all('MJD_OBS MJD_END', doubles),
      ...all('JXX JYY JXY JYX', complex),
      STA_INDEX: integers(),
    },
    revision: 1,
  },
};

/** Words that a keyword or a column of a table may hold; case does not matter. */
export const WORDS = {
  FRAME: ['GEOCENTRIC', 'SKY'],
  FOVTYPE: ['FWHM', 'RADIUS'],
  CATEGORY: ['SCI', 'CAL'],
  AMPTYP: ['absolute', 'differential', 'correlated flux'],
  PHITYP: ['absolute', 'differential'],
  CALSTAT: ['C', 'U'],
} as const;
