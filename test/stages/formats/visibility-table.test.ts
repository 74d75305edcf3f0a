import { describe, expect, it } from 'vitest';
import { sourceOf } from '../../../stages/bytes.ts';
import { readVisibilityTable, type TableRequest } from '../../../stages/formats/visibility-table.ts';
import { InputProblem } from '../../../stages/problem.ts';

const column = (name: string, unit?: string) => ({ column: name, unit });
const columns = {
  station1: column('a'),
  station2: column('b'),
  time: column('t'),
  u: column('u'),
  v: column('v'),
  re: column('re'),
  im: column('im'),
  sigma: column('s'),
};

function read(text: string, change: Partial<TableRequest['columns']> = {}, timeOrigin = 0) {
  const source = sourceOf(new TextEncoder().encode(text), 'data');
  return readVisibilityTable(source, {
    columns: { ...columns, ...change },
    timeOrigin,
    frequencyHz: 299792458e3,
  });
}

function problem(work: () => unknown): InputProblem {
  try {
    work();
  } catch (error) {
    if (error instanceof InputProblem) return error;
    throw error;
  }
  throw new Error('accepted');
}

const head = 'a,b,t,u,v,re,im,s\n';
const row = 'X,Y,60000.5,1e9,-2e9,1,-0.5,0.25\n';

describe('reading a table of visibilities', () => {
  it('reads columns in any order, MJD, wavelengths and Jy unless said otherwise', () => {
    const table = read(`s,im,re,v,u,t,b,a\n0.25,-0.5,1,-2e9,1e9,60000.5,Y,X\n`);
    expect([table.station1, table.station2]).toEqual([['X'], ['Y']]);
    expect([table.timeMjd[0], table.u[0], table.v[0], table.re[0], table.im[0], table.weight[0]]).toEqual([
      60000.5, 1e9, -2e9, 1, -0.5, 16,
    ]);
  });

  it.each([';', '\t', ','])('takes %j for the separator when the first line has it', (separator) => {
    expect(read((head + row).replaceAll(',', separator)).u[0]).toBe(1e9);
  });

  it('takes quoted fields, a byte order mark, blank lines and comments', () => {
    expect(read(`\uFEFF# a comment\n${head}\n"X","Y",60000.5,1e9,-2e9,1,-0.5,0.25\n\n`).station1).toEqual([
      'X',
    ]);
  });

  it.each([
    [column('u', 'Glambda'), 1e18],
    [column('u', 'm'), 1e12], // wavelength 1 mm: 1000 a metre
    [column('u', 's'), 1e9 * 299792458e3],
  ])('takes u in %o', (u, expected) => {
    expect(read(head + row, { u }).u[0]).toBeCloseTo(expected, -3);
  });

  it('takes times as JD and since an origin', () => {
    expect(read(head + row, { time: column('t', 'JD') }).timeMjd[0]).toBe(60000.5 - 2400000.5);
    // 60000.5 s are 0.694450231… d (60000.5/86400).
    expect(read(head + row, { time: column('t', 's') }, 59000).timeMjd[0]).toBeCloseTo(
      59000 + 60000.5 / 86400,
      9,
    );
  });

  it('takes amplitude and phase, weights, integration and flags', () => {
    const table = read(
      'a,b,t,u,v,amp,phase,w,int,bad\nX,Y,1,1,1,2000,90,4,30,true\nX,Y,2,1,1,2000,180,4,30,0\n',
      {
        re: undefined,
        im: undefined,
        sigma: undefined,
        amplitude: column('amp', 'mJy'),
        phase: column('phase'),
        weight: column('w'),
        integration: column('int', 's'),
        flag: column('bad'),
      },
    );
    expect(table.im[0]).toBeCloseTo(2, 14);
    expect(table.re[1]).toBeCloseTo(-2, 14);
    expect([table.weight[0], table.integrationSeconds[0], ...table.flagged]).toEqual([4, 30, 1, 0]);
  });

  it('makes empty cells and nan NaN, and a sigma of 0 an infinite weight', () => {
    const table = read(`${head}X,Y,1,1,1,,nan,0\nX,Y,1,1,1,1,1,-2\n`);
    expect([table.re[0], table.im[0], table.weight[0], table.weight[1]]).toEqual([NaN, NaN, Infinity, -0.25]);
  });
});

describe('refusing a table', () => {
  it('names line and column of a bad cell', () => {
    expect(problem(() => read(`${head}${row}X,Y,1,1,1,0x1F,1,1\n`)).message).toBe(
      'data, line 3, column re: bad-cell: expected a number, nan or nothing, got "0x1F". Correct the cell.',
    );
    expect(problem(() => read(`${head},Y,1,1,1,1,1,1\n`)).place).toBe('data, line 2, column a');
  });

  it.each([
    ['no-such-column', head + row, { re: column('real') }],
    ['no-such-column', `a,b,t,u,v,re,im,s,s\nX,Y,1,1,1,1,1,1,1\n`, {}],
    ['columns-missing', head + row, { sigma: undefined }],
    ['columns-missing', head + row, { weight: column('s') }],
    ['columns-missing', head + row, { im: undefined }],
    ['bad-table', `${head}X,Y,1\n`, {}],
    ['bad-table', `${head}"X,Y,1\n`, {}],
    ['empty-table', head, {}],
    ['empty-table', '', {}],
  ])('says %s', (code, text, change) => {
    expect(problem(() => read(text, change)).code).toBe(code);
  });

  it('names the parameter of a unit of the wrong dimension', () => {
    for (const [role, unit] of [
      ['u', 'Jy'],
      ['sigma', 'm'],
      ['time', 'Hz'],
    ] as const) {
      expect(problem(() => read(head + row, { [role]: column(columns[role].column, unit) })).place).toBe(
        `parameter columns.${role}`,
      );
    }
  });

  it('names bytes that are no text', () => {
    const source = sourceOf(Uint8Array.of(0xff, 0xfe, 0x00), 'data');
    expect(problem(() => readVisibilityTable(source, { columns, timeOrigin: 0, frequencyHz: 1 })).code).toBe(
      'not-text',
    );
  });
});
