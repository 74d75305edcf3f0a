/** The data tables of OIFITS: OI_VIS, OI_VIS2, OI_T3, OI_FLUX, every row linked to its target and stations. */

import { headerValue, requireInteger, requireText } from './fits/header.ts';
import type { Table } from './fits/table.ts';
import { exactly, ruleBroken } from './oifits-rules.ts';
import type { OiArray, OiData, OiFlux, OiT3, OiTarget, OiVis, OiVis2, OiWavelength } from './oifits-types.ts';

/** What data tables refer to. */
export interface Links {
  readonly targets: readonly OiTarget[];
  readonly arrays: readonly OiArray[];
  readonly wavelengths: readonly OiWavelength[];
}

export function readVis(table: Table, links: Links): OiVis {
  const data = readShared(table, links, 2);
  const values = (name: string) => exactly(table, name, data.channels).numbers();
  return {
    ...data,
    amplitudeType: requireText(table.header, 'AMPTYP', 'absolute').toLowerCase(),
    phaseType: requireText(table.header, 'PHITYP', 'absolute').toLowerCase(),
    unit: table.column('VISAMP').unit,
    amplitude: values('VISAMP'),
    amplitudeError: values('VISAMPERR'),
    phaseDegrees: values('VISPHI'),
    phaseErrorDegrees: values('VISPHIERR'),
    u: exactly(table, 'UCOORD', 1).numbers(),
    v: exactly(table, 'VCOORD', 1).numbers(),
  };
}

export function readVis2(table: Table, links: Links): OiVis2 {
  const data = readShared(table, links, 2);
  return {
    ...data,
    squared: exactly(table, 'VIS2DATA', data.channels).numbers(),
    squaredError: exactly(table, 'VIS2ERR', data.channels).numbers(),
    u: exactly(table, 'UCOORD', 1).numbers(),
    v: exactly(table, 'VCOORD', 1).numbers(),
  };
}

export function readT3(table: Table, links: Links): OiT3 {
  const data = readShared(table, links, 3);
  const values = (name: string) => exactly(table, name, data.channels).numbers();
  return {
    ...data,
    amplitude: values('T3AMP'),
    amplitudeError: values('T3AMPERR'),
    phaseDegrees: values('T3PHI'),
    phaseErrorDegrees: values('T3PHIERR'),
    u1: exactly(table, 'U1COORD', 1).numbers(),
    v1: exactly(table, 'V1COORD', 1).numbers(),
    u2: exactly(table, 'U2COORD', 1).numbers(),
    v2: exactly(table, 'V2COORD', 1).numbers(),
  };
}

export function readFlux(table: Table, links: Links): OiFlux {
  const data = readShared(table, links, table.has('STA_INDEX') ? 1 : 0);
  return {
    ...data,
    calibrated: requireText(table.header, 'CALSTAT', 'C').toUpperCase() === 'C',
    unit: table.column('FLUXDATA').unit,
    flux: exactly(table, 'FLUXDATA', data.channels).numbers(),
    fluxError: exactly(table, 'FLUXERR', data.channels).numbers(),
  };
}

function readShared(table: Table, links: Links, stationsPerRow: number): OiData {
  const { header, place, rows } = table;
  const revision = requireInteger(header, 'OI_REVN', 1, 2);
  const array = findArray(table, links, revision, stationsPerRow);
  const insname = requireText(header, 'INSNAME');
  const wavelength = links.wavelengths.find(({ name }) => name === insname);
  if (wavelength === undefined) {
    const names = links.wavelengths.map(({ name }) => name).join(', ') || 'none';
    throw ruleBroken(place, `an OI_WAVELENGTH with INSNAME ${insname}`, `INSNAME ${names}`);
  }
  const channels = wavelength.wavelengths.length;
  return {
    place,
    revision,
    dateObs: requireText(header, 'DATE-OBS', ''),
    array,
    wavelength,
    rows,
    channels,
    target: readTargetIds(table, links),
    mjd: exactly(table, 'MJD', 1).numbers(),
    integrationSeconds: exactly(table, 'INT_TIME', 1).numbers(),
    flag: exactly(table, 'FLAG', channels).flags(),
    stations: readStations(table, array, stationsPerRow),
    stationsPerRow,
    table,
  };
}

/** The array that ARRNAME names. Revision 2 demands it, except of fluxes without station. */
function findArray(
  table: Table,
  links: Links,
  revision: number,
  stationsPerRow: number,
): OiArray | undefined {
  const optional = revision === 1 || stationsPerRow === 0;
  if (optional && (headerValue(table.header, 'ARRNAME') ?? '') === '') return undefined;
  const arrname = requireText(table.header, 'ARRNAME');
  const array = links.arrays.find(({ name }) => name === arrname);
  // Revision 1 lets a table name an array that the file does not describe.
  if (array !== undefined || optional) return array;
  const names = links.arrays.map(({ name }) => name).join(', ') || 'none';
  throw ruleBroken(table.place, `an OI_ARRAY with ARRNAME ${arrname}`, `ARRNAME ${names}`);
}

function readTargetIds(table: Table, { targets }: Links): Int32Array {
  const rowOf = new Map(targets.map(({ id }, row) => [id, row]));
  return Int32Array.from(exactly(table, 'TARGET_ID', 1).numbers(), (id, row) => {
    const target = rowOf.get(id);
    if (target !== undefined) return target;
    const ids = targets.map((each) => each.id).join(', ');
    throw ruleBroken(`${table.place}, row ${row + 1}`, `a TARGET_ID of OI_TARGET (${ids})`, `${id}`);
  });
}

function readStations(table: Table, array: OiArray | undefined, perRow: number): Int32Array {
  if (perRow === 0) return new Int32Array(0);
  const indices = exactly(table, 'STA_INDEX', perRow).numbers();
  requireUnlike(indices, perRow, table.place);
  if (array === undefined) return new Int32Array(indices.length).fill(-1);
  const rowOf = new Map(array.stations.map(({ index }, row) => [index, row]));
  return Int32Array.from(indices, (index, i) => {
    const station = rowOf.get(index);
    if (station !== undefined) return station;
    const place = `${table.place}, row ${Math.floor(i / perRow) + 1}`;
    const known = array.stations.map((each) => each.index).join(', ');
    throw ruleBroken(place, `a STA_INDEX of OI_ARRAY ${array.name} (${known})`, `${index}`);
  });
}

/** A baseline or triangle has different stations. */
function requireUnlike(indices: Float64Array, perRow: number, place: string): void {
  for (let at = 0; at < indices.length; at += perRow) {
    const row = indices.subarray(at, at + perRow);
    if (new Set(row).size === perRow) continue;
    throw ruleBroken(`${place}, row ${at / perRow + 1}`, 'different stations', `STA_INDEX ${row.join(', ')}`);
  }
}
