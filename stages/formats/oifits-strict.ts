/** The rules of OIFITS that make a file invalid, beyond those without which it cannot be read (oifits.ts, oifits-data.ts):
 *  what must be there (oifits-tables.ts), the revisions of tables, what tables refer to, values that no measurement has, the
 *  order of wavelengths. Correlations: oifits-correlations.ts. Sources: oifits-tables.ts. */

import type { ByteSource } from '../bytes.ts';
import { openFits } from './fits/hdu.ts';
import { type Header, headerValue } from './fits/header.ts';
import { readTable, type Table } from './fits/table.ts';
import { requireCorrelations } from './oifits-correlations.ts';
import { exactly, ruleBroken, uniqueIn } from './oifits-rules.ts';
import { type FormRule, OIFITS_TABLES, PRIMARY_KEYWORDS, type TableRules, WORDS } from './oifits-tables.ts';

/** A table that the standard knows. */
interface Known {
  readonly extname: string;
  readonly rules: TableRules;
  readonly table: Table;
}

/** What tables refer to, by name. */
interface Names {
  readonly isSecond: boolean;
  /** Rows of each OI_WAVELENGTH by INSNAME. */
  readonly channels: ReadonlyMap<string, number>;
  /** Numbers of the stations of each OI_ARRAY by ARRNAME. */
  readonly stations: ReadonlyMap<string, ReadonlySet<number>>;
  readonly targets: ReadonlySet<number>;
}

/** @throws InputProblem naming table, row and rule of the first rule that is broken. Cost: one read of the tables. */
export function requireValidOifits(source: ByteSource): void {
  const hdus = openFits(source);
  const isSecond = requirePrimary(hdus[0].header, source.name);
  const tables = hdus.flatMap((hdu): Known[] => {
    const rules = Object.hasOwn(OIFITS_TABLES, hdu.extname) ? OIFITS_TABLES[hdu.extname] : undefined;
    return hdu.kind === 'table' && rules !== undefined
      ? [{ extname: hdu.extname, rules, table: readTable(source, hdu) }]
      : [];
  });
  for (const known of tables) requireParts(known, isSecond);
  const names = namesOf(tables, isSecond, source.name);
  for (const known of tables) requireTable(known, names);
  if (isSecond) requireCorrelations(tables);
}

/** Whether the file says that it is OIFITS 2; then its primary header is complete. */
function requirePrimary(header: Header, name: string): boolean {
  if (text(headerValue(header, 'CONTENT')).toUpperCase() !== 'OIFITS2') return false;
  const place = `${name}, primary header`;
  for (const keyword of PRIMARY_KEYWORDS) {
    if (isThere(header, keyword)) continue;
    throw ruleBroken(place, `the keyword ${keyword} (mandatory in OIFITS 2)`, 'none');
  }
  return true;
}

function isThere(header: Header, keyword: string): boolean {
  return (headerValue(header, keyword) ?? null) !== null;
}

/** Revision, keywords and columns. */
function requireParts({ rules, table }: Known, isSecond: boolean): void {
  const { header, place } = table;
  const revision = headerValue(header, 'OI_REVN');
  const due = isSecond ? rules.revision : 1;
  if (revision !== due) {
    const hint = isSecond ? '' : ', or CONTENT = OIFITS2 in the primary header';
    const edition = isSecond ? 2 : 1;
    throw ruleBroken(
      place,
      `OI_REVN ${due} in a file of OIFITS ${edition}${hint}`,
      String(revision ?? 'none'),
    );
  }
  for (const keyword of rules.keywords) {
    if (!isThere(header, keyword)) throw ruleBroken(place, `the keyword ${keyword}`, 'none');
  }
  for (const column of Object.keys({ ...rules.columns, ...(isSecond ? rules.added : {}) })) {
    if (!table.has(column))
      throw ruleBroken(place, `the column ${column}`, `columns ${table.names.join(', ')}`);
  }
}

function namesOf(tables: readonly Known[], isSecond: boolean, place: string): Names {
  const of = (extname: string) => tables.filter((each) => each.extname === extname).map(({ table }) => table);
  const idsOf = (table: Table, name: string) => {
    const ids = exactly(table, name, 1).numbers();
    uniqueIn(ids, name, table.place);
    return new Set(ids);
  };
  const nameOf = ({ header }: Table, keyword: string) => text(headerValue(header, keyword));
  const targets = of('OI_TARGET');
  if (targets.length !== 1) throw ruleBroken(place, 'exactly one table OI_TARGET', `${targets.length}`);
  return {
    isSecond,
    channels: new Map(of('OI_WAVELENGTH').map((table) => [nameOf(table, 'INSNAME'), table.rows])),
    stations: new Map(of('OI_ARRAY').map((table) => [nameOf(table, 'ARRNAME'), idsOf(table, 'STA_INDEX')])),
    targets: idsOf(targets[0], 'TARGET_ID'),
  };
}

function requireTable({ extname, rules, table }: Known, names: Names): void {
  const { header, place } = table;
  const insname = headerValue(header, 'INSNAME');
  const arrname = headerValue(header, 'ARRNAME');
  const isOfData = rules.keywords.includes('DATE-OBS');
  if (isOfData) requireKnown(place, 'OI_WAVELENGTH', 'INSNAME', text(insname), names.channels);
  const isBare = extname === 'OI_FLUX' && text(headerValue(header, 'CALSTAT')).toUpperCase() === 'C';
  if (isOfData && names.isSecond && !isBare && text(arrname) === '')
    throw ruleBroken(place, 'the keyword ARRNAME', 'none');
  if (isOfData && text(arrname) !== '')
    requireKnown(place, 'OI_ARRAY', 'ARRNAME', text(arrname), names.stations);
  const channels = names.channels.get(text(insname)) ?? 0;
  for (const [name, rule] of Object.entries({ ...rules.columns, ...rules.added, ...rules.optional })) {
    const ofRows = extname === 'OI_INSPOL' && rule.repeat === 'NWAVE';
    if (table.has(name) && !ofRows) requireForm(table, name, rule, channels);
  }
  if (isOfData) requireDate(table);
  requireErrors(
    table,
    (rules.errors ?? []).filter((name) => table.has(name)),
  );
  for (const column of ['TARGET_ID', 'STA_INDEX']) if (table.has(column)) requireFromOne(table, column);
  if (extname === 'OI_WAVELENGTH') requireWavelengths(table);
  if (extname === 'OI_INSPOL') requirePolarisation(table, names);
  if (names.isSecond) requireWords(extname, table);
  if (names.isSecond) requireUnits(extname, table);
}

function requireKnown(
  place: string,
  extname: string,
  keyword: string,
  name: string,
  known: ReadonlyMap<string, unknown>,
): void {
  if (known.has(name)) return;
  const found = [...known.keys()].join(', ') || 'none';
  throw ruleBroken(place, `an ${extname} with ${keyword} ${name}`, `${keyword} ${found}`);
}

function requireForm(table: Table, name: string, rule: FormRule, channels: number): void {
  const { form, repeat } = table.column(name);
  const letter = form.trim().replace(/^\d*/, '')[0];
  const due = rule.repeat === 'text' ? repeat : rule.repeat === 'NWAVE' ? channels : rule.repeat;
  if (rule.letters.includes(letter) && repeat === due) return;
  const count = rule.repeat === 'NWAVE' ? `${due}, one for each wavelength` : `${due}`;
  const expected = rule.repeat === 'text' ? rule.what : `${rule.what}, ${count} in a row`;
  throw ruleBroken(`${table.place}, column ${name}`, expected, `TFORM ${form}`);
}

/** DATE-OBS begins with a date as FITS writes it (FITS Standard 4.0, section 9.1.1). */
function requireDate({ header, place }: Table): void {
  const date = text(headerValue(header, 'DATE-OBS'));
  if (/^\d{4}-\d\d-\d\d(T.*)?$/.test(date)) return;
  throw ruleBroken(place, 'DATE-OBS as YYYY-MM-DD', date || 'nothing');
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
  const widths = table.column('EFF_BAND').numbers();
  const odd = widths.findIndex((width) => !(width >= 0));
  if (odd < 0) return;
  const place = `${table.place}, row ${odd + 1}, column EFF_BAND`;
  throw ruleBroken(place, 'a width of 0 or more', `${widths[odd]}`);
}

/** Every row of an OI_INSPOL refers to a target, a station and wavelengths, of which its matrices have as many. */
function requirePolarisation(table: Table, { channels, stations, targets }: Names): void {
  const arrname = text(headerValue(table.header, 'ARRNAME'));
  requireKnown(table.place, 'OI_ARRAY', 'ARRNAME', arrname, stations);
  const [ids, indices] = ['TARGET_ID', 'STA_INDEX'].map((name) => table.column(name).numbers());
  const rules = (OIFITS_TABLES.OI_INSPOL as TableRules).columns;
  for (const [row, insname] of table.column('INSNAME').texts().entries()) {
    const place = `${table.place}, row ${row + 1}`;
    requireKnown(place, 'OI_WAVELENGTH', 'INSNAME', insname, channels);
    for (const name of ['JXX', 'JYY', 'JXY', 'JYX'])
      requireForm(table, name, rules[name], channels.get(insname) as number);
    if (!targets.has(ids[row])) throw ruleBroken(place, 'a TARGET_ID of OI_TARGET', `${ids[row]}`);
    if (!stations.get(arrname)?.has(indices[row]))
      throw ruleBroken(place, `a STA_INDEX of OI_ARRAY ${arrname}`, `${indices[row]}`);
  }
}

function requireWords(extname: string, table: Table): void {
  const of: Readonly<Record<string, readonly (keyof typeof WORDS)[]>> = {
    OI_ARRAY: ['FRAME'],
    OI_VIS: ['AMPTYP', 'PHITYP'],
    OI_FLUX: ['CALSTAT'],
  };
  for (const keyword of of[extname] ?? []) {
    const value = headerValue(table.header, keyword);
    if (value !== undefined) requireWord(table.place, keyword, text(value));
  }
  const columns = (['FOVTYPE', 'CATEGORY'] as const).filter(
    (name) => extname !== 'OI_FLUX' && table.has(name),
  );
  for (const name of columns) {
    for (const [row, value] of table.column(name).texts().entries())
      requireWord(`${table.place}, row ${row + 1}`, name, value);
  }
}

function requireWord(place: string, name: keyof typeof WORDS, value: string): void {
  const words: readonly string[] = WORDS[name];
  if (words.some((word) => word.toLowerCase() === value.toLowerCase())) return;
  throw ruleBroken(place, `${name} ${words.join(' or ')}`, value || 'nothing');
}

/** Correlated fluxes and spectra have a unit; a spectrum that is not calibrated belongs to a station. */
function requireUnits(extname: string, table: Table): void {
  const { header, place } = table;
  const isFlux = text(headerValue(header, 'AMPTYP')).toLowerCase() === 'correlated flux';
  const named = extname === 'OI_FLUX' ? 'FLUXDATA' : extname === 'OI_VIS' && isFlux ? 'VISAMP' : undefined;
  if (named !== undefined && table.column(named).unit.trim() === '')
    throw ruleBroken(`${place}, column ${named}`, 'a unit (TUNIT) of the flux', 'none');
  const isRaw = extname === 'OI_FLUX' && text(headerValue(header, 'CALSTAT')).toUpperCase() === 'U';
  if (isRaw && !table.has('STA_INDEX'))
    throw ruleBroken(place, 'the column STA_INDEX with CALSTAT U', `columns ${table.names.join(', ')}`);
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

function text(value: unknown): string {
  return typeof value === 'string' ? value.trim() : String(value ?? '');
}
