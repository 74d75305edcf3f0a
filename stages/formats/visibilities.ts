/** The format `visibilities`: OIFITS 2 with one wavelength and one OI_VIS of correlated flux, which optical data leave empty,
 *  beside it OI_VIS2 and OI_T3 at most once. Layout: CONVENTIONS.
 *  Three columns are ours: NS_SCAN, and NS_WAVE and NS_BAND, since EFF_WAVE and EFF_BAND hold single precision.
 *  DATE, which OIFITS demands, is the date of observation: no output may depend on the clock. */

import type { ByteSink, ByteSource } from '../bytes.ts';
import type { Visibilities } from '../data.ts';
import { atan2, cos, sin } from '../numerics/elementary.ts';
import { calendarDate, julianDateOfMjd } from '../numerics/time.ts';
import { InputProblem } from '../problem.ts';
import { fromDegrees, toDegrees } from './angles.ts';
import { requireFiniteColumn, requireFiniteValues } from './column-rules.ts';
import { type NewCard, requireText } from './fits/header.ts';
import { appendEmptyPrimary, appendTableHdu, type NewColumn } from './fits/table.ts';
import { readOifits } from './oifits.ts';
import type { OiArray, Oifits, OiVis } from './oifits-types.ts';
import {
  isScanNumber,
  readSquared,
  readTriples,
  writeSquared,
  writeTriples,
} from './visibilities-optical.ts';

const instrument = 'BAND';
const unknown = 'UNKNOWN';
const leastNameWidth = 16;

/** Reads visibilities.
 *  @throws InputProblem when the file is other OIFITS, or a row is flagged, not finite or without a positive sigma */
export function readVisibilities(source: ByteSource): Visibilities {
  const oifits = readOifits(source);
  const vis = requireLayout(oifits, source.name);
  const { table, rows: count } = vis;
  const wavelengthMetres = vis.wavelength.wavelengths[0] as number;
  const column = (name: string) => requireFiniteColumn(table.column(name), table.place);
  const amplitude = column('VISAMP');
  const phase = column('VISPHI').map(fromDegrees);
  const sigma = column('VISAMPERR');
  const scan = column('NS_SCAN');
  const target = oifits.targets[0] as Oifits['targets'][number];
  const array = vis.array as OiArray;
  requireFinite(oifits, vis);
  requireRows(vis, sigma, scan);
  return {
    target: { name: target.name, raDegrees: target.raDegrees, decDegrees: target.decDegrees },
    arrayName: array.name,
    remark: requireText(oifits.primary, 'REMARK', ''),
    stations: array.stations.map(({ name, xyz }) => ({ name, xyz })),
    wavelengthMetres,
    bandwidthMetres: vis.wavelength.bandwidths[0] as number,
    count,
    station1: vis.stations.filter((_, i) => i % 2 === 0),
    station2: vis.stations.filter((_, i) => i % 2 === 1),
    scan: Int32Array.from(scan),
    timeMjd: column('MJD'),
    integrationSeconds: column('INT_TIME'),
    u: column('UCOORD').map((u) => u / wavelengthMetres),
    v: column('VCOORD').map((v) => v / wavelengthMetres),
    re: amplitude.map((a, k) => a * cos(phase[k] as number)),
    im: amplitude.map((a, k) => a * sin(phase[k] as number)),
    sigma,
    sigmaPhase: column('VISPHIERR').map(fromDegrees),
    ...opticalOf(oifits, wavelengthMetres),
  };
}

function opticalOf(
  { vis2, t3 }: Oifits,
  wavelengthMetres: number,
): Pick<Visibilities, 'squared' | 'triples'> {
  return {
    ...(vis2.length > 0 ? { squared: readSquared(vis2[0], wavelengthMetres) } : {}),
    ...(t3.length > 0 ? { triples: readTriples(t3[0], wavelengthMetres) } : {}),
  };
}

function requireLayout({ targets, wavelengths, vis, vis2, t3, flux }: Oifits, place: string): OiVis {
  const [only] = vis;
  const single = targets.length === 1 && wavelengths.length === 1 && vis.length === 1;
  const few = vis2.length <= 1 && t3.length <= 1 && flux.length === 0;
  const correlated = only?.amplitudeType === 'correlated flux' && only.unit === 'Jy';
  const complete = [...vis, ...vis2, ...t3].every(
    ({ array, channels, table }) => array !== undefined && channels === 1 && table.has('NS_SCAN'),
  );
  if (only !== undefined && single && few && correlated && complete) return only;
  throw new InputProblem({
    code: 'wrong-layout',
    place,
    expected:
      'one OI_VIS of correlated flux in Jy, one OI_VIS2 and one OI_T3 at most, with one target, one wavelength and a column NS_SCAN',
    found:
      `${vis.length} OI_VIS (${only?.amplitudeType ?? 'none'}, unit "${only?.unit ?? ''}"), ` +
      `${targets.length} targets, ${wavelengths.length} OI_WAVELENGTH, ` +
      `${vis2.length} OI_VIS2, ${t3.length} OI_T3, ${flux.length} OI_FLUX`,
    advice: 'Other OIFITS goes through a stage of kind ingest first.',
  });
}

/** @throws InputProblem for a position or a band that is not finite */
function requireFinite({ targets: [target] }: Oifits, { array, wavelength, place }: OiVis): void {
  const facts: [string, number[]][] = [
    ['RAEP0 and DECEP0', [target.raDegrees, target.decDegrees]],
    ['EFF_BAND', [wavelength.bandwidths[0]]],
    ...((array as OiArray).stations.map(({ name, xyz }) => [`STAXYZ of ${name}`, [...xyz]]) as [
      string,
      number[],
    ][]),
  ];
  for (const [what, values] of facts) {
    if (values.every(Number.isFinite)) continue;
    throw new InputProblem({
      code: 'not-finite',
      place,
      expected: `${what} finite`,
      found: values.join(', '),
      advice: 'Give the output of a stage, or take the file through a stage of kind ingest.',
    });
  }
}

function requireRows(vis: OiVis, sigma: Float64Array, scan: Float64Array): void {
  for (let row = 0; row < vis.rows; row++) {
    const inOrder = (vis.stations[2 * row] as number) < (vis.stations[2 * row + 1] as number);
    const s = scan[row] as number;
    const found =
      vis.flag[row] !== 0
        ? 'FLAG set'
        : !((sigma[row] as number) > 0)
          ? `VISAMPERR ${sigma[row]}`
          : !inOrder
            ? 'stations against the order of OI_ARRAY'
            : !isScanNumber(s)
              ? `NS_SCAN ${s}`
              : undefined;
    if (found === undefined) continue;
    throw new InputProblem({
      code: 'bad-row',
      place: `${vis.place}, row ${row + 1}`,
      expected: 'a row in use with VISAMPERR above 0, stations in the order of OI_ARRAY, NS_SCAN from 0',
      found,
      advice: 'Give the output of a stage, or take the file through a stage of kind ingest.',
    });
  }
}

/** Writes visibilities. @throws InternalError for a value that is not finite */
export function writeVisibilities(sink: ByteSink, data: Visibilities): void {
  const date = dateOf(firstTime(data));
  appendEmptyPrimary(sink, [
    ['ORIGIN', 'Platebook'],
    ['DATE', date, 'date of observation'],
    ['DATE-OBS', date],
    ['CONTENT', 'OIFITS2'],
    ['TELESCOP', data.arrayName],
    ['INSTRUME', unknown],
    ['OBSERVER', unknown],
    ['OBJECT', data.target.name],
    ['INSMODE', unknown],
    ...(data.remark === '' ? [] : [['REMARK', data.remark] as const]),
  ]);
  writeTarget(sink, data);
  writeArray(sink, data);
  writeWavelength(sink, data);
  const cards: NewCard[] = [
    ['OI_REVN', 2],
    ['DATE-OBS', date],
    ['ARRNAME', data.arrayName],
    ['INSNAME', instrument],
  ];
  writeVis(sink, data, cards);
  const shared = { cards, wavelengthMetres: data.wavelengthMetres };
  if (data.squared) writeSquared(sink, data.squared, shared);
  if (data.triples) writeTriples(sink, data.triples, shared);
}

function firstTime({ timeMjd, squared, triples }: Visibilities): number {
  return timeMjd[0] ?? squared?.timeMjd[0] ?? triples?.timeMjd[0] ?? 0;
}

/** `YYYY-MM-DD` of an MJD. */
function dateOf(mjd: number): string {
  const { year, month, day } = calendarDate(julianDateOfMjd(mjd));
  const two = (n: number) => String(n).padStart(2, '0');
  return `${String(year).padStart(4, '0')}-${two(month)}-${two(Math.floor(day))}`;
}

function writeTarget(sink: ByteSink, { target }: Visibilities): void {
  const zero = (name: string, unit: string, form = '1D'): NewColumn => ({ name, form, unit, values: [0] });
  const width = Math.max(leastNameWidth, target.name.length);
  appendTableHdu(sink, {
    extname: 'OI_TARGET',
    rows: 1,
    cards: [['OI_REVN', 2]],
    columns: [
      { name: 'TARGET_ID', form: '1I', values: [1] },
      { name: 'TARGET', form: `${width}A`, values: [target.name] },
      { name: 'RAEP0', form: '1D', unit: 'deg', values: [target.raDegrees] },
      { name: 'DECEP0', form: '1D', unit: 'deg', values: [target.decDegrees] },
      { name: 'EQUINOX', form: '1E', unit: 'yr', values: [2000] },
      zero('RA_ERR', 'deg'),
      zero('DEC_ERR', 'deg'),
      zero('SYSVEL', 'm/s'),
      { name: 'VELTYP', form: '8A', values: [unknown] },
      { name: 'VELDEF', form: '8A', values: [unknown] },
      zero('PMRA', 'deg/yr'),
      zero('PMDEC', 'deg/yr'),
      zero('PMRA_ERR', 'deg/yr'),
      zero('PMDEC_ERR', 'deg/yr'),
      zero('PARALLAX', 'deg', '1E'),
      zero('PARA_ERR', 'deg', '1E'),
      { name: 'SPECTYP', form: '16A', values: [unknown] },
    ],
  });
}

function writeArray(sink: ByteSink, { arrayName, stations }: Visibilities): void {
  const names = stations.map(({ name }) => name);
  const width = Math.max(leastNameWidth, ...names.map((name) => name.length));
  const filled = (value: number) => stations.map(() => value);
  appendTableHdu(sink, {
    extname: 'OI_ARRAY',
    rows: stations.length,
    cards: [
      ['OI_REVN', 2],
      ['ARRNAME', arrayName],
      ['FRAME', 'GEOCENTRIC'],
      ['ARRAYX', 0],
      ['ARRAYY', 0],
      ['ARRAYZ', 0],
    ],
    columns: [
      { name: 'TEL_NAME', form: `${width}A`, values: names },
      { name: 'STA_NAME', form: `${width}A`, values: names },
      { name: 'STA_INDEX', form: '1I', values: stations.map((_, i) => i + 1) },
      { name: 'DIAMETER', form: '1E', unit: 'm', values: filled(0) },
      { name: 'STAXYZ', form: '3D', unit: 'm', values: stations.flatMap(({ xyz }) => xyz) },
      { name: 'FOV', form: '1D', unit: 'arcsec', values: filled(0) },
      { name: 'FOVTYPE', form: '6A', values: stations.map(() => 'FWHM') },
    ],
  });
}

function writeWavelength(sink: ByteSink, { wavelengthMetres, bandwidthMetres }: Visibilities): void {
  appendTableHdu(sink, {
    extname: 'OI_WAVELENGTH',
    rows: 1,
    cards: [
      ['OI_REVN', 2],
      ['INSNAME', instrument],
    ],
    columns: [
      { name: 'EFF_WAVE', form: '1E', unit: 'm', values: [wavelengthMetres] },
      { name: 'EFF_BAND', form: '1E', unit: 'm', values: [bandwidthMetres] },
      { name: 'NS_WAVE', form: '1D', unit: 'm', values: [wavelengthMetres] },
      { name: 'NS_BAND', form: '1D', unit: 'm', values: [bandwidthMetres] },
    ],
  });
}

function writeVis(sink: ByteSink, data: Visibilities, cards: readonly NewCard[]): void {
  const { count, re, im, wavelengthMetres } = data;
  const column = (name: string, unit: string, values: Float64Array): NewColumn => {
    requireFiniteValues(values, `writeVisibilities, ${name}`);
    return { name, form: '1D', unit, values };
  };
  const stations = Array.from({ length: 2 * count }, (_, i) => {
    const of = i % 2 === 0 ? data.station1 : data.station2;
    return (of[i >> 1] as number) + 1;
  });
  const zeros = new Float64Array(count);
  appendTableHdu(sink, {
    extname: 'OI_VIS',
    rows: count,
    cards: [...cards, ['AMPTYP', 'correlated flux'], ['PHITYP', 'absolute']],
    columns: [
      { name: 'TARGET_ID', form: '1I', values: zeros.map(() => 1) },
      column('TIME', 's', zeros),
      column('MJD', 'd', data.timeMjd),
      column('INT_TIME', 's', data.integrationSeconds),
      column(
        'VISAMP',
        'Jy',
        re.map((x, k) => Math.sqrt(x * x + (im[k] as number) * (im[k] as number))),
      ),
      column('VISAMPERR', 'Jy', data.sigma),
      column(
        'VISPHI',
        'deg',
        re.map((x, k) => toDegrees(atan2(im[k] as number, x))),
      ),
      column('VISPHIERR', 'deg', data.sigmaPhase.map(toDegrees)),
      column(
        'UCOORD',
        'm',
        data.u.map((u) => u * wavelengthMetres),
      ),
      column(
        'VCOORD',
        'm',
        data.v.map((v) => v * wavelengthMetres),
      ),
      { name: 'STA_INDEX', form: '2I', values: stations },
      { name: 'FLAG', form: '1L', values: zeros },
      { name: 'NS_SCAN', form: '1J', values: data.scan },
    ],
  });
}
