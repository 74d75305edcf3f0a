/** OIFITS 1 by astropy, with two arrays, two tables of wavelengths, two targets, flags; and broken rules. */

import { describe, expect, test } from 'vitest';
import { appendEmptyPrimary, appendTableHdu, type NewColumn } from '../../../stages/formats/fits/table.ts';
import { readOifits } from '../../../stages/formats/oifits.ts';
import { fixture, problemOf, written } from './fits/fixtures.ts';

// Source of all values: what test/data/scripts/make-oifits-fixtures.py gave astropy to write.
describe('revision 1 with two arrays', () => {
  const oifits = readOifits(fixture('two-arrays.oifits'));
  const [north, south] = oifits.vis2;

  test('has its targets, by TARGET_ID and not by row', () => {
    expect(oifits.revision).toBe(1);
    expect(
      oifits.targets.map(({ id, name, raDegrees, decDegrees }) => [id, name, raDegrees, decDegrees]),
    ).toEqual([
      [7, 'ALPHA', 10, 20],
      [3, 'BETA', 30, -40],
    ]);
    expect([[...(north?.target ?? [])], [...(south?.target ?? [])]]).toEqual([[1, 0], [0]]);
  });

  test('has stations linked by ARRNAME and STA_INDEX, and geocentric positions added up', () => {
    const names = (table: typeof north) =>
      Array.from(table?.stations ?? [], (i) => table?.array?.stations[i]?.name);
    expect(names(north)).toEqual(['NORTH1', 'NORTH5', 'NORTH2', 'NORTH1']);
    expect(names(south)).toEqual(['SOUTH9', 'SOUTH2']);
    expect(north?.array?.stations[1]?.xyz).toEqual([1020, 2002, 2998]);
    // The frame SKY has no geocentre.
    expect(south?.array?.stations[1]?.xyz).toEqual([90, 9, -9]);
  });

  test('has wavelengths linked by INSNAME', () => {
    expect([...(north?.wavelength.wavelengths ?? [])]).toEqual([Math.fround(2e-6)]);
    expect([...(south?.wavelength.wavelengths ?? [])]).toEqual([4e-7, 5e-7].map(Math.fround));
  });

  test('keeps flags, NaN and columns of our own as they stand', () => {
    expect([[...(north?.flag ?? [])], [...(south?.flag ?? [])]]).toEqual([
      [0, 1],
      [0, 1],
    ]);
    expect([...(south?.squared ?? [])]).toEqual([0.125, Number.NaN]);
    expect(north?.table.column('NS_NOTE').texts()).toEqual(['row0', 'row1']);
  });
});

describe('broken rules', () => {
  interface Change {
    target?: NewColumn[];
    revision?: number;
    insname?: string;
    arrname?: string | null;
    stations?: number[];
    targetId?: number;
    channels?: number;
    twice?: boolean;
    wave?: number;
    data?: boolean;
  }

  const one = (name: string, form: string, values: NewColumn['values']): NewColumn => ({
    name,
    form,
    values,
  });

  function file(change: Change) {
    const { revision = 2, insname = 'INS', arrname = 'ARR', channels = 1, wave = 1e-3 } = change;
    return written((sink) => {
      appendEmptyPrimary(sink, [['CONTENT', 'OIFITS2']]);
      const target = [
        one('TARGET_ID', 'I', [1]),
        one('TARGET', '16A', ['T']),
        ...['RAEP0', 'DECEP0', 'EQUINOX'].map((name) => one(name, 'D', [0])),
      ];
      const tables = change.twice ? 2 : 1;
      for (let i = 0; i < tables; i++) {
        appendTableHdu(sink, { extname: 'OI_TARGET', rows: 1, columns: target, cards: [['OI_REVN', 2]] });
      }
      appendTableHdu(sink, {
        extname: 'OI_ARRAY',
        rows: 2,
        cards: [
          ['OI_REVN', 2],
          ['ARRNAME', 'ARR'],
          ['FRAME', 'GEOCENTRIC'],
        ],
        columns: [
          one('TEL_NAME', '4A', ['A', 'B']),
          one('STA_NAME', '4A', ['A', 'B']),
          one('STA_INDEX', 'I', [1, 2]),
          one('DIAMETER', 'E', [0, 0]),
          one('STAXYZ', '3D', [1, 2, 3, 4, 5, 6]),
        ],
      });
      appendTableHdu(sink, {
        extname: 'OI_WAVELENGTH',
        rows: 1,
        cards: [
          ['OI_REVN', 2],
          ['INSNAME', 'INS'],
        ],
        columns: [one('EFF_WAVE', 'E', [wave]), one('EFF_BAND', 'E', [0])],
      });
      if (change.data === false) return;
      const numbers = Array(channels).fill(0.5);
      appendTableHdu(sink, {
        extname: 'OI_VIS2',
        rows: 1,
        cards: [
          ['OI_REVN', revision],
          ['INSNAME', insname],
          ...(arrname === null ? [] : [['ARRNAME', arrname] as const]),
        ],
        columns: [
          one('TARGET_ID', 'I', [change.targetId ?? 1]),
          ...['MJD', 'INT_TIME', 'UCOORD', 'VCOORD'].map((name) => one(name, 'D', [1])),
          one('VIS2DATA', `${channels}D`, numbers),
          one('VIS2ERR', `${channels}D`, numbers),
          one('STA_INDEX', '2I', change.stations ?? [1, 2]),
          one('FLAG', `${channels}L`, Array(channels).fill(0)),
        ],
      });
    });
  }

  test('none in the plain file; revision 1 needs no ARRNAME', () => {
    expect(readOifits(file({})).vis2[0]?.array?.name).toBe('ARR');
    expect([...(readOifits(file({ revision: 1, arrname: null })).vis2[0]?.stations ?? [])]).toEqual([-1, -1]);
  });

  test.each<[string, Change, string, string, string]>([
    ['unknown INSNAME', { insname: 'OTHER' }, '', 'an OI_WAVELENGTH with INSNAME OTHER', 'INSNAME INS'],
    ['unknown ARRNAME', { arrname: 'OTHER' }, '', 'an OI_ARRAY with ARRNAME OTHER', 'ARRNAME ARR'],
    ['unknown station', { stations: [1, 9] }, ', row 1', 'a STA_INDEX of OI_ARRAY ARR (1, 2)', '9'],
    ['a baseline of one station', { stations: [2, 2] }, ', row 1', 'different stations', 'STA_INDEX 2, 2'],
    ['unknown target', { targetId: 5 }, ', row 1', 'a TARGET_ID of OI_TARGET (1)', '5'],
    ['another number of channels', { channels: 2 }, ', column FLAG', '1 values in a row', 'TFORM 2L'],
  ])('%s', (_, change, place, expected, found) => {
    expect(problemOf(() => readOifits(file(change))).message).toBe(
      `written, HDU 5 (OI_VIS2)${place}: oifits-rule: expected ${expected}, got ${found}. ` +
        'The file breaks a rule of OIFITS: correct it with the program that wrote it.',
    );
  });

  test('about the tables themselves', () => {
    const found = (change: Change) => problemOf(() => readOifits(file(change)));
    expect(found({ twice: true }).expected).toBe('exactly one table OI_TARGET');
    expect(found({ data: false }).found).toBe('no table of data');
    expect(found({ wave: -1 }).place).toBe('written, HDU 4 (OI_WAVELENGTH), row 1');
    expect(found({ revision: 3 }).expected).toBe('OI_REVN to be an integer from 1 to 2');
    expect(found({ arrname: null }).code).toBe('missing-keyword');
  });
});
