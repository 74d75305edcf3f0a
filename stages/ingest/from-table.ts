/** From a table (CSV) to an observation. The table holds visibilities of one target in one band, hands already combined;
 *  target, frequency and positions come from the parameters. */

import type { ByteSource } from '../bytes.ts';
import type { Station } from '../data.ts';
import {
  type ColumnOf,
  ROLES,
  type Role,
  readVisibilityTable,
  type VisibilityTable,
} from '../formats/visibility-table.ts';
import { InputProblem } from '../problem.ts';
import type { Choices, TableChoice } from './choices.ts';
import { addRecord, drop, faultOf, makeRecords, makeTally, type Observation } from './records.ts';
import { LIGHT_SPEED, leftOut, timeRange } from './select.ts';
import { checkOurs, longestOf, withoutPosition } from './uv-check.ts';
import { requirePlausible } from './uv-verdict.ts';

/** @throws InputProblem */
export function observationOfTable(source: ByteSource, choices: Choices): Observation {
  const table = requireTableChoice(choices);
  const columns = columnsOf(choices.columns ?? {});
  const { frequency, bandwidth, timeOrigin } = { ...table, timeOrigin: choices.timeOrigin };
  const rows = readVisibilityTable(source, { columns, timeOrigin, frequencyHz: frequency });
  const stations = stationsOf(rows, table);
  const names = stations.map((station) => station.name);
  const out = leftOut(names, choices);
  const { records, tally } = readRows(rows, names, out, choices);
  const place = `${source.name}, u and v`;
  if (records.count > 0) requirePlausible(longestOf(records), undefined, place);
  const verdict = checkOurs(records, stations, { raDegrees: table.ra, decDegrees: table.dec }, choices, {
    place,
    wavelengthMetres: LIGHT_SPEED / frequency,
    statedJ2000: false,
  });
  return {
    format: 'csv',
    target: { name: table.target, raDegrees: table.ra, decDegrees: table.dec },
    arrayName: table.array,
    remark: table.remark,
    stations,
    wavelengthMetres: LIGHT_SPEED / frequency,
    bandwidthMetres: (LIGHT_SPEED / frequency / frequency) * bandwidth,
    rows: rows.count,
    records,
    tally,
    polarisation: 'as the table holds it',
    bands: [1],
    channels: [1],
    hands: null,
    leftOut: [...out],
    uv: verdict.agreement,
    warnings: [
      ...(rows.isEnded ? [] : ['The last line has no line break: the table may be cut short.']),
      ...withoutPosition(stations),
      ...verdict.warnings,
    ],
  };
}

function requireTableChoice(choices: Choices): TableChoice {
  const lacking = (['columns', 'table'] as const).filter((name) => choices[name] === undefined);
  if (choices.table !== undefined && lacking.length === 0) return choices.table;
  throw new InputProblem({
    code: 'table-undescribed',
    place: 'parameters',
    expected:
      'for a table: columns (what stands where, in which unit) and table (target, ra, dec, frequency)',
    found: `no ${lacking.join(' and no ')}`,
    advice: 'Add them to the stage.',
  });
}

function columnsOf(columns: NonNullable<Choices['columns']>): Partial<Record<Role, ColumnOf>> {
  const result: Partial<Record<Role, ColumnOf>> = {};
  for (const [role, choice] of Object.entries(columns)) {
    if (!(ROLES as readonly string[]).includes(role)) {
      throw new InputProblem({
        code: 'no-such-role',
        place: `parameter columns.${role}`,
        expected: `one of ${ROLES.join(', ')}`,
        found: JSON.stringify(role),
        advice: 'Correct the name.',
      });
    }
    result[role as Role] =
      typeof choice === 'string'
        ? { column: choice, unit: undefined }
        : { column: choice.column, unit: choice.unit };
  }
  return result;
}

/** Stations in the order of their names, which does not depend on the order of rows. */
function stationsOf(rows: VisibilityTable, table: TableChoice): Station[] {
  const names = [...new Set([...rows.station1, ...rows.station2])].sort((a, b) => (a < b ? -1 : 1));
  const unknown = Object.keys(table.stations).find((name) => !names.includes(name));
  if (unknown !== undefined) {
    throw new InputProblem({
      code: 'no-such-station',
      place: `parameter table.stations.${unknown}`,
      expected: `stations of the table: ${names.join(', ')}`,
      found: JSON.stringify(unknown),
      advice: 'Correct the name, or take the position out.',
    });
  }
  return names.map((name) => {
    const [x = 0, y = 0, z = 0] = table.stations[name] ?? [];
    return { name, xyz: [x, y, z] };
  });
}

function readRows(
  rows: VisibilityTable,
  names: readonly string[],
  out: ReadonlySet<string>,
  choices: Choices,
) {
  const records = makeRecords(rows.count);
  const tally = makeTally();
  tally.read = rows.count;
  const index = new Map(names.map((name, k) => [name, k]));
  const isChosen = timeRange(choices, rows.timeMjd[0]);
  for (let k = 0; k < rows.count; k++) {
    const [re, im, weight, u, v, timeMjd] = [
      rows.re[k],
      rows.im[k],
      rows.weight[k],
      rows.u[k],
      rows.v[k],
      rows.timeMjd[k],
    ];
    const fault = faultOf(re, im, weight);
    if (out.has(rows.station1[k]) || out.has(rows.station2[k])) drop(tally, 'station left out', 1);
    else if (rows.station1[k] === rows.station2[k]) drop(tally, 'autocorrelation', 1);
    else if (!Number.isFinite(u + v + timeMjd)) drop(tally, 'coordinates or time not finite', 1);
    else if (!isChosen(timeMjd)) drop(tally, 'time not chosen', 1);
    else if (rows.flagged[k] !== 0) drop(tally, 'flagged in the file', 1);
    else if (fault !== undefined) drop(tally, fault, 1);
    else {
      addRecord(records, {
        station1: index.get(rows.station1[k]) as number,
        station2: index.get(rows.station2[k]) as number,
        timeMjd,
        integrationSeconds: rows.integrationSeconds[k],
        u,
        v,
        re,
        im,
        weight,
        samples: 1,
      });
    }
  }
  return { records, tally };
}
