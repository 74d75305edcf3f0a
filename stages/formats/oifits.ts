/** Reads OIFITS 1 and 2: what the data tables refer to (targets, stations, wavelengths) and the data tables, linked by
 *  TARGET_ID, ARRNAME and INSNAME. Values are not judged: flags, NaN and errors come as they stand. Types and
 *  sources: oifits-types.ts. */

import type { ByteSource } from '../bytes.ts';
import { type Hdu, openFits } from './fits/hdu.ts';
import { type Header, headerValue, requireInteger, requireNumber, requireText } from './fits/header.ts';
import { readTable, type Table } from './fits/table.ts';
import { type Links, readFlux, readT3, readVis, readVis2 } from './oifits-data.ts';
import { exactly, ruleBroken, uniqueIn } from './oifits-rules.ts';
import type { OiArray, Oifits, OiStation, OiTarget, OiWavelength } from './oifits-types.ts';

const known = ['OI_TARGET', 'OI_ARRAY', 'OI_WAVELENGTH', 'OI_VIS', 'OI_VIS2', 'OI_T3', 'OI_FLUX'];

/** Reads all tables of the file. Checksums are verified where the file has them.
 *  @throws InputProblem naming table, row and the rule that is broken */
export function readOifits(source: ByteSource): Oifits {
  const hdus = openFits(source);
  const tables = (extname: string) =>
    hdus
      .filter((hdu) => hdu.kind === 'table' && hdu.extname === extname)
      .map((hdu) => readTable(source, hdu));
  const primary = (hdus[0] as Hdu).header;
  const links: Links = {
    targets: readTargets(tables('OI_TARGET'), source.name),
    arrays: unique(tables('OI_ARRAY').map(readArray), 'ARRNAME', source.name),
    wavelengths: unique(tables('OI_WAVELENGTH').map(readWavelength), 'INSNAME', source.name),
  };
  const oifits: Oifits = {
    revision: revisionOf(primary),
    primary,
    ...links,
    vis: tables('OI_VIS').map((table) => readVis(table, links)),
    vis2: tables('OI_VIS2').map((table) => readVis2(table, links)),
    t3: tables('OI_T3').map((table) => readT3(table, links)),
    flux: tables('OI_FLUX').map((table) => readFlux(table, links)),
    others: hdus.slice(1).flatMap(({ extname }) => (known.includes(extname) ? [] : [extname])),
  };
  if (oifits.vis.length + oifits.vis2.length + oifits.t3.length + oifits.flux.length === 0) {
    throw ruleBroken(source.name, 'at least one of OI_VIS, OI_VIS2, OI_T3, OI_FLUX', 'no table of data');
  }
  return oifits;
}

function revisionOf(primary: Header): 1 | 2 {
  const content = headerValue(primary, 'CONTENT');
  return typeof content === 'string' && content.trim().toUpperCase() === 'OIFITS2' ? 2 : 1;
}

function unique<T extends { readonly name: string }>(things: T[], keyword: string, place: string): T[] {
  uniqueIn(
    things.map(({ name }) => name),
    keyword,
    place,
  );
  return things;
}

function readTargets(tables: readonly Table[], place: string): OiTarget[] {
  const [table] = tables;
  if (table === undefined || tables.length > 1) {
    throw ruleBroken(place, 'exactly one table OI_TARGET', `${tables.length}`);
  }
  requireRevision(table);
  const ids = exactly(table, 'TARGET_ID', 1).numbers();
  uniqueIn(ids, 'TARGET_ID', table.place);
  const names = table.column('TARGET').texts();
  const ra = exactly(table, 'RAEP0', 1).numbers();
  const dec = exactly(table, 'DECEP0', 1).numbers();
  const equinox = exactly(table, 'EQUINOX', 1).numbers();
  return names.map((name, row) => ({
    id: ids[row] as number,
    name,
    raDegrees: ra[row] as number,
    decDegrees: dec[row] as number,
    equinox: equinox[row] as number,
  }));
}

function readArray(table: Table): OiArray {
  requireRevision(table);
  const { header } = table;
  const frame = requireText(header, 'FRAME', '').toUpperCase();
  const origin = ['ARRAYX', 'ARRAYY', 'ARRAYZ'].map((keyword) => requireNumber(header, keyword, 0));
  const offset = frame === 'GEOCENTRIC' ? origin : [0, 0, 0];
  const telescopes = table.column('TEL_NAME').texts();
  const names = table.column('STA_NAME').texts();
  const indices = exactly(table, 'STA_INDEX', 1).numbers();
  const diameters = exactly(table, 'DIAMETER', 1).numbers();
  const xyz = exactly(table, 'STAXYZ', 3).numbers();
  uniqueIn(indices, 'STA_INDEX', table.place);
  const coordinate = (row: number, axis: number) =>
    (offset[axis] as number) + (xyz[3 * row + axis] as number);
  const stations = names.map(
    (name, row): OiStation => ({
      index: indices[row] as number,
      name,
      telescope: telescopes[row] as string,
      xyz: [coordinate(row, 0), coordinate(row, 1), coordinate(row, 2)],
      diameterMetres: diameters[row] as number,
    }),
  );
  return { name: requireText(header, 'ARRNAME'), frame, stations };
}

function readWavelength(table: Table): OiWavelength {
  requireRevision(table);
  const precise = (name: string, standard: string) =>
    exactly(table, table.has(name) ? name : standard, 1).numbers();
  const wavelengths = precise('NS_WAVE', 'EFF_WAVE');
  const bandwidths = precise('NS_BAND', 'EFF_BAND');
  const odd = wavelengths.findIndex(
    (wavelength) => !(wavelength > 0 && wavelength < Number.POSITIVE_INFINITY),
  );
  if (odd >= 0) {
    throw ruleBroken(`${table.place}, row ${odd + 1}`, 'EFF_WAVE above 0 metres', `${wavelengths[odd]}`);
  }
  if (table.rows === 0) throw ruleBroken(table.place, 'at least one wavelength', 'no rows');
  return { name: requireText(table.header, 'INSNAME'), wavelengths, bandwidths };
}

/** OI_REVN of the tables that data refer to: 1 or 2. */
function requireRevision(table: Table): void {
  requireInteger(table.header, 'OI_REVN', 1, 2);
}
