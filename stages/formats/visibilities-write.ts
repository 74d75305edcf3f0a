/** Writes the format `visibilities`; visibilities.ts has its layout and reads it. */

import type { ByteSink } from '../bytes.ts';
import type { Visibilities } from '../data.ts';
import { atan2 } from '../numerics/elementary.ts';
import { calendarDate, julianDateOfMjd } from '../numerics/time.ts';
import { toDegrees } from './angles.ts';
import { requireFiniteValues } from './column-rules.ts';
import type { NewCard } from './fits/header.ts';
import { appendEmptyPrimary, appendTableHdu, type NewColumn } from './fits/table.ts';
import { writeSquared, writeTriples } from './visibilities-optical.ts';

const instrument = 'BAND';

const leastNameWidth = 16;

const unknown = 'UNKNOWN';

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
