/** Rules of the correlation table of OIFITS 2 and of what refers to it. Source: Duvert, Young & Hummel 2017, A&A 597, A8,
 *  from memory: OI_CORR holds the upper triangle of a matrix of NDATA values, without its diagonal; CORRINDX of a column of
 *  data is the number in the matrix of the first value of a row. */

import { headerValue, requireInteger } from './fits/header.ts';
import type { Table } from './fits/table.ts';
import { ruleBroken, uniqueIn } from './oifits-rules.ts';

const INDEX = 'CORRINDX_';
/** What an integer of 32 bits can number. */
const MOST_DATA = 0x7fff_ffff;

/** @throws InputProblem when a matrix is not there, is there twice, or lacks what is pointed at */
export function requireCorrelations(tables: readonly { extname: string; table: Table }[]): void {
  const matrices = tables.filter(({ extname }) => extname === 'OI_CORR').map(({ table }) => table);
  const names = matrices.map(nameOf);
  uniqueIn(names, 'CORRNAME', matrices[0]?.place ?? '');
  const sizes = new Map(matrices.map((table, k) => [names[k], requireEntries(table)]));
  for (const { extname, table } of tables) {
    if (extname === 'OI_CORR') continue;
    const indices = table.names.filter((name) => name.toUpperCase().startsWith(INDEX));
    const hasName = headerValue(table.header, 'CORRNAME') !== undefined;
    if (!hasName && indices.length > 0)
      throw ruleBroken(table.place, `the keyword CORRNAME with the column ${indices[0]}`, 'none');
    if (!hasName) continue;
    const name = nameOf(table);
    const size = sizes.get(name);
    if (size === undefined)
      throw ruleBroken(table.place, `an OI_CORR with CORRNAME ${name}`, names.join(', ') || 'none');
    for (const index of indices) requireWithin(table, index, size);
  }
}

function nameOf({ header }: Table): string {
  return String(headerValue(header, 'CORRNAME') ?? '').trim();
}

/** All entries of a matrix stand above its diagonal. Returns NDATA. */
function requireEntries(table: Table): number {
  const count = requireInteger(table.header, 'NDATA', 1, MOST_DATA);
  const [i, j, values] = ['IINDX', 'JINDX', 'CORR'].map((name) => table.column(name).numbers());
  for (let k = 0; k < table.rows; k++) {
    const place = `${table.place}, row ${k + 1}`;
    if (!(i[k] >= 1 && i[k] < j[k] && j[k] <= count))
      throw ruleBroken(place, `1 <= IINDX < JINDX <= NDATA (${count})`, `IINDX ${i[k]}, JINDX ${j[k]}`);
    if (!(Math.abs(values[k]) <= 1))
      throw ruleBroken(place, 'a correlation from -1 to 1', `CORR ${values[k]}`);
  }
  return count;
}

/** The values of a row, one for each wavelength, lie within the matrix. */
function requireWithin(table: Table, index: string, size: number): void {
  const channels = table.column('FLAG').repeat;
  const firsts = table.column(index).numbers();
  const odd = firsts.findIndex((first) => !(first >= 1 && first + channels - 1 <= size));
  if (odd < 0) return;
  throw ruleBroken(
    `${table.place}, row ${odd + 1}, column ${index}`,
    `numbers from 1 to NDATA (${size}) for ${channels} values`,
    `${firsts[odd]} on`,
  );
}
