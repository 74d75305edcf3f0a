/** Every rule of OIFITS that makes a file invalid: a file that keeps it is accepted, one that breaks it is refused with table, row
 *  and rule. Files are made by oifits-files.ts. Source of the rules: oifits-tables.ts. */

import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { type ByteSource, sourceOf } from '../../../stages/bytes.ts';
import { readOifits } from '../../../stages/formats/oifits.ts';
import { requireValidOifits } from '../../../stages/formats/oifits-strict.ts';
import { writeVisibilities } from '../../../stages/formats/visibilities-write.ts';
import { InputProblem } from '../../../stages/problem.ts';
import { fixture, problemOf, written } from './fits/fixtures.ts';
import {
  addColumn,
  all,
  type Change,
  setCard,
  setForm,
  setValue,
  sourceOfFile,
  twice,
  validFile,
  validFirst,
  without,
  withoutTables,
  withoutUnit,
} from './oifits-files.ts';
import { optical, visibilities } from './our-files.ts';

/** What `ingest` does with a file: rules first, then reading. */
function accept(source: ByteSource) {
  requireValidOifits(source);
  return readOifits(source);
}

function problemWith(change: Change, make = validFile): InputProblem {
  const file = make();
  change(file);
  return problemOf(() => accept(sourceOfFile(file)));
}

describe('a valid file is read', () => {
  test('with several targets, arrays, instruments, all tables of data, correlations, fluxes, polarisation', () => {
    const { revision, targets, arrays, wavelengths, vis, vis2, t3, flux, others } = accept(
      sourceOfFile(validFile()),
    );
    expect([revision, vis.length, vis2.length, t3.length, flux.length]).toEqual([2, 1, 2, 1, 1]);
    expect(others).toEqual(['OI_CORR', 'OI_INSPOL']);
    expect(targets.map(({ name }) => name)).toEqual(['Lantern', 'Lamp']);
    expect(arrays.map(({ name }) => name)).toEqual(['NEAR', 'FAR']);
    expect(wavelengths.map(({ name, wavelengths: waves }) => [name, waves.length])).toEqual([
      ['TWO', 2],
      ['THREE', 3],
    ]);
    // TARGET_ID 4 is the second target; STA_INDEX 7 and 2 of FAR its first and second station.
    expect([[...vis[0].target], [...vis2[1].target]]).toEqual([[0, 1], [1]]);
    expect([vis2[1].array?.name, vis2[1].wavelength.name, [...vis2[1].stations]]).toEqual([
      'FAR',
      'THREE',
      [0, 1],
    ]);
    expect([flux[0].calibrated, flux[0].unit, [...flux[0].stations]]).toEqual([false, 'Jy', [0, 1]]);
  });

  test('of OIFITS 1, with and without arrays', () => {
    const { revision, vis, vis2, t3 } = accept(sourceOfFile(validFirst()));
    expect([revision, vis.length, vis2.length, t3.length]).toEqual([1, 1, 2, 1]);
    const bare = validFirst();
    withoutTables('OI_ARRAY')(bare);
    for (const table of bare.tables) table.cards = table.cards.filter(([name]) => name !== 'ARRNAME');
    expect(accept(sourceOfFile(bare)).vis2[0].array).toBeUndefined();
  });

  test.each<[string, Change]>([
    [
      'a calibrated flux without station',
      all(setCard('OI_FLUX', 'CALSTAT', 'C'), without('OI_FLUX', 'STA_INDEX')),
    ],
    [
      'a calibrated flux without array',
      all(
        setCard('OI_FLUX', 'CALSTAT', 'C'),
        setCard('OI_FLUX', 'ARRNAME', null),
        without('OI_FLUX', 'STA_INDEX'),
      ),
    ],
    [
      'integers and reals of other widths',
      all(
        setForm('OI_ARRAY', 'STA_INDEX', '1J'),
        setValue('OI_ARRAY', 'STA_INDEX', 1, 2),
        setValue('OI_ARRAY', 'STA_INDEX', 2, 3),
        setForm('OI_VIS2', 'VIS2DATA', '2E'),
      ),
    ],
    [
      'a column and a table that the standard does not know',
      all(addColumn('OI_T3', 'NS_NOTE', '8A'), (file) => {
        file.tables.push({ extname: 'OTHER', rows: 0, cards: [], columns: [] });
      }),
    ],
    ['complex visibilities as well', addColumn('OI_VIS', 'RVIS', '2D')],
    [
      'a category of each target',
      all(
        addColumn('OI_TARGET', 'CATEGORY', '7A'),
        setValue('OI_TARGET', 'CATEGORY', 0, 'SCI'),
        setValue('OI_TARGET', 'CATEGORY', 1, 'CAL'),
      ),
    ],
    [
      'a table of data without rows',
      (file) => {
        for (const table of file.tables)
          if (table.extname === 'OI_T3')
            Object.assign(table, {
              rows: 0,
              columns: table.columns.map((each) => ({ ...each, values: [] })),
            });
      },
    ],
  ])('with %s', (_, change) => {
    const file = validFile();
    change(file);
    expect(accept(sourceOfFile(file)).vis).toHaveLength(1);
  });

  // Source: what astropy wrote by test/data/scripts/make-oifits-fixtures.py, and what our own stages write.
  test.each([
    ['of OIFITS 2 by astropy', () => fixture('double.oifits')],
    ['of OIFITS 1 by astropy', () => fixture('two-arrays.oifits')],
    ['of our own', () => written((sink) => writeVisibilities(sink, visibilities))],
    ['of our own, optical', () => written((sink) => writeVisibilities(sink, optical))],
  ])('%s', (_, source) => {
    accept(source());
  });
});

describe('a file is refused', () => {
  const optional = ['CORRINDX_VIS2DATA'];
  const columns = (make: typeof validFile) =>
    make().tables.flatMap(({ extname, columns: own }, k, tables) =>
      tables.findIndex((table) => table.extname === extname) === k
        ? own.filter(({ name }) => !optional.includes(name)).map(({ name }) => [extname, name] as const)
        : [],
    );

  test.each(columns(validFile))('without the column of %s that is called %s', (extname, name) => {
    const { place, expected } = problemWith(without(extname, name));
    expect(place).toContain(extname);
    expect(expected).toContain(`the column ${name}`);
  });

  test.each(columns(validFirst))(
    'of OIFITS 1 without the column of %s that is called %s',
    (extname, name) => {
      const { place, expected } = problemWith(without(extname, name), validFirst);
      expect(place).toContain(extname);
      expect(expected).toContain(`the column ${name}`);
    },
  );

  // Text has no rule of its own in these: any width is legal.
  test.each(columns(validFile).filter(([, name]) => !/NAME$|^TARGET$|TYP|DEF$/.test(name)))(
    'with the wrong number of values in the column of %s that is called %s',
    (extname, name) => {
      const letter =
        name === 'FLAG' ? 'L' : /^J..$/.test(name) ? 'C' : /INDE?X$|TARGET_ID/.test(name) ? 'I' : 'D';
      if (letter === 'C') return;
      const { place, expected, found } = problemWith(setForm(extname, name, `5${letter}`));
      expect(place).toMatch(new RegExp(`${extname}.*column ${name}$|${extname}`));
      expect(`${expected} ${found}`).toContain(`TFORM 5${letter}`);
    },
  );

  const keywords = (make: typeof validFile, optionalCards: string[]) =>
    make().tables.flatMap(({ extname, cards }, k, tables) =>
      tables.findIndex((table) => table.extname === extname) === k
        ? cards.map(([name]) => [extname, name] as const).filter(([, name]) => !optionalCards.includes(name))
        : [],
    );

  test.each(keywords(validFile, ['AMPTYP', 'PHITYP']))(
    'without the keyword of %s that is called %s',
    (extname, name) => {
      const problem = problemWith(setCard(extname, name, null));
      expect(problem.message).toContain(extname);
      expect(problem.expected).toContain(name);
    },
  );

  test.each(keywords(validFirst, ['ARRNAME']))(
    'of OIFITS 1 without the keyword of %s that is called %s',
    (extname, name) => {
      expect(problemWith(setCard(extname, name, null), validFirst).expected).toContain(name);
    },
  );

  test.each(
    validFile()
      .primary.map(([name]) => name)
      .filter((name) => name !== 'CONTENT'),
  )('without the primary keyword %s', (name) => {
    const problem = problemWith((file) => {
      file.primary = file.primary.filter(([each]) => each !== name);
    });
    expect(problem.expected).toContain(`the keyword ${name}`);
  });

  test.each<[string, Change, string, string?]>([
    // Revisions
    [
      'of OIFITS 2 without CONTENT',
      (file) => {
        file.primary = file.primary.filter(([name]) => name !== 'CONTENT');
      },
      'or CONTENT = OIFITS2 in the primary header',
    ],
    [
      'of OIFITS 2 with a table of revision 1',
      setCard('OI_VIS2', 'OI_REVN', 1),
      'OI_REVN 2 in a file of OIFITS 2',
    ],
    [
      'of OIFITS 2 with correlations of revision 2',
      setCard('OI_CORR', 'OI_REVN', 2),
      'OI_REVN 1 in a file of OIFITS 2',
    ],
    [
      'of OIFITS 2 with fluxes of revision 2',
      setCard('OI_FLUX', 'OI_REVN', 2),
      'OI_REVN 1 in a file of OIFITS 2',
    ],
    // Tables that must be there, and those that are referred to
    ['without targets', withoutTables('OI_TARGET'), 'exactly one table OI_TARGET'],
    ['with two tables of targets', twice('OI_TARGET'), 'exactly one table OI_TARGET'],
    ['without wavelengths', withoutTables('OI_WAVELENGTH'), 'an OI_WAVELENGTH with INSNAME TWO'],
    ['without arrays', withoutTables('OI_ARRAY'), 'an OI_ARRAY with ARRNAME NEAR'],
    [
      'without data',
      withoutTables('OI_VIS', 'OI_VIS2', 'OI_T3', 'OI_FLUX'),
      'at least one of OI_VIS, OI_VIS2, OI_T3, OI_FLUX',
    ],
    [
      'that names an unknown array',
      setCard('OI_T3', 'ARRNAME', 'OTHER'),
      'an OI_ARRAY with ARRNAME OTHER',
      'OI_T3',
    ],
    ['that names no array for raw fluxes', setCard('OI_FLUX', 'ARRNAME', null), 'ARRNAME', 'OI_FLUX'],
    [
      'that names an unknown instrument',
      setCard('OI_VIS', 'INSNAME', 'OTHER'),
      'an OI_WAVELENGTH with INSNAME OTHER',
      'OI_VIS',
    ],
    [
      'with an unknown target',
      setValue('OI_VIS', 'TARGET_ID', 1, 3),
      'a TARGET_ID of OI_TARGET (1, 4)',
      'row 2',
    ],
    [
      'with an unknown target of a flux',
      setValue('OI_FLUX', 'TARGET_ID', 0, 3),
      'a TARGET_ID of OI_TARGET',
      'row 1',
    ],
    [
      'with an unknown station',
      setValue('OI_VIS2', 'STA_INDEX', 3, 7),
      'a STA_INDEX of OI_ARRAY NEAR',
      'row 2',
    ],
    [
      'with an unknown station of a triangle',
      setValue('OI_T3', 'STA_INDEX', 2, 9),
      'a STA_INDEX of OI_ARRAY NEAR',
      'row 1',
    ],
    [
      'with an unknown station of a flux',
      setValue('OI_FLUX', 'STA_INDEX', 1, 3),
      'a STA_INDEX of OI_ARRAY FAR',
      'row 2',
    ],
    ['with a baseline of one station', setValue('OI_VIS', 'STA_INDEX', 0, 2), 'different stations', 'row 1'],
    ['with a triangle of two stations', setValue('OI_T3', 'STA_INDEX', 0, 3), 'different stations', 'row 1'],
    [
      'with polarisation of an unknown array',
      setCard('OI_INSPOL', 'ARRNAME', 'OTHER'),
      'an OI_ARRAY with ARRNAME OTHER',
    ],
    [
      'with polarisation of an unknown instrument',
      setValue('OI_INSPOL', 'INSNAME', 1, 'OTHER'),
      'an OI_WAVELENGTH with INSNAME OTHER',
      'row 2',
    ],
    [
      'with polarisation at other wavelengths',
      setValue('OI_INSPOL', 'INSNAME', 1, 'TWO'),
      '2, one for each wavelength',
      'column JXX',
    ],
    [
      'with polarisation of an unknown target',
      setValue('OI_INSPOL', 'TARGET_ID', 0, 9),
      'a TARGET_ID of OI_TARGET',
      'row 1',
    ],
    [
      'with polarisation of an unknown station',
      setValue('OI_INSPOL', 'STA_INDEX', 1, 1),
      'a STA_INDEX of OI_ARRAY FAR',
      'row 2',
    ],
    // Duplicated identifiers
    ['with two targets of one number', setValue('OI_TARGET', 'TARGET_ID', 1, 1), 'every TARGET_ID once'],
    ['with two arrays of one name', twice('OI_ARRAY'), 'every ARRNAME once'],
    ['with two instruments of one name', twice('OI_WAVELENGTH'), 'every INSNAME once'],
    ['with two matrices of one name', twice('OI_CORR'), 'every CORRNAME once'],
    ['with two stations of one number', setValue('OI_ARRAY', 'STA_INDEX', 2, 1), 'every STA_INDEX once'],
    // Values
    ['with an unknown FRAME', setCard('OI_ARRAY', 'FRAME', 'LOCAL'), 'FRAME GEOCENTRIC or SKY'],
    [
      'with an unknown AMPTYP',
      setCard('OI_VIS', 'AMPTYP', 'relative'),
      'AMPTYP absolute or differential or correlated flux',
    ],
    ['with an unknown PHITYP', setCard('OI_VIS', 'PHITYP', 'relative'), 'PHITYP absolute or differential'],
    ['with an unknown CALSTAT', setCard('OI_FLUX', 'CALSTAT', 'X'), 'CALSTAT C or U'],
    [
      'with an unknown FOVTYPE',
      setValue('OI_ARRAY', 'FOVTYPE', 1, 'WIDTH'),
      'FOVTYPE FWHM or RADIUS',
      'row 2',
    ],
    ['with an unknown CATEGORY', addColumn('OI_TARGET', 'CATEGORY', '7A'), 'CATEGORY SCI or CAL', 'row 1'],
    [
      'with a correlated flux without unit',
      setCard('OI_VIS', 'AMPTYP', 'correlated flux'),
      'a unit (TUNIT) of the flux',
      'column VISAMP',
    ],
    [
      'with a spectrum without unit',
      withoutUnit('OI_FLUX', 'FLUXDATA'),
      'a unit (TUNIT) of the flux',
      'column FLUXDATA',
    ],
    ['with a DATE-OBS that is no date', setCard('OI_VIS', 'DATE-OBS', '10/03/31'), 'DATE-OBS as YYYY-MM-DD'],
    ['with an ARRAYX that is no number', setCard('OI_ARRAY', 'ARRAYX', 'far'), 'ARRAYX to be a number'],
    ['with an NDATA that is no number', setCard('OI_CORR', 'NDATA', 'four'), 'NDATA to be an integer'],
    ['with a target number 0', setValue('OI_TARGET', 'TARGET_ID', 0, 0), 'a number from 1', 'row 1'],
    ['with a station number 0', setValue('OI_ARRAY', 'STA_INDEX', 0, 0), 'a number from 1', 'row 1'],
    [
      'with a negative error of an amplitude',
      setValue('OI_VIS', 'VISAMPERR', 2, -0.1),
      'an error of 0 or more',
      'row 2, column VISAMPERR',
    ],
    [
      'with a negative error of a phase',
      setValue('OI_VIS', 'VISPHIERR', 0, -0.1),
      'an error of 0 or more',
      'row 1, column VISPHIERR',
    ],
    [
      'with a negative error of a squared visibility',
      setValue('OI_VIS2', 'VIS2ERR', 3, -1),
      'an error of 0 or more',
      'row 2, column VIS2ERR',
    ],
    [
      'with a negative error of a triple amplitude',
      setValue('OI_T3', 'T3AMPERR', 1, -5),
      'an error of 0 or more',
      'column T3AMPERR',
    ],
    [
      'with a negative error of a closure phase',
      setValue('OI_T3', 'T3PHIERR', 0, -5),
      'an error of 0 or more',
      'column T3PHIERR',
    ],
    [
      'with a negative error of a flux',
      setValue('OI_FLUX', 'FLUXERR', 5, -5),
      'an error of 0 or more',
      'row 2, column FLUXERR',
    ],
    [
      'with a negative error of a real part',
      addColumn('OI_VIS', 'RVISERR', '2D', -1),
      'an error of 0 or more',
      'row 1, column RVISERR',
    ],
    [
      'with a wavelength twice',
      setValue('OI_WAVELENGTH', 'EFF_WAVE', 1, 1.6e-6),
      'wavelengths that fall',
      'row 2',
    ],
    [
      'with a negative wavelength',
      setValue('OI_WAVELENGTH', 'EFF_WAVE', 0, -1e-6),
      'EFF_WAVE above 0 metres',
      'row 1',
    ],
    [
      'with a negative width',
      setValue('OI_WAVELENGTH', 'EFF_BAND', 0, -1e-7),
      'a width of 0 or more',
      'row 1',
    ],
    [
      'with a width that is no number',
      setValue('OI_WAVELENGTH', 'EFF_BAND', 1, Number.NaN),
      'a width of 0 or more',
      'row 2',
    ],
    // Forms
    [
      'with times of single precision',
      setForm('OI_VIS', 'MJD', '1E'),
      'reals of double precision (D)',
      'column MJD',
    ],
    ['with flags that are numbers', setForm('OI_VIS2', 'FLAG', '2B'), 'logicals (L)', 'column FLAG'],
    [
      'with station numbers that are reals',
      setForm('OI_VIS2', 'STA_INDEX', '2D'),
      'integers (B I J K)',
      'column STA_INDEX',
    ],
    ['with names that are numbers', setForm('OI_TARGET', 'TARGET', '1D'), 'text (A)', 'column TARGET'],
    ['with values that are integers', setForm('OI_VIS2', 'VIS2DATA', '2J'), 'reals (E D)', 'column VIS2DATA'],
    ['with matrices of reals', setForm('OI_INSPOL', 'JXY', '3D'), 'complex numbers (C M)', 'column JXY'],
    [
      'with real parts at other wavelengths',
      addColumn('OI_VIS', 'RVIS', '3D'),
      '2, one for each wavelength',
      'column RVIS',
    ],
    // Correlations
    [
      'that refers to correlations that are not there',
      setCard('OI_VIS2', 'CORRNAME', 'OTHER'),
      'an OI_CORR with CORRNAME OTHER',
      'OI_VIS2',
    ],
    [
      'that numbers values of no matrix',
      setCard('OI_VIS2', 'CORRNAME', null),
      'the keyword CORRNAME',
      'OI_VIS2',
    ],
    [
      'that numbers values beyond the matrix',
      setValue('OI_VIS2', 'CORRINDX_VIS2DATA', 1, 4),
      'numbers from 1 to NDATA (4) for 2 values',
      'row 2',
    ],
    [
      'that numbers values from 0',
      setValue('OI_VIS2', 'CORRINDX_VIS2DATA', 0, 0),
      'numbers from 1 to NDATA (4)',
      'row 1',
    ],
    [
      'with a correlation of a datum with itself',
      setValue('OI_CORR', 'JINDX', 0, 1),
      '1 <= IINDX < JINDX <= NDATA (4)',
      'row 1',
    ],
    [
      'with a correlation beyond the data',
      setValue('OI_CORR', 'JINDX', 0, 5),
      '1 <= IINDX < JINDX <= NDATA (4)',
      'row 1',
    ],
    [
      'with a correlation above 1',
      setValue('OI_CORR', 'CORR', 0, 1.5),
      'a correlation from -1 to 1',
      'row 1',
    ],
    [
      'with a correlation that is no number',
      setValue('OI_CORR', 'CORR', 0, Number.NaN),
      'a correlation from -1 to 1',
      'row 1',
    ],
    ['with a matrix of nothing', setCard('OI_CORR', 'NDATA', 0), 'NDATA to be an integer from 1'],
  ])('%s', (_what, change, rule, place = '') => {
    const problem = problemWith(change);
    expect(problem.expected).toContain(rule);
    expect(problem.place).toContain(place);
  });

  test('with three wavelengths of which the last turns back', () => {
    const problem = problemWith((file) => {
      file.tables.splice(3, 0, ...file.tables.splice(4, 1));
      setValue('OI_WAVELENGTH', 'EFF_WAVE', 2, 2.25e-6)(file);
    });
    expect(problem.message).toMatch(
      /OI_WAVELENGTH\), row 3: oifits-rule: expected wavelengths that fall from row to row, got EFF_WAVE 0.00000225\d* m after 0.0000021999\d* m/,
    );
  });

  test.each<[string, Change, string]>([
    ['with a table of revision 2', setCard('OI_T3', 'OI_REVN', 2), 'OI_REVN 1 in a file of OIFITS 1'],
    ['that names an unknown array', setCard('OI_VIS', 'ARRNAME', 'OTHER'), 'an OI_ARRAY with ARRNAME OTHER'],
    [
      'that names an unknown instrument',
      setCard('OI_VIS', 'INSNAME', 'OTHER'),
      'an OI_WAVELENGTH with INSNAME OTHER',
    ],
    ['without targets', withoutTables('OI_TARGET'), 'exactly one table OI_TARGET'],
    ['without data', withoutTables('OI_VIS', 'OI_VIS2', 'OI_T3'), 'at least one of OI_VIS'],
    ['with a negative error', setValue('OI_VIS2', 'VIS2ERR', 3, -1), 'an error of 0 or more'],
    ['with an unknown target', setValue('OI_VIS', 'TARGET_ID', 1, 3), 'a TARGET_ID of OI_TARGET'],
    ['with an unknown station', setValue('OI_VIS2', 'STA_INDEX', 3, 7), 'a STA_INDEX of OI_ARRAY NEAR'],
    ['with two arrays of one name', twice('OI_ARRAY'), 'every ARRNAME once'],
  ])('of OIFITS 1 %s', (_what, change, rule) => {
    expect(problemWith(change, validFirst).expected).toContain(rule);
  });

  test('that names the row of a negative error, but not of one that is flagged', () => {
    const file = validFile();
    setValue('OI_VIS2', 'VIS2ERR', 3, -1)(file);
    expect(problemOf(() => requireValidOifits(sourceOfFile(file))).place).toMatch(
      /OI_VIS2.*row 2, column VIS2ERR/,
    );
    setValue('OI_VIS2', 'FLAG', 3, 1)(file);
    requireValidOifits(sourceOfFile(file));
  });
});

test('never anything but a clear error, wherever the file is cut or a byte is changed', () => {
  const source = sourceOfFile(validFile());
  const bytes = source.read(0, source.size);
  // Names that mean nothing, so that damage gets past the sums.
  const plain = Buffer.from(
    Buffer.from(bytes)
      .toString('latin1')
      .replaceAll('CHECKSUM=', 'UNCHECKS=')
      .replaceAll('DATASUM =', 'UNDATASU='),
    'latin1',
  );
  const read = (changed: Uint8Array) => {
    try {
      accept(sourceOf(changed, 'cut'));
    } catch (error) {
      expect(error).toBeInstanceOf(InputProblem);
    }
  };
  read(plain);
  for (let at = 0; at < bytes.length; at += 2880) read(bytes.slice(0, at));
  fc.assert(
    fc.property(
      fc.constantFrom(bytes, plain),
      fc.integer({ min: 0, max: bytes.length - 1 }),
      fc.integer({ min: 0, max: 255 }),
      (whole, at, value) => {
        const changed = Uint8Array.from(whole);
        changed[at] = value;
        read(changed);
      },
    ),
    { numRuns: 300 },
  );
});
