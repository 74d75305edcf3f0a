/** Every rule of OIFITS that makes a file invalid: a file that keeps it is accepted, one that breaks it is refused with table, row and
 *  rule. Files are made here; all content is invented. Source of the rules: oifits-strict.ts. */

import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { sourceOf } from '../../../stages/bytes.ts';
import { appendEmptyPrimary, appendTableHdu, type NewColumn } from '../../../stages/formats/fits/table.ts';
import { readOifits } from '../../../stages/formats/oifits.ts';
import { requireValidOifits } from '../../../stages/formats/oifits-strict.ts';
import { InputProblem } from '../../../stages/problem.ts';
import { problemOf, written } from './fits/fixtures.ts';

interface NewTable {
  extname: string;
  rows: number;
  cards: [string, string | number][];
  columns: NewColumn[];
}

interface File {
  primary: [string, string][];
  tables: NewTable[];
}

const column = (name: string, form: string, values: NewColumn['values']): NewColumn => ({
  name,
  form,
  values,
});
const zeros = (names: string[], rows: number, form = '1D') =>
  names.map((name) => column(name, form, new Array(rows).fill(0)));

/** A valid file of OIFITS 2 with three stations, two wavelengths, all kinds of data, and a table of correlations. */
function validFile(): File {
  const data = (extname: string, more: NewColumn[], stations: number, rows: number): NewTable => ({
    extname,
    rows,
    cards: [
      ['OI_REVN', 2],
      ['DATE-OBS', '2031-03-10'],
      ['ARRNAME', 'INVENTED'],
      ['INSNAME', 'INS'],
    ],
    columns: [
      column('TARGET_ID', '1I', new Array(rows).fill(1)),
      ...zeros(['TIME'], rows),
      column('MJD', '1D', new Array(rows).fill(60000)),
      column('INT_TIME', '1D', new Array(rows).fill(10)),
      ...more,
      column('STA_INDEX', `${stations}I`, stations === 2 ? [1, 2, 1, 3] : [1, 2, 3]),
      column('FLAG', '2L', new Array(2 * rows).fill(0)),
    ],
  });
  const two = (names: string[], rows: number, value: number) =>
    names.map((name) => column(name, '2D', new Array(2 * rows).fill(value)));
  const correlated = data(
    'OI_VIS2',
    [...two(['VIS2DATA', 'VIS2ERR'], 2, 0.1), ...zeros(['UCOORD', 'VCOORD'], 2)],
    2,
    2,
  );
  correlated.cards.push(['CORRNAME', 'CORR']);
  return {
    primary: [
      ...['ORIGIN', 'TELESCOP', 'INSTRUME', 'OBSERVER', 'OBJECT', 'INSMODE'].map((name): [string, string] => [
        name,
        'invented',
      ]),
      ['DATE', '2031-03-10'],
      ['DATE-OBS', '2031-03-10'],
      ['CONTENT', 'OIFITS2'],
    ],
    tables: [
      {
        extname: 'OI_TARGET',
        rows: 1,
        cards: [['OI_REVN', 2]],
        columns: [
          column('TARGET_ID', '1I', [1]),
          column('TARGET', '16A', ['Lantern']),
          ...zeros(['RAEP0', 'DECEP0', 'EQUINOX', 'RA_ERR', 'DEC_ERR', 'SYSVEL'], 1),
          column('VELTYP', '8A', ['UNKNOWN']),
          column('VELDEF', '8A', ['UNKNOWN']),
          ...zeros(['PMRA', 'PMDEC', 'PMRA_ERR', 'PMDEC_ERR', 'PARALLAX', 'PARA_ERR'], 1),
          column('SPECTYP', '16A', ['UNKNOWN']),
        ],
      },
      {
        extname: 'OI_ARRAY',
        rows: 3,
        cards: [
          ['OI_REVN', 2],
          ['ARRNAME', 'INVENTED'],
          ['FRAME', 'GEOCENTRIC'],
          ['ARRAYX', 1],
          ['ARRAYY', 2],
          ['ARRAYZ', 3],
        ],
        columns: [
          column('TEL_NAME', '8A', ['A', 'B', 'C']),
          column('STA_NAME', '8A', ['WICK', 'FLINT', 'EMBER']),
          column('STA_INDEX', '1I', [1, 2, 3]),
          ...zeros(['DIAMETER'], 3, '1E'),
          column('STAXYZ', '3D', [0, 0, 0, 60, 10, 0, 20, 80, 0]),
          ...zeros(['FOV'], 3),
          column('FOVTYPE', '6A', ['FWHM', 'FWHM', 'FWHM']),
        ],
      },
      {
        extname: 'OI_WAVELENGTH',
        rows: 2,
        cards: [
          ['OI_REVN', 2],
          ['INSNAME', 'INS'],
        ],
        columns: [column('EFF_WAVE', '1E', [1.6e-6, 1.7e-6]), column('EFF_BAND', '1E', [1e-7, 1e-7])],
      },
      data(
        'OI_VIS',
        [...two(['VISAMP', 'VISAMPERR', 'VISPHI', 'VISPHIERR'], 2, 0.1), ...zeros(['UCOORD', 'VCOORD'], 2)],
        2,
        2,
      ),
      correlated,
      data(
        'OI_T3',
        [
          ...two(['T3AMP', 'T3AMPERR', 'T3PHI', 'T3PHIERR'], 1, 0.1),
          ...zeros(['U1COORD', 'V1COORD', 'U2COORD', 'V2COORD'], 1),
        ],
        3,
        1,
      ),
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
    ],
  };
}

function bytesOf({ primary, tables }: File) {
  return written((sink) => {
    appendEmptyPrimary(sink, primary);
    for (const table of tables) appendTableHdu(sink, table);
  });
}

const of = (file: File, extname: string) =>
  file.tables.find((table) => table.extname === extname) as NewTable;
const without = (extname: string, name: string) => (file: File) => {
  of(file, extname).columns = of(file, extname).columns.filter((each) => each.name !== name);
};
const setValue = (extname: string, name: string, at: number, value: number) => (file: File) => {
  const table = of(file, extname);
  table.columns = table.columns.map((each) =>
    each.name === name
      ? { ...each, values: [...(each.values as number[])].map((old, k) => (k === at ? value : old)) }
      : each,
  );
};
const setCard = (extname: string, name: string, value: string | number | null) => (file: File) => {
  const table = of(file, extname);
  table.cards = table.cards.flatMap((card): NewTable['cards'] =>
    card[0] !== name ? [card] : value === null ? [] : [[name, value]],
  );
};

test('a valid file is read, strictly and otherwise', () => {
  const source = bytesOf(validFile());
  requireValidOifits(source);
  const { vis, vis2, t3, others } = readOifits(source);
  expect([vis.length, vis2.length, t3.length, others]).toEqual([1, 1, 1, ['OI_CORR']]);
});

describe('a file is refused', () => {
  const all = validFile().tables.flatMap(({ extname, columns }) =>
    columns.map(({ name }) => [extname, name] as const),
  );
  test.each(all)('without the column of %s that is called %s', (extname, name) => {
    const file = validFile();
    without(extname, name)(file);
    const { place, expected } = problemOf(() => requireValidOifits(bytesOf(file)));
    expect(place).toContain(extname);
    expect(expected).toContain(`the column ${name}`);
  });

  test.each(
    validFile()
      .primary.map(([name]) => name)
      .filter((name) => name !== 'CONTENT'),
  )('without the primary keyword %s', (name) => {
    const file = validFile();
    file.primary = file.primary.filter(([each]) => each !== name);
    expect(problemOf(() => requireValidOifits(bytesOf(file))).expected).toContain(`the keyword ${name}`);
  });

  test.each<[string, (file: File) => void, string]>([
    [
      'of OIFITS 2 with a table of revision 1',
      setCard('OI_VIS2', 'OI_REVN', 1),
      'OI_REVN 2 in a file of OIFITS 2',
    ],
    ['with a table without INSNAME', setCard('OI_VIS', 'INSNAME', null), 'the keyword INSNAME'],
    ['with a table without DATE-OBS', setCard('OI_T3', 'DATE-OBS', null), 'the keyword DATE-OBS'],
    ['with an array without ARRAYX', setCard('OI_ARRAY', 'ARRAYX', null), 'the keyword ARRAYX'],
    ['with an unknown FRAME', setCard('OI_ARRAY', 'FRAME', 'LOCAL'), 'FRAME GEOCENTRIC or SKY'],
    [
      'with a negative error of an amplitude',
      setValue('OI_VIS', 'VISAMPERR', 2, -0.1),
      'an error of 0 or more',
    ],
    [
      'with a negative error of a squared visibility',
      setValue('OI_VIS2', 'VIS2ERR', 3, -1),
      'an error of 0 or more',
    ],
    [
      'with a negative error of a closure phase',
      setValue('OI_T3', 'T3PHIERR', 0, -5),
      'an error of 0 or more',
    ],
    [
      'with wavelengths out of order',
      setValue('OI_WAVELENGTH', 'EFF_WAVE', 1, 1.6e-6),
      'wavelengths that fall',
    ],
    ['with a negative width', setValue('OI_WAVELENGTH', 'EFF_BAND', 0, -1e-7), 'a width of 0 or more'],
    ['with a station number 0', setValue('OI_ARRAY', 'STA_INDEX', 0, 0), 'a number from 1'],
    [
      'that refers to correlations that are not there',
      setCard('OI_VIS2', 'CORRNAME', 'OTHER'),
      'an OI_CORR with CORRNAME OTHER',
    ],
    [
      'with a correlation of a datum with itself',
      setValue('OI_CORR', 'JINDX', 0, 1),
      '1 <= IINDX < JINDX <= NDATA (4)',
    ],
    [
      'with a correlation beyond the data',
      setValue('OI_CORR', 'JINDX', 0, 5),
      '1 <= IINDX < JINDX <= NDATA (4)',
    ],
    ['with a correlation above 1', setValue('OI_CORR', 'CORR', 0, 1.5), 'a correlation from -1 to 1'],
  ])('%s', (_what, change, rule) => {
    const file = validFile();
    change(file);
    expect(problemOf(() => requireValidOifits(bytesOf(file))).expected).toContain(rule);
  });

  test('that names the row of a negative error, but not of one that is flagged', () => {
    const file = validFile();
    setValue('OI_VIS2', 'VIS2ERR', 3, -1)(file);
    expect(problemOf(() => requireValidOifits(bytesOf(file))).place).toMatch(
      /OI_VIS2.*row 2, column VIS2ERR/,
    );
    setValue('OI_VIS2', 'FLAG', 3, 1)(file);
    requireValidOifits(bytesOf(file));
  });
});

test('never anything but a clear error, wherever the file is cut or a byte is changed', () => {
  const source = bytesOf(validFile());
  const bytes = source.read(0, source.size);
  const read = (changed: Uint8Array) => {
    try {
      requireValidOifits(sourceOf(changed, 'cut'));
      readOifits(sourceOf(changed, 'cut'));
    } catch (error) {
      expect(error).toBeInstanceOf(InputProblem);
    }
  };
  for (let at = 0; at < bytes.length; at += 2880) read(bytes.slice(0, at));
  fc.assert(
    fc.property(
      fc.integer({ min: 0, max: bytes.length - 1 }),
      fc.integer({ min: 0, max: 255 }),
      (at, value) => {
        const changed = Uint8Array.from(bytes);
        changed[at] = value;
        read(changed);
      },
    ),
    { numRuns: 300 },
  );
});
