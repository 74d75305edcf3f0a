/** Squared visibilities and triple products in the format `visibilities`: OI_VIS2 and OI_T3 of the same target, array and
 *  wavelength. UCOORD and the like are (u,v) at that one wavelength, whatever the channel was; NS_SCAN numbers scans. A
 *  phase or an amplitude that was not measured is undefined (NaN) together with its error, as OIFITS has it. */

import type { ByteSink } from '../bytes.ts';
import type { SquaredVisibilities, TripleProducts } from '../data.ts';
import { InputProblem } from '../problem.ts';
import { fromDegrees, toDegrees } from './angles.ts';
import { requireFiniteColumn, requireFiniteValues } from './column-rules.ts';
import type { NewCard } from './fits/header.ts';
import { appendTableHdu, type NewColumn } from './fits/table.ts';
import type { OiData, OiT3, OiVis2 } from './oifits-types.ts';

/** @throws InputProblem for a row that is flagged, not finite or without a positive error */
export function readSquared(table: OiVis2, wavelengthMetres: number): SquaredVisibilities {
  const column = (name: string) => requireFiniteColumn(table.table.column(name), table.place);
  const sigma = column('VIS2ERR');
  const scan = column('NS_SCAN');
  requireRows(table, scan, (row) => (sigma[row] > 0 ? undefined : `VIS2ERR ${sigma[row]}`));
  return {
    count: table.rows,
    station1: table.stations.filter((_, i) => i % 2 === 0),
    station2: table.stations.filter((_, i) => i % 2 === 1),
    scan: Int32Array.from(scan),
    timeMjd: column('MJD'),
    u: column('UCOORD').map((u) => u / wavelengthMetres),
    v: column('VCOORD').map((v) => v / wavelengthMetres),
    value: column('VIS2DATA'),
    sigma,
  };
}

/** @throws InputProblem as `readSquared`; phase or amplitude may be undefined, not both */
export function readTriples(table: OiT3, wavelengthMetres: number): TripleProducts {
  const column = (name: string) => requireFiniteColumn(table.table.column(name), table.place);
  const metres = (name: string) => column(name).map((value) => value / wavelengthMetres);
  const scan = column('NS_SCAN');
  const amplitude = pairOf(table.amplitude, table.amplitudeError);
  const phase = pairOf(table.phaseDegrees, table.phaseErrorDegrees);
  requireRows(table, scan, (row) => {
    const [a, p] = [amplitude.sigma[row], phase.sigma[row]];
    const isSound = a > 0 && p > 0 && Math.min(a, p) < Number.POSITIVE_INFINITY;
    return isSound
      ? undefined
      : `T3AMPERR ${table.amplitudeError[row]}, T3PHIERR ${table.phaseErrorDegrees[row]}`;
  });
  const station = (k: number) => table.stations.filter((_, i) => i % 3 === k);
  return {
    count: table.rows,
    station1: station(0),
    station2: station(1),
    station3: station(2),
    scan: Int32Array.from(scan),
    timeMjd: column('MJD'),
    u1: metres('U1COORD'),
    v1: metres('V1COORD'),
    u2: metres('U2COORD'),
    v2: metres('V2COORD'),
    amplitude: amplitude.value,
    sigmaAmplitude: amplitude.sigma,
    phase: phase.value.map(fromDegrees),
    sigmaPhase: phase.sigma.map(fromDegrees),
  };
}

/** What is undefined is 0 with an infinite error. */
function pairOf(values: Float64Array, errors: Float64Array) {
  const isMissing = (row: number) => Number.isNaN(values[row]) && Number.isNaN(errors[row]);
  return {
    value: values.map((value, row) => (isMissing(row) ? 0 : value)),
    sigma: errors.map((error, row) => (isMissing(row) ? Number.POSITIVE_INFINITY : error)),
  };
}

/** Scans are numbered by whole numbers from 0 that 32 bits hold. */
export function isScanNumber(scan: number): boolean {
  return Number.isInteger(scan) && scan >= 0 && scan <= 0x7fff_ffff;
}

function requireRows(table: OiData, scan: Float64Array, faultOf: (row: number) => string | undefined): void {
  for (let row = 0; row < table.rows; row++) {
    const found =
      table.flag[row] !== 0 ? 'FLAG set' : !isScanNumber(scan[row]) ? `NS_SCAN ${scan[row]}` : faultOf(row);
    if (found === undefined) continue;
    throw new InputProblem({
      code: 'bad-row',
      place: `${table.place}, row ${row + 1}`,
      expected: 'a row in use with errors above 0 and NS_SCAN from 0',
      found,
      advice: 'Give the output of a stage, or take the file through a stage of kind ingest.',
    });
  }
}

/** What all tables of data share: cards, and columns for a number of rows. */
export interface SharedParts {
  readonly cards: readonly NewCard[];
  readonly wavelengthMetres: number;
}

export function writeSquared(sink: ByteSink, data: SquaredVisibilities, shared: SharedParts): void {
  const { wavelengthMetres, cards } = shared;
  appendTableHdu(sink, {
    extname: 'OI_VIS2',
    rows: data.count,
    cards,
    columns: [
      ...firstColumns(data.timeMjd),
      real('VIS2DATA', '', data.value),
      real('VIS2ERR', '', data.sigma),
      real('UCOORD', 'm', scaled(data.u, wavelengthMetres)),
      real('VCOORD', 'm', scaled(data.v, wavelengthMetres)),
      ...lastColumns([data.station1, data.station2], data.scan),
    ],
  });
}

export function writeTriples(sink: ByteSink, data: TripleProducts, shared: SharedParts): void {
  const { wavelengthMetres, cards } = shared;
  appendTableHdu(sink, {
    extname: 'OI_T3',
    rows: data.count,
    cards,
    columns: [
      ...firstColumns(data.timeMjd),
      missing('T3AMP', '', data.amplitude, data.sigmaAmplitude),
      missing('T3AMPERR', '', data.sigmaAmplitude, data.sigmaAmplitude),
      missing('T3PHI', 'deg', data.phase, data.sigmaPhase, toDegrees),
      missing('T3PHIERR', 'deg', data.sigmaPhase, data.sigmaPhase, toDegrees),
      real('U1COORD', 'm', scaled(data.u1, wavelengthMetres)),
      real('V1COORD', 'm', scaled(data.v1, wavelengthMetres)),
      real('U2COORD', 'm', scaled(data.u2, wavelengthMetres)),
      real('V2COORD', 'm', scaled(data.v2, wavelengthMetres)),
      ...lastColumns([data.station1, data.station2, data.station3], data.scan),
    ],
  });
}

/** Undefined where there is no error. @throws InternalError for another value that is not finite */
function missing(
  name: string,
  unit: string,
  values: Float64Array,
  errors: Float64Array,
  toUnit = (value: number) => value,
): NewColumn {
  const isLacking = (row: number) => errors[row] === Number.POSITIVE_INFINITY;
  requireFiniteValues(
    values.filter((_, row) => !isLacking(row)),
    `visibilities, ${name}`,
  );
  const written = values.map((value, row) => (isLacking(row) ? Number.NaN : toUnit(value)));
  return { name, form: '1D', unit, values: written };
}

function scaled(values: Float64Array, factor: number): Float64Array {
  return values.map((value) => value * factor);
}

/** @throws InternalError for a value that is not finite */
function real(name: string, unit: string, values: Float64Array): NewColumn {
  requireFiniteValues(values, `visibilities, ${name}`);
  return { name, form: '1D', unit, values };
}

function firstColumns(timeMjd: Float64Array): NewColumn[] {
  const zeros = new Float64Array(timeMjd.length);
  return [
    { name: 'TARGET_ID', form: '1I', values: zeros.map(() => 1) },
    real('TIME', 's', zeros),
    real('MJD', 'd', timeMjd),
    real('INT_TIME', 's', zeros),
  ];
}

function lastColumns(stations: readonly Int32Array[], scan: Int32Array): NewColumn[] {
  const rows = Array.from(scan.keys());
  return [
    {
      name: 'STA_INDEX',
      form: `${stations.length}I`,
      values: rows.flatMap((row) => stations.map((column) => column[row] + 1)),
    },
    { name: 'FLAG', form: '1L', values: new Float64Array(scan.length) },
    { name: 'NS_SCAN', form: '1J', values: scan },
  ];
}
